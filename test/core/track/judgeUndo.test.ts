import { describe, expect, it } from 'vitest';
import { freshSensor } from '../../../src/core/track/judge.js';
import { forgetSensor } from '../../../src/core/track/judgeUndo.js';
import { judgeWork } from '../../../src/core/track/judgeWork.js';
import { gasApart } from '../../../src/core/track/storeJudge.js';
import { startStore, stepStore } from '../../../src/core/track/storeTracker.js';
import type { TubeDrive, TubeModel, TubeState } from '../../../src/core/track/tube.js';
import { mulberry } from '../../support/random.js';
import { ESTIMATOR, hotBed, hotStore, modelOf, stringOf } from './plants.js';
import { Bed } from './randomStore.js';

const CHARGE: TubeDrive = {
  massFlux_kg_m2s: 0.5,
  inlet_K: 733,
  inletSigma_K: 0,
  ambient_K: 283.15,
  dt_s: 60,
  travelSigma_m: 0,
};

/** An hour of charging with ten thermocouples, the front among them. */
function charged() {
  const bedOf = hotBed({
    wall_loss_W_m2K: 0,
    end_loss_W_m2K: { charge_inlet: 0, discharge_inlet: 0 },
  });
  const model = modelOf(hotStore({ bed: bedOf, strings: [stringOf('s', 10, 4)] }));
  const state = startStore(model);
  const bed = new Bed(model, mulberry(5), 0.25);
  for (let n = 0; n < 60; n++) {
    bed.step(CHARGE);
    stepStore(model, state, n === 0 ? null : CHARGE, bed.readings(), n * 60_000, 0);
  }
  return { model, state, tube: model.tubes[0] as TubeModel, own: state.tubes[0] as TubeState };
}

describe('a sensor that was found out', () => {
  it('is forgotten with its offset and its place, and the rest is known no better than before', () => {
    const { tube, own } = charged();
    const { size, cells, offset, position } = tube.layout;
    const before = own.covariance.slice();
    const sensor = 3;
    forgetSensor(tube, own, sensor, 0);
    for (const at of [offset + sensor, position + sensor]) {
      expect(own.further[at - cells]).toBe(0);
      for (let j = 0; j < size; j++) {
        if (j !== at) expect(own.covariance[at * size + j]).toBe(0);
      }
    }
    const variance = (at: number): number => own.covariance[at * (size + 1)] as number;
    expect(variance(offset + sensor)).toBeCloseTo(ESTIMATOR.offset_sigma_K ** 2, 9);
    expect(variance(position + sensor)).toBeGreaterThanOrEqual(ESTIMATOR.position_sigma_m ** 2);
    for (let i = 0; i < cells; i++) {
      expect(variance(i)).toBeGreaterThanOrEqual(before[i * (size + 1)] as number);
    }
  });
});

describe('gas at a junction', () => {
  it('may be as far from the rock as what entered still is, and as the lags of both directions', () => {
    const { model } = charged();
    const work = judgeWork(model);
    const c = work.candidates[0] as (typeof work.candidates)[number];
    const at = (rock_K: number, lag_m: number, slope_K_m: number, reached: number): number =>
      gasApart(
        model,
        { ...freshSensor(), reachCharge_m: reached, reachDischarge_m: reached },
        { ...c, rock_K, reading: { ...c.reading, lag_m, slope_K_m } },
        CHARGE,
      );
    // The topmost of ten stands 0.2 m from the inlet.
    expect(at(633, 0.4, -10, 0)).toBeCloseTo(100 * Math.exp(-0.2 / 0.4), 9);
    expect(at(733, 0.4, -10, 0.4)).toBeCloseTo(2 * 0.4 * 10, 9);
    expect(at(633, 0.02, -200, 0.02)).toBeCloseTo(2 * 0.02 * 200, 9);
  });
});
