import { describe, expect, it } from 'vitest';
import {
  ageMachineFactor,
  type MachineFactor,
  startMachineFactor,
  stepMachineFactor,
} from '../../../src/core/dispatch/machineFactor.js';
import { mulberry } from '../../support/random.js';

const FLOW = 10;

function step(state: MachineFactor, ratio: number, dt_s: number, flow = FLOW): void {
  ageMachineFactor(state, dt_s);
  stepMachineFactor(state, ratio, dt_s, flow);
}

/** Runs a factor for some hours on ratios that scatter evenly by 1 % about `truth`. */
function learned(truth: number, hours: number, dt_s = 60, state = startMachineFactor()) {
  const random = mulberry(3);
  for (let t = 0; t < hours * 3600; t += dt_s) {
    step(state, truth * (1 + 0.02 * (random() - 0.5)), dt_s);
  }
  const { log, variance } = state;
  return { factor: Math.exp(log), sigma: Math.sqrt(variance ?? Number.NaN) };
}

describe('the machine factor', () => {
  it('is not known before anything was learned', () => {
    expect(startMachineFactor().variance).toBeNull();
  });

  it('finds the power per metered kilogram within its sigma, and is surer with time', () => {
    const short = learned(0.93, 1);
    const long = learned(0.93, 24);
    expect(Math.abs(long.factor - 0.93)).toBeLessThan(2 * long.sigma);
    expect(long.sigma).toBeLessThan(short.sigma);
    // It never gets surer than its walk allows: 0.1 % in an hour.
    expect(long.sigma).toBeGreaterThan(0.001);
  });

  it('learns as much from the same time in scans of half a minute as of five', () => {
    const fine = learned(0.93, 12, 30);
    const coarse = learned(0.93, 12, 300);
    // Readings are correlated over ten minutes, so more of them tell no more; to first order in the
    // step over that time.
    expect(fine.sigma / coarse.sigma).toBeGreaterThan(0.9);
    expect(fine.sigma / coarse.sigma).toBeLessThan(1.1);
  });

  it('takes no news in the first ten minutes after a change of mode', () => {
    const state = startMachineFactor();
    for (let n = 0; n < 9; n++) step(state, 2, 60);
    expect(state.variance).toBeNull();
    step(state, 2, 60);
    expect(Math.exp(state.log)).toBeCloseTo(2, 12);
  });

  it('gets less sure while nothing is learned', () => {
    const state = startMachineFactor();
    const { sigma } = learned(1, 6, 60, state);
    for (let n = 0; n < 24; n++) ageMachineFactor(state, 3600);
    // A day at 0.1 % per root of an hour.
    expect(state.variance).toBeCloseTo(sigma ** 2 + 24 * 0.001 ** 2, 12);
    expect(state.age_s).toBe(24 * 3600);
  });

  it('remembers the flow at which it learned', () => {
    const state = startMachineFactor();
    for (let n = 0; n < 120; n++) step(state, 1, 60, 8);
    expect(state.flow_kg_s).toBeCloseTo(8, 9);
    for (let n = 0; n < 24 * 60; n++) step(state, 1, 60, 16);
    expect(state.flow_kg_s).toBeGreaterThan(15);
    expect(state.flow_kg_s).toBeLessThanOrEqual(16);
  });

  it('follows a meter that steps by 7 % within two hours, however sure it was', () => {
    const state = startMachineFactor();
    learned(1, 24, 60, state);
    const after = learned(0.93, 2, 60, state);
    expect(Math.abs(after.factor - 0.93)).toBeLessThan(0.015);
  });

  it.each([Number.NaN, 0, -1, 7, Number.POSITIVE_INFINITY])(
    'takes no news from a ratio of %d',
    (ratio) => {
      const state = startMachineFactor();
      for (let n = 0; n < 100; n++) step(state, 1, 60);
      const before = { ...state };
      for (let n = 0; n < 100; n++) step(state, ratio, 60);
      expect(state.log).toBe(before.log);
      expect(state.variance).toBeGreaterThan(before.variance as number);
    },
  );
});
