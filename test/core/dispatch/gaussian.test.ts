import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { independent, observe, transformed } from '../../../src/core/dispatch/gaussian.js';

const value = fc.double({ min: -2, max: 2, noNaN: true });
const variance = fc.double({ min: 1e-4, max: 4, noNaN: true });

describe('a joint normal', () => {
  it('weighs a measurement against the prior by their variances', () => {
    const g = independent([4]);
    observe(g, [1], 3, 1);
    // (3/1)/(1/4 + 1/1) and 1/(1/4 + 1/1)
    expect(g.mean[0]).toBeCloseTo(2.4, 12);
    expect(g.covariance[0]?.[0]).toBeCloseTo(0.8, 12);
  });

  it('shares a measured sum by variance and leaves the parts opposed', () => {
    const g = independent([1, 3]);
    observe(g, [1, 1], 2, 0);
    expect(Array.from(g.mean)).toEqual([0.5, 1.5]);
    expect(g.covariance[0]?.[1]).toBeCloseTo(-0.75, 12);
    // The sum is known exactly.
    const sum = transformed(g, [[1, 1]]);
    expect(sum.mean[0]).toBeCloseTo(2, 12);
    expect(sum.covariance[0]?.[0]).toBeCloseTo(0, 12);
  });

  it('stays symmetric to the bit and non-negative, whatever is measured', () => {
    fc.assert(
      fc.property(
        fc.array(variance, { minLength: 3, maxLength: 3 }),
        fc.array(fc.tuple(fc.array(value, { minLength: 3, maxLength: 3 }), value, variance), {
          minLength: 1,
          maxLength: 20,
        }),
        (variances, measurements) => {
          const g = independent(variances);
          for (const [h, y, r] of measurements) observe(g, h, y, r);
          for (let i = 0; i < 3; i++) {
            expect(g.covariance[i]?.[i]).toBeGreaterThanOrEqual(-1e-12);
            expect(g.covariance[i]?.[i]).toBeLessThanOrEqual(variances[i] as number);
            for (let j = 0; j < i; j++) expect(g.covariance[i]?.[j]).toBe(g.covariance[j]?.[i]);
          }
        },
      ),
    );
  });

  it('takes no news from what is known exactly', () => {
    const g = independent([0, 1]);
    observe(g, [1, 0], 5, 0);
    expect(Array.from(g.mean)).toEqual([0, 0]);
  });
});
