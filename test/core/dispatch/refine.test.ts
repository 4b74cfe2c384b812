import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { halved } from '../../../src/core/dispatch/refine.js';

const cells = fc
  .array(fc.double({ min: -1e8, max: 1e9, noNaN: true }), { minLength: 1, maxLength: 60 })
  .map((values) => Float64Array.from(values));

describe('cells cut in two', () => {
  it('hold the same heat, pair by pair', () => {
    fc.assert(
      fc.property(cells, (coarse) => {
        const fine = halved(coarse);
        expect(fine.length).toBe(2 * coarse.length);
        coarse.forEach((own, i) => {
          const mean = ((fine[2 * i] as number) + (fine[2 * i + 1] as number)) / 2;
          // Round-off of numbers of 1e9.
          expect(Math.abs(mean - own)).toBeLessThan(1e-6);
        });
      }),
    );
  });

  it('make no new extreme', () => {
    fc.assert(
      fc.property(cells, (coarse) => {
        const fine = halved(coarse);
        expect(Math.max(...fine)).toBeLessThanOrEqual(Math.max(...coarse) + 1e-6);
        expect(Math.min(...fine)).toBeGreaterThanOrEqual(Math.min(...coarse) - 1e-6);
      }),
    );
  });

  it('lie on a straight line where the cells do, but for the two ends', () => {
    const line = Float64Array.from({ length: 10 }, (_, i) => 3 * i);
    const fine = halved(line);
    for (let i = 2; i < 18; i++) expect(fine[i]).toBeCloseTo(3 * (i / 2 - 0.25), 12);
  });
});
