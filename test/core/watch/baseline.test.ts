import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { baseline, learnBaseline, startBaseline } from '../../../src/core/watch/baseline.js';

const RULE = { floor: 0.02, enough: 0.05, least: 3 };
const H = 3_600_000;

/** Learns values of one sigma, an hour apart. */
function learned(values: readonly number[], sigma = 0.06, from_ms: number | null = null) {
  const state = startBaseline();
  values.forEach((value, n) => {
    learnBaseline(state, { value, sigma }, n * H, from_ms, RULE);
  });
  return state;
}

describe('what is healthy, as learned', () => {
  it('is the weighted mean, with a sigma that no number of values takes below the floor', () => {
    const values = fc.array(
      fc.record({
        value: fc.double({ min: -3, max: 3, noNaN: true }),
        sigma: fc.double({ min: 0.2, max: 2, noNaN: true }),
      }),
      { minLength: 1, maxLength: 12 },
    );
    fc.assert(
      fc.property(values, (taken) => {
        const state = startBaseline();
        taken.forEach((one, n) => {
          learnBaseline(state, one, n * H, null, RULE);
        });
        const { value, sigma } = baseline(state, RULE)!;
        const weight = taken.reduce((sum, one) => sum + one.sigma ** -2, 0);
        const mean = taken.reduce((sum, one) => sum + one.value * one.sigma ** -2, 0) / weight;
        expect(value).toBeCloseTo(mean, 9);
        expect(sigma).toBeCloseTo(Math.hypot(1 / Math.sqrt(weight), RULE.floor), 9);
      }),
      { seed: 6, numRuns: 200 },
    );
  });

  it('is nothing before the first value', () => {
    expect(baseline(startBaseline(), RULE)).toBeNull();
  });

  it('is kept once it is sure enough and of enough values, so that a decay is not followed', () => {
    // 1/sqrt(w) = 0.06/sqrt(3) = 0.035, with the floor 0.04.
    const state = learned([1, 1, 1]);
    expect(state.kept).toBe(true);
    learnBaseline(state, { value: 0, sigma: 0.001 }, 9 * H, null, RULE);
    expect(baseline(state, RULE)?.value).toBe(1);
    expect(state).toMatchObject({ count: 3, from_ms: 0, to_ms: 2 * H });
    expect(learned([1, 1]).kept).toBe(false);
  });

  it('begins with the time configured, and anew where that changes', () => {
    const state = learned([5, 5, 1, 1, 1], 0.06, 2 * H);
    expect(baseline(state, RULE)?.value).toBe(1);
    expect(state.from_ms).toBe(2 * H);
    learnBaseline(state, { value: 3, sigma: 0.1 }, 8 * H, 7 * H, RULE);
    expect(baseline(state, RULE)?.value).toBeCloseTo(3, 12);
    expect(state).toMatchObject({ kept: false, count: 1, begun_ms: 7 * H });
  });

  it('refuses what cannot be learned from', () => {
    for (const value of [
      { value: Number.NaN, sigma: 1 },
      { value: 1, sigma: 0 },
    ])
      expect(() => learnBaseline(startBaseline(), value, 0, null, RULE)).toThrow(RangeError);
  });
});
