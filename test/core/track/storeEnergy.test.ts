import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { bedEnthalpyFunction } from '../../../src/core/bed/tables.js';
import type { StoreDefinition } from '../../../src/core/definitions.js';
import { referenceEnthalpies, storeEnergy } from '../../../src/core/track/storeEnergy.js';
import {
  type StoreModel,
  type StoreState,
  startStore,
} from '../../../src/core/track/storeTracker.js';
import { setTubeTemperatures, type TubeState } from '../../../src/core/track/tube.js';
import { storeEnergyPosition } from '../../../src/core/track/unseenFlow.js';
import { mulberry } from '../../support/random.js';
import { coldStore, hotStore, modelOf, stringOf } from './plants.js';

/** Three strings, the outermost standing for most of the bed. */
const three = (id: string): Partial<StoreDefinition> => ({
  strings: [0.1, 0.3, 0.6].map((area_share, k) =>
    stringOf(`${id}${k}`, 5, 4, { area_share, radius_m: 0.3 * k }),
  ),
});
const HOT = modelOf(hotStore(three('h')));
const COLD = modelOf(coldStore(three('c')));

/** A store whose tubes stand at these temperatures throughout [K]. */
function uniform(model: StoreModel, temperature_K: readonly number[]): StoreState {
  const state = startStore(model);
  model.tubes.forEach((tube, k) => {
    const profile = new Float64Array(tube.layout.cells).fill(temperature_K[k] as number);
    setTubeTemperatures(tube, state.tubes[k] as TubeState, profile);
  });
  return state;
}

const same = (t: number): number[] => [t, t, t];
const charged = ({ store }: StoreModel): number =>
  store.kind === 'hot' ? store.reference_hot_K : store.reference_cold_K;
const discharged = ({ store }: StoreModel): number =>
  store.kind === 'hot' ? store.reference_cold_K : store.reference_hot_K;

describe.each([
  ['hot', HOT],
  ['cold', COLD],
])('the energy of a %s store', (_, model) => {
  it('is full at the charged and none at the discharged reference, positive when charged', () => {
    const full = storeEnergy(model, uniform(model, same(charged(model))));
    const empty = storeEnergy(model, uniform(model, same(discharged(model))));
    // The references are nodes of no table, but T -> H -> T is exact within a segment: round-off.
    expect(full.soc).toBeCloseTo(1, 12);
    expect(empty.soc).toBeCloseTo(0, 12);
    expect(full.stored_MWh_th).toBeCloseTo(full.capacity_MWh_th, 9);
    expect(full.stored_MWh_th).toBeGreaterThan(0);
  });

  it('is the enthalpy of the rock between the references', () => {
    const { bed } = model.store;
    const h = bedEnthalpyFunction(bed);
    const exact =
      (Math.abs(h(charged(model)) - h(discharged(model))) * bed.area_m2 * bed.length_m) / 3.6e9;
    const { capacity_MWh_th } = storeEnergy(model, uniform(model, same(400)));
    // Piecewise linear in 768 segments of 0.7 K or less: c_s bends by below 1e-6 of a segment's step.
    expect(capacity_MWh_th / exact).toBeCloseTo(1, 5);
  });

  it('is not clamped beyond the references', () => {
    const over = 0.05 * (charged(model) - discharged(model));
    expect(storeEnergy(model, uniform(model, same(charged(model) + over))).soc).toBeGreaterThan(
      1.02,
    );
    const below = storeEnergy(model, uniform(model, same(discharged(model) - over)));
    expect(below.soc).toBeLessThan(-0.02);
    expect(below.stored_MWh_th).toBeLessThan(0);
  });

  it('weighs the strings by their areas', () => {
    const a = charged(model);
    const b = discharged(model);
    expect(storeEnergy(model, uniform(model, [a, b, b])).soc).toBeCloseTo(0.1, 12);
    expect(storeEnergy(model, uniform(model, [b, a, b])).soc).toBeCloseTo(0.3, 12);
    expect(storeEnergy(model, uniform(model, [a, b, a])).soc).toBeCloseTo(0.7, 12);
  });

  it('rises with every kelvin towards the charged reference', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0, max: 1, noNaN: true }),
        fc.double({ min: 0.01, max: 0.3, noNaN: true }),
        (u, more) => {
          const at = (share: number): number =>
            storeEnergy(
              model,
              uniform(
                model,
                same(discharged(model) + share * (charged(model) - discharged(model))),
              ),
            ).soc;
          expect(at(u + more)).toBeGreaterThan(at(u));
        },
      ),
      { numRuns: 30 },
    );
  });
});

describe('the sigma of the energy', () => {
  /** Gives every tube independent errors of its cells, of these sigmas, and nothing else. */
  function independent(model: StoreModel, sigma_K: readonly number[]): StoreState {
    const state = uniform(model, same(500));
    model.tubes.forEach((tube, k) => {
      const { covariance } = state.tubes[k] as TubeState;
      covariance.fill(0);
      for (let i = 0; i < tube.layout.cells; i++) {
        covariance[i * tube.layout.size + i] = (sigma_K[k] as number) ** 2;
      }
    });
    // Even across the bed just now: flow that no string sees adds nothing yet.
    state.origin_m = storeEnergyPosition(model, state);
    return state;
  }

  /** d soc/dT of one cell of a tube with all of the area. */
  function slope(model: StoreModel): number {
    const up = storeEnergy(model, uniform(model, same(500.01))).soc;
    const down = storeEnergy(model, uniform(model, same(499.99))).soc;
    return (up - down) / 0.02 / (model.tubes[0]?.layout.cells as number);
  }

  it('adds what tubes do not share as independent', () => {
    const sigma = [3, 2, 1];
    const { soc_sigma, shared_over_independent } = storeEnergy(HOT, independent(HOT, sigma));
    const shares = [0.1, 0.3, 0.6];
    const cells = HOT.tubes[0]?.layout.cells as number;
    const variance = sigma.reduce((sum, s, k) => sum + ((shares[k] as number) * s) ** 2 * cells, 0);
    // The slope by differences across a table's nodes: c_s changes by 1e-3 from segment to segment.
    expect(soc_sigma / (slope(HOT) * Math.sqrt(variance))).toBeCloseTo(1, 2);
    expect(shared_over_independent).toBe(1);
  });

  it('adds what flow that no string sees may have done since the fronts were even', () => {
    const state = independent(HOT, same(0));
    const length = HOT.store.bed.length_m;
    state.origin_m -= 0.5 * length;
    const near = storeEnergy(HOT, state).soc_sigma;
    state.origin_m -= 0.5 * length;
    // It grows with the way, and one string that stands for all samples worst.
    expect(storeEnergy(HOT, state).soc_sigma / near).toBeCloseTo(2, 9);
    expect(near).toBeGreaterThan(0);
  });

  it('adds what tubes share, such as the meter, as if one', () => {
    const state = independent(HOT, same(0));
    // Every cell moves by 10 K with one sigma of the flow factor: nothing else is unknown.
    HOT.tubes.forEach((tube, k) => {
      const { covariance } = state.tubes[k] as TubeState;
      const { size, cells, flow } = tube.layout;
      const effect = (i: number): number => (i < cells ? 10 : i === flow ? 0.05 : 0);
      for (let i = 0; i < size; i++) {
        for (let j = 0; j < size; j++) covariance[i * size + j] = effect(i) * effect(j);
      }
    });
    const { soc_sigma, correlation } = storeEnergy(HOT, state);
    const cells = HOT.tubes[0]?.layout.cells as number;
    expect(soc_sigma / (10 * cells * slope(HOT))).toBeCloseTo(1, 2);
    expect(correlation).toBeCloseTo(1, 9);
  });

  it('lies between that of independent and that of one shared error, whatever the covariance', () => {
    const random = mulberry(5);
    for (let round = 0; round < 20; round++) {
      const state = startStore(HOT);
      HOT.tubes.forEach((tube, k) => {
        const { covariance } = state.tubes[k] as TubeState;
        const { size } = tube.layout;
        const rows = Array.from({ length: size }, () => [random() - 0.5, random(), random() - 0.5]);
        for (let i = 0; i < size; i++) {
          for (let j = 0; j < size; j++) {
            covariance[i * size + j] = (rows[i] as number[]).reduce(
              (sum, v, c) => sum + v * (rows[j]?.[c] as number),
              i === j ? 0.01 : 0,
            );
          }
        }
      });
      const { soc_sigma, correlation, shared_over_independent } = storeEnergy(HOT, state);
      expect(soc_sigma).toBeGreaterThan(0);
      expect(correlation).toBeGreaterThan(0);
      expect(correlation).toBeLessThanOrEqual(1);
      expect(shared_over_independent).toBeGreaterThanOrEqual(1);
    }
  });

  it('has the rock`s heat capacity on top for the stored heat, not for the state of charge', () => {
    const known = modelOf(hotStore(three('h')), { heat_capacity_sigma: 0 });
    const full = (model: StoreModel) => storeEnergy(model, uniform(model, same(charged(model))));
    const a = full(known);
    const b = full(HOT);
    expect(b.soc_sigma).toBe(a.soc_sigma);
    expect(b.stored_sigma_MWh_th).toBeCloseTo(b.capacity_MWh_th * Math.hypot(b.soc_sigma, 0.03), 9);
    expect(a.stored_sigma_MWh_th).toBeCloseTo(a.capacity_MWh_th * a.soc_sigma, 12);
  });
});

describe('references', () => {
  it('give a cold store its charged enthalpy at the cold end', () => {
    const hot = referenceEnthalpies(HOT);
    const cold = referenceEnthalpies(COLD);
    expect(hot.charged).toBeGreaterThan(hot.discharged);
    expect(cold.charged).toBeLessThan(cold.discharged);
  });
});
