import { describe, expect, it } from 'vitest';
import { oneLessDecay, timesMeanDecay } from '../../../src/core/bed/decay.js';
import { mulberry } from '../../support/random.js';

const random = mulberry(7);
const upTo = (end: number): number[] => Array.from({ length: 5000 }, () => end * random());
const EPSILON = 2 ** -52;

describe('exponentials of the time step', () => {
  it('are 1 - exp(-x), in the table, at its points, at its end and beyond', () => {
    const edges = [0, 1 / 32, 1 / 16, 39.96, 39.97, 40, 41, 800, Number.POSITIVE_INFINITY];
    const x = [...upTo(1e-3), ...upTo(1), ...upTo(45), ...edges];
    const found = Float64Array.from(x);
    oneLessDecay(found);
    // expm1 is right to a rounding; ours adds that of the table's point, of the product and of 1 - it.
    x.forEach((value, i) => {
      const apart = Math.abs((found[i] as number) + Math.expm1(-value));
      expect(apart, `x = ${value}`).toBeLessThanOrEqual(2 * EPSILON);
    });
  });

  it('are the mean of exp(-x) over 0..p, within the series and beyond, as a factor', () => {
    const p = [...upTo(1e-3), ...upTo(0.8), ...upTo(3), 0.8, 1e-300];
    const found = new Float64Array(p.length).fill(0.5);
    timesMeanDecay(Float64Array.from(p), found);
    p.forEach((value, i) => {
      const exact = (0.5 * -Math.expm1(-value)) / value;
      const apart = Math.abs((found[i] as number) / exact - 1);
      expect(apart, `p = ${value}`).toBeLessThanOrEqual(4 * EPSILON);
    });
  });

  it('let no fault pass for a number, and stand at one where nothing is exchanged', () => {
    const x = Float64Array.of(Number.NaN, -1);
    oneLessDecay(x);
    expect(x[0]).toBeNaN();
    expect(x[1]).toBe(1 - Math.exp(1));
    const out = Float64Array.of(1, 1);
    timesMeanDecay(Float64Array.of(0, Number.NaN), out);
    expect(out[0]).toBe(1);
    expect(out[1]).toBeNaN();
  });
});
