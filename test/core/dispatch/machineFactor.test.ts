import { describe, expect, it } from 'vitest';
import {
  machineFactor,
  startMachineFactor,
  stepMachineFactor,
} from '../../../src/core/dispatch/machineFactor.js';
import { mulberry } from '../../support/random.js';

const PRIOR = { factor: 1.05, sigma: 0.06 };

/** Runs a factor for some hours on ratios that scatter by 3 % about `truth`. */
function learned(truth: number, hours: number, dt_s = 60) {
  const random = mulberry(3);
  const state = startMachineFactor();
  for (let t = 0; t < hours * 3600; t += dt_s) {
    stepMachineFactor(state, truth * (1 + 0.06 * (random() - 0.5)), dt_s, PRIOR);
  }
  return machineFactor(state, PRIOR);
}

describe('the machine factor', () => {
  it('is what the meter suggests before anything was learned', () => {
    expect(machineFactor(startMachineFactor(), PRIOR)).toEqual(PRIOR);
  });

  it('finds the power per metered kilogram within its sigma, and is surer with time', () => {
    const short = learned(0.93, 1);
    const long = learned(0.93, 24);
    expect(Math.abs(long.factor - 0.93)).toBeLessThan(2 * long.sigma);
    expect(long.sigma).toBeLessThan(short.sigma);
    expect(short.sigma).toBeLessThan(PRIOR.sigma);
    // It never gets surer than its walk allows: 0.4 % in an hour.
    expect(long.sigma).toBeGreaterThan(0.004);
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
    for (let n = 0; n < 9; n++) stepMachineFactor(state, 2, 60, PRIOR);
    expect(machineFactor(state, PRIOR)).toEqual(PRIOR);
  });

  it.each([Number.NaN, 0, -1, 7, Number.POSITIVE_INFINITY])(
    'takes no news from a ratio of %d',
    (ratio) => {
      const state = startMachineFactor();
      for (let n = 0; n < 100; n++) stepMachineFactor(state, 1, 60, PRIOR);
      const before = machineFactor(state, PRIOR);
      for (let n = 0; n < 100; n++) stepMachineFactor(state, ratio, 60, PRIOR);
      const after = machineFactor(state, PRIOR);
      expect(after.factor).toBe(before.factor);
      expect(after.sigma).toBeGreaterThan(before.sigma);
    },
  );
});
