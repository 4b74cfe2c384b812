import { describe, expect, it } from 'vitest';
import { emptyReading, predictReading } from '../../../src/core/track/measurement.js';
import { type StoreState, startStore, stepStore } from '../../../src/core/track/storeTracker.js';
import { predictTube, type TubeDrive } from '../../../src/core/track/tube.js';
import {
  stepWeighed,
  takeMean,
  weighedTube,
  withOneMore,
  withoutSensors,
} from '../../../src/core/worth/weighedTube.js';
import { mulberry } from '../../support/random.js';
import { hotStore, modelOf, stringOf } from '../track/plants.js';
import { Bed } from '../track/randomStore.js';

const MODEL = modelOf(hotStore({ strings: [stringOf('h', 6, 4, { groups: ['a', 'b', null] })] }));
const [TUBE] = MODEL.tubes;
const { layout } = TUBE!;
const DRIVE: TubeDrive = {
  massFlux_kg_m2s: 0.25,
  inlet_K: 733.15,
  inletSigma_K: 3,
  ambient_K: 283.15,
  dt_s: 60,
  travelSigma_m: 0.01,
};

/** A store that has been tracked for half an hour with noisy readings. */
function tracked(): StoreState {
  const state = startStore(MODEL);
  const bed = new Bed(MODEL, mulberry(5), 0.4);
  for (let n = 0; n < 30; n++) {
    stepStore(MODEL, state, n === 0 ? null : DRIVE, bed.readings(), n * 60_000, 0);
    bed.step(DRIVE);
  }
  return state;
}

const tubeOf = (state: StoreState) =>
  weighedTube(TUBE!, () => true, structuredClone(state.tubes[0]!));

describe('a weighed tube', () => {
  const state = tracked();

  it('shrinks its covariance to the bit as tracking does with readings that are as expected', () => {
    const ahead = structuredClone(state.tubes[0]!);
    predictTube(TUBE!, ahead, DRIVE, MODEL.scratch[0]!);
    const values = Float64Array.from({ length: layout.sensors }, (_, sensor) => {
      const reading = emptyReading(layout.cells);
      predictReading(TUBE!, ahead, sensor, reading);
      return reading.value_K;
    });
    const real = structuredClone(state);
    expect(stepStore(MODEL, real, DRIVE, values, 30 * 60_000, 0)).toBe('updated');
    expect(real.used).toBe(6);
    const tube = tubeOf(state);
    stepWeighed(tube, DRIVE, 1);
    expect(tube.state.covariance).toEqual(real.tubes[0]!.covariance);
  });

  it('does not know of what is read elsewhere: its mean stays on the course of the model', () => {
    const ahead = structuredClone(state.tubes[0]!);
    predictTube(TUBE!, ahead, DRIVE, MODEL.scratch[0]!);
    const tube = tubeOf(state);
    stepWeighed(tube, DRIVE, 1);
    // A table is left and entered again: one rounding each of some 1e9 J/m3.
    tube.state.enthalpy.forEach((h, i) => {
      expect(Math.abs(h / ahead.enthalpy[i]! - 1)).toBeLessThan(1e-12);
    });
  });

  it('takes several scans in at once as their mean: the white noise of one divided by their number', () => {
    // Predicted over next to no time, a prior that is far wider than the noise leaves it alone.
    const still = { ...DRIVE, massFlux_kg_m2s: 0, dt_s: 1e-6, travelSigma_m: 0, inletSigma_K: 0 };
    const many = tubeOf(state);
    stepWeighed(many, still, 4);
    const one = tubeOf(state);
    for (let n = 0; n < 4; n++) stepWeighed(one, still, 1);
    many.state.covariance.forEach((p, i) => {
      const scale = Math.sqrt(
        Math.abs(
          many.state.covariance[Math.floor(i / layout.size) * (layout.size + 1)]! *
            many.state.covariance[(i % layout.size) * (layout.size + 1)]!,
        ),
      );
      expect(Math.abs(p - one.state.covariance[i]!)).toBeLessThanOrEqual(1e-6 * scale);
    });
  });

  it('without readings grows as a prediction does', () => {
    const ahead = structuredClone(state.tubes[0]!);
    predictTube(TUBE!, ahead, DRIVE, MODEL.scratch[0]!);
    for (const [tube, scans] of [
      [tubeOf(state), 0],
      [withoutSensors(tubeOf(state), () => true), 1],
    ] as const) {
      stepWeighed(tube, DRIVE, scans);
      expect(tube.state.covariance).toEqual(ahead.covariance);
    }
  });

  it('with one more keeps all that it knew, and knows of the new one what the configuration says', () => {
    const from = tubeOf(state);
    const more = withOneMore(from, 2.1);
    const to = more.model.layout;
    const at = (i: number, j: number) => more.state.covariance[i * to.size + j];
    const known = (i: number, j: number) => from.state.covariance[i * layout.size + j];
    expect(to.size).toBe(layout.size + 2);
    expect(at(3, to.group + 1)).toBe(known(3, layout.group + 1));
    expect(at(to.offset + 5, to.position + 4)).toBe(known(layout.offset + 5, layout.position + 4));
    expect(at(to.flow, to.offset + 2)).toBe(known(layout.flow, layout.offset + 2));
    const { offset_sigma_K, position_sigma_m } = TUBE!.estimator;
    expect(at(to.offset + 6, to.offset + 6)).toBe(offset_sigma_K ** 2);
    expect(at(to.position + 6, to.position + 6)).toBe(position_sigma_m ** 2);
    for (let j = 0; j < to.size; j++) if (j !== to.offset + 6) expect(at(to.offset + 6, j)).toBe(0);
    expect(more.reads).toEqual(Array(7).fill(true));
    takeMean(more, from.state, layout);
    expect(more.state.further[to.group - to.cells]).toBe(
      from.state.further[layout.group - layout.cells],
    );
    expect(() => withOneMore(from, 4.1)).toThrow(/position_m 4.1: expected 0 to 4/);
  });
});
