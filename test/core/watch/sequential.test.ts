import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  decisionAt,
  newInformation,
  type SequentialState,
  sequentialScore,
  startSequential,
  stepSequential,
} from '../../../src/core/watch/sequential.js';
import { normals } from './normals.js';

const number = (min: number, max: number) => fc.double({ min, max, noNaN: true });

/** Values until the first decision, `most` where there is none. */
function runLength(
  draw: () => number,
  {
    shift,
    sigma = () => 1,
    decision = Math.log(50),
    most = 4000,
    mean = 0,
  }: {
    /** Of degraded over healthy, in units of 1. */
    shift: number;
    sigma?: (n: number) => number;
    decision?: number;
    most?: number;
    /** Where the plant truly is. */
    mean?: number;
  },
): number {
  const state = startSequential();
  for (let n = 1; n <= most; n++) {
    const s = sigma(n);
    const value = mean + s * draw();
    stepSequential(state, { value, sigma: s, healthy: 0, degraded: shift }, decision);
    if (state.degraded) return n;
  }
  return most;
}

/** Mean of repeated runs and the standard error of it. */
function meanRun(runs: number, once: () => number): { mean: number; error: number } {
  const lengths = Array.from({ length: runs }, once);
  const mean = lengths.reduce((sum, n) => sum + n, 0) / runs;
  const variance = lengths.reduce((sum, n) => sum + (n - mean) ** 2, 0) / (runs - 1);
  return { mean, error: Math.sqrt(variance / runs) };
}

describe('mean run length in control', () => {
  // Cut off at 4000 values, which only lowers the mean.
  it.each([
    { shift: 0.5, words: 'half a sigma' },
    { shift: 1, words: 'a sigma' },
    { shift: -1.5, words: 'one and a half the other way' },
  ])('is at least gamma where degraded is $words away (Lorden)', ({ shift }) => {
    const draw = normals(11);
    const { mean, error } = meanRun(400, () => runLength(draw, { shift }));
    expect(mean - 3 * error).toBeGreaterThan(50);
  });

  it('is at least gamma where the sigmas change from value to value', () => {
    const draw = normals(12);
    const sigma = (n: number) => [0.4, 1, 3][n % 3] as number;
    const { mean, error } = meanRun(400, () => runLength(draw, { shift: 1, sigma }));
    expect(mean - 3 * error).toBeGreaterThan(50);
  });

  it('is far longer where the plant is better than just healthy', () => {
    const draw = normals(13);
    const { mean } = meanRun(100, () => runLength(draw, { shift: 1, mean: -1, most: 2000 }));
    expect(mean).toBeGreaterThan(1500);
  });

  it('falls short of gamma where sigma is told too small, so that an honest one matters', () => {
    const draw = normals(14);
    const { mean } = meanRun(200, () => runLength(() => 2 * draw(), { shift: 1 }));
    expect(mean).toBeLessThan(50);
  });
});

describe('mean run length of several tests', () => {
  /** Values until the first of several tests decides; each pair of two sides shares its values. */
  function firstOf(draw: () => number, pairs: number, decision: number): number {
    const tests = Array.from({ length: pairs }, () => [startSequential(), startSequential()]);
    for (let n = 1; n <= 4000; n++)
      for (const [up, down] of tests as [SequentialState, SequentialState][]) {
        const value = draw();
        const at = { sigma: 1, healthy: 0, degraded: 1 };
        stepSequential(up, { ...at, value }, decision);
        stepSequential(down, { ...at, value: -value }, decision);
        if (up.degraded || down.degraded) return n;
      }
    return 4000;
  }

  it('of one indicator is at least what is asked, its tests counted', () => {
    const draw = normals(17);
    const { mean, error } = meanRun(200, () => firstOf(draw, 1, decisionAt(50, 86_400, 2)));
    expect(mean - 3 * error).toBeGreaterThan(50);
  });

  it('of a unit is at least that over the number of its indicators', () => {
    const draw = normals(18);
    const { mean, error } = meanRun(120, () => firstOf(draw, 5, decisionAt(200, 86_400, 2)));
    expect(mean - 3 * error).toBeGreaterThan(200 / 5);
  });

  it('falls short of what is asked where a test is not counted', () => {
    const draw = normals(19);
    // Of ten tests that decide as one: the mean to the first is that of one over their number.
    const { mean } = meanRun(120, () => firstOf(draw, 5, decisionAt(200, 86_400)));
    expect(mean).toBeLessThan(200);
  });
});

describe('delay of a detection', () => {
  // Wald: threshold and overshoot over the mean step delta^2/2; two values where half a decision caps them.
  it.each([0.7, 1, 2])('follows from the mean step where degraded is %d sigmas away', (shift) => {
    const draw = normals(15);
    const decision = Math.log(5000);
    const { mean } = meanRun(400, () => runLength(draw, { shift, mean: shift, decision }));
    const step = shift ** 2 / 2;
    expect(mean).toBeLessThan((decision + shift + step) / step);
    expect(mean).toBeGreaterThan(Math.max(2, (0.6 * decision) / step));
  });

  it('takes two values at least, however wild', () => {
    const draw = normals(16);
    expect(runLength(draw, { shift: 1, mean: 1e6 })).toBe(2);
  });
});

describe('the test', () => {
  it('keeps scores within 0 and 1, and says degraded only from a whole decision on', () => {
    fc.assert(
      fc.property(
        fc.array(fc.record({ value: number(-9, 9), sigma: number(0.1, 5) }), { maxLength: 60 }),
        number(0.1, 3),
        number(3, 15),
        (values, degraded, decision) => {
          const state = startSequential();
          for (const one of values) {
            const before = state.degraded;
            const score = stepSequential(state, { ...one, healthy: 0, degraded }, decision);
            expect(score).toBeGreaterThanOrEqual(0);
            expect(score).toBeLessThanOrEqual(1);
            if (!before) expect(state.degraded).toBe(score === 1);
            expect(score).toBe(sequentialScore(state, decision));
          }
          expect(state.count).toBe(values.length);
        },
      ),
      { seed: 3, numRuns: 200 },
    );
  });

  it('takes as much evidence back as it took forth', () => {
    const state: SequentialState = startSequential();
    const step = (value: number) =>
      stepSequential(state, { value, sigma: 1, healthy: 0, degraded: 2 }, 8);
    const until = (value: number, degraded: boolean): number => {
      let n = 0;
      while (state.degraded !== degraded) {
        step(value);
        n++;
      }
      return n;
    };
    expect(until(2, true)).toBe(4);
    expect(until(0, false)).toBe(4);
    expect(state.up).toBe(0);
  });

  it('refuses what it cannot weigh', () => {
    const value = { value: 0, sigma: 1, healthy: 0, degraded: 1 };
    expect(() => stepSequential(startSequential(), { ...value, sigma: 0 }, 5)).toThrow(RangeError);
    expect(() => stepSequential(startSequential(), value, 0)).toThrow(/decision must be positive/);
    expect(() => stepSequential(startSequential(), { ...value, value: Number.NaN }, 5)).toThrow(
      /not finite/,
    );
    expect(() => decisionAt(0, 60)).toThrow(/inControl_d/);
    expect(() => decisionAt(1, 0)).toThrow(/spacing_s/);
    expect(() => decisionAt(1, 60, 0)).toThrow(/tests/);
  });

  it('asks for more evidence where values come more often, never for less than 20 to 1', () => {
    expect(decisionAt(3000, 3600)).toBeCloseTo(Math.log(72_000), 12);
    expect(decisionAt(3000, 3600, 4)).toBeCloseTo(Math.log(4 * 72_000), 12);
    expect(decisionAt(1, 86_400)).toBe(Math.log(20));
  });
});

describe('what a filter has learned between two of its values', () => {
  it('is the measurement that it took in, with its sigma', () => {
    fc.assert(
      fc.property(
        number(-2, 2),
        number(0.05, 2),
        number(0, 0.5),
        number(-3, 3),
        number(0.02, 3),
        (value, sigma, walk, z, r) => {
          const p0 = sigma ** 2 + walk;
          const gain = p0 / (p0 + r ** 2);
          const after = { value: value + gain * (z - value), sigma: Math.sqrt(p0 * (1 - gain)) };
          const news = newInformation({ value, sigma }, after, walk);
          if (gain <= 0.02) expect(news).toBeNull();
          else if (gain > 0.021) {
            expect(news!.value).toBeCloseTo(z, 6);
            expect(news!.sigma / r).toBeCloseTo(1, 6);
          }
        },
      ),
      { seed: 4, numRuns: 300 },
    );
  });
});
