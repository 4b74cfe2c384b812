import { describe, expect, it } from 'vitest';
import { type StoreModel, startStore } from '../../../src/core/track/storeTracker.js';
import { setTubeTemperatures, type TubeState } from '../../../src/core/track/tube.js';
import {
  eveningTime,
  evenOut,
  followOrigin,
  storeEnergyPosition,
  unseenSigma,
} from '../../../src/core/track/unseenFlow.js';
import { hotStore, modelOf, stringOf } from './plants.js';

/** A store with strings at these radii [m]. */
const withStrings = (...radii: number[]): StoreModel =>
  modelOf(
    hotStore({
      strings: radii.map((radius_m, k) =>
        stringOf(`s${k}`, 5, 4, { area_share: 1 / radii.length, radius_m }),
      ),
    }),
  );
const THREE = withStrings(0.1, 0.4, 0.7);
const REST = { massFlux_kg_m2s: 0, dt_s: 600 };

/** A store half charged, with a steep front in its middle. */
function halfCharged(model: StoreModel) {
  const state = startStore(model);
  const { reference_hot_K, reference_cold_K } = model.store;
  model.tubes.forEach(({ layout: { cells } }, k) => {
    const profile = Float64Array.from({ length: cells }, (_, i) =>
      i < cells / 2 ? reference_hot_K : reference_cold_K,
    );
    setTubeTemperatures(model.tubes[k]!, state.tubes[k] as TubeState, profile);
  });
  return state;
}

describe('fronts that run apart where no string stands', () => {
  it('even out in the time in which conduction evens a wave over what a string stands for', () => {
    const { tables, store } = THREE;
    const middle = tables.segments >> 1;
    const diffusivity = tables.stagnant[middle]! / tables.heatCapacity[middle]!;
    // Explicit conduction of one wave over a third of the radius, its two ends the same place.
    const n = 60;
    const dx = store.bed.diameter_m / 2 / 3 / n;
    let wave = Array.from({ length: n }, (_, i) => Math.cos((2 * Math.PI * i) / n));
    const dt = (0.2 * dx * dx) / diffusivity;
    let time_s = 0;
    while (wave[0]! > Math.exp(-1)) {
      wave = wave.map((v, i) => v + 0.2 * (wave[(i + 1) % n]! + wave[(i + n - 1) % n]! - 2 * v));
      time_s += dt;
    }
    // The grid's own wave decays slower by 1 - (2 pi/n)^2/12, 0.1 %; one step is 0.2 % of the time.
    expect(eveningTime(THREE, 0) / time_s).toBeGreaterThan(0.99);
    expect(eveningTime(THREE, 0) / time_s).toBeLessThan(1.01);
  });

  it('even out sooner while gas flows, and nine times as slowly about one string as about three', () => {
    expect(eveningTime(THREE, 0.4)).toBeLessThan(eveningTime(THREE, 0.1));
    expect(eveningTime(THREE, -0.4)).toBe(eveningTime(THREE, 0.4));
    expect(eveningTime(withStrings(0.5), 0) / eveningTime(THREE, 0)).toBeCloseTo(9, 9);
    // Three strings about one ring see no more of the radius than one.
    expect(eveningTime(withStrings(0.5, 0.5, 0.5), 0) / eveningTime(THREE, 0)).toBeCloseTo(9, 9);
  });

  it('lose what they ran apart by a part in e within that time, in any steps', () => {
    const leftAfter = (steps: number): number => {
      const state = halfCharged(THREE);
      followOrigin(THREE, state, true);
      // Of the wall nothing is unknown any more.
      state.known_s = 1e9;
      const before = unseenSigma(THREE, state);
      const dt_s = eveningTime(THREE, 0) / steps;
      for (let i = 0; i < steps; i++) evenOut(THREE, state, { ...REST, dt_s });
      return unseenSigma(THREE, state) / before;
    };
    expect(leftAfter(1)).toBeCloseTo(Math.exp(-1), 9);
    expect(leftAfter(500)).toBeCloseTo(Math.exp(-1), 9);
  });

  it('are even where they were swept out, and run apart from the inlet on after a start', () => {
    const state = halfCharged(THREE);
    followOrigin(THREE, state, true);
    expect(state.origin_m).toBe(0);
    evenOut(THREE, state, REST);
    const moved = state.origin_m;
    expect(moved).toBeGreaterThan(0);
    expect(moved).toBeLessThan(storeEnergyPosition(THREE, state));
    followOrigin(THREE, state, false);
    expect(state.origin_m).toBe(moved);
    const swept = startStore(THREE);
    THREE.tubes.forEach((tube, k) => {
      const full = new Float64Array(tube.layout.cells).fill(THREE.store.reference_hot_K);
      setTubeTemperatures(tube, swept.tubes[k] as TubeState, full);
    });
    followOrigin(THREE, swept, false);
    expect(swept.origin_m).toBeCloseTo(THREE.store.bed.length_m, 9);
  });
});
