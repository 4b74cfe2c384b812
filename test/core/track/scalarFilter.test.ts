import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { stepScalar } from '../../../src/core/track/scalarFilter.js';

const finite = fc.double({ min: -1e6, max: 1e6, noNaN: true });
const variance = fc.double({ min: 1e-9, max: 1e9, noNaN: true });

describe('scalar filter', () => {
  it('agrees with the textbook written as a weighted mean of precisions', () => {
    fc.assert(
      fc.property(finite, variance, finite, variance, finite, variance, (x, P, u, q, z, r) => {
        const state = stepScalar(
          { mean: x, variance: P },
          { change: u, processVariance: q, measurement: { mean: z, variance: r } },
        );
        const prior = P + q;
        const mean = ((x + u) * r + z * prior) / (prior + r);
        const left = (prior * r) / (prior + r);
        // P' - K P' cancels where K is near 1: error a few spacings of P', not of the result.
        const spacing = 4 * Number.EPSILON;
        expect(Math.abs(state.variance - left)).toBeLessThanOrEqual(spacing * prior);
        const size = Math.abs(x) + Math.abs(u) + Math.abs(z);
        // Products of subnormal numbers keep no relative precision: 1e-300 stands for them.
        expect(Math.abs(state.mean - mean)).toBeLessThanOrEqual(spacing * size + 1e-300);
        expect(state.variance).toBeGreaterThanOrEqual(0);
      }),
      { seed: 11, numRuns: 2000 },
    );
  });

  it('only predicts where nothing is measured', () => {
    fc.assert(
      fc.property(finite, variance, finite, variance, (x, P, u, q) => {
        const step = { change: u, processVariance: q, measurement: null };
        const state = stepScalar({ mean: x, variance: P }, step);
        expect(state).toEqual({ mean: x + u + 0, variance: P + q });
      }),
      { seed: 12 },
    );
  });

  it('takes process noise and measurement noise the right way round', () => {
    const certain = { change: 0, processVariance: 0, measurement: { mean: 1, variance: 1e-6 } };
    expect(stepScalar({ mean: 0, variance: 1 }, certain).mean).toBeCloseTo(1, 5);
    const vague = { change: 0, processVariance: 0, measurement: { mean: 1, variance: 1e6 } };
    expect(stepScalar({ mean: 0, variance: 1 }, vague).mean).toBeCloseTo(0, 5);
  });

  it('holds a known state that has neither variance nor noise, which kalmanjs alone turns to NaN', () => {
    const still = { change: 0, processVariance: 0, measurement: null };
    expect(stepScalar({ mean: 4, variance: 0 }, still)).toEqual({ mean: 4, variance: 0 });
    const read = { change: 0, processVariance: 0, measurement: { mean: 9, variance: 2 } };
    expect(stepScalar({ mean: 4, variance: 0 }, read)).toEqual({ mean: 4, variance: 0 });
  });

  it('does not depend on calls before: the same state and step give the same bits', () => {
    const step = { change: 0.1, processVariance: 0.3, measurement: { mean: 2.7, variance: 0.9 } };
    const first = stepScalar({ mean: 1.1, variance: 0.7 }, step);
    stepScalar({ mean: -50, variance: 3 }, step);
    expect(stepScalar({ mean: 1.1, variance: 0.7 }, step)).toEqual(first);
  });

  it('refuses by name what would make kalmanjs start afresh or coerce', () => {
    const step = { change: 0, processVariance: 1, measurement: { mean: 0, variance: 1 } };
    const bad = (state: unknown, change: object) => () =>
      stepScalar(state as never, { ...step, ...change } as never);
    const sound = { mean: 0, variance: 1 };
    expect(bad({ mean: Number.NaN, variance: 1 }, {})).toThrow(/state\.mean.*NaN/);
    expect(bad({ mean: 0, variance: -1 }, {})).toThrow(/state\.variance.*-1/);
    expect(bad(sound, { change: Number.NaN })).toThrow(/change.*NaN/);
    expect(bad(sound, { processVariance: Number.POSITIVE_INFINITY })).toThrow(/processVariance/);
    expect(bad(sound, { measurement: { mean: Number.NaN, variance: 1 } })).toThrow(
      /measurement\.mean/,
    );
    expect(bad(sound, { measurement: { mean: null, variance: 1 } })).toThrow(/null/);
    expect(bad(sound, { measurement: { mean: '3', variance: 1 } })).toThrow(/measurement\.mean.*3/);
    expect(bad(sound, { measurement: { mean: 0, variance: 0 } })).toThrow(
      /measurement\.variance.*0/,
    );
  });
});
