import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type CurvePoint,
  fewestPoints,
  largestError,
  valueAt,
} from '../../../src/core/plan/piecewise.js';

/** Whole numbers, and a tolerance that no distance of theirs is close to. */
const curve = fc
  .array(fc.tuple(fc.integer({ min: 1, max: 4 }), fc.integer({ min: -5, max: 5 })), {
    minLength: 1,
    maxLength: 9,
  })
  .map((steps) => {
    let x = 0;
    return steps.map(([step, y]): CurvePoint => {
      x += step;
      return { x, y };
    });
  });
const tolerances = fc.integer({ min: 0, max: 4 }).map((n) => n * 0.7 + 1e-7);

/** Fewest points by trying every choice of points to keep. */
function bruteForce(points: readonly CurvePoint[], tolerance: number): number {
  const inner = points.length - 2;
  let fewest = points.length;
  for (let mask = 0; mask < 2 ** Math.max(0, inner); mask++) {
    const kept = points.filter(
      (_, i) => i === 0 || i === points.length - 1 || (mask >> (i - 1)) & 1,
    );
    if (kept.length < fewest && largestError(kept, points) <= tolerance) fewest = kept.length;
  }
  return fewest;
}

describe('a curve of the fewest straight lines', () => {
  it('keeps within its tolerance, with both ends, and with no point too many', () => {
    fc.assert(
      fc.property(curve, tolerances, (points, tolerance) => {
        const kept = fewestPoints(points, tolerance).map((i) => points[i] as CurvePoint);
        expect(kept[0]).toBe(points[0]);
        expect(kept.at(-1)).toBe(points.at(-1));
        expect(largestError(kept, points)).toBeLessThanOrEqual(tolerance);
        expect(kept.length).toBe(bruteForce(points, tolerance));
      }),
      { seed: 4, numRuns: 200 },
    );
  });

  it('takes two points for a straight line and three for a kink, with the kink among them', () => {
    const line = Array.from({ length: 20 }, (_, i) => ({ x: i, y: 3 - 0.5 * i }));
    expect(fewestPoints(line, 1e-12)).toEqual([0, 19]);
    const kink = line.map(({ x }) => ({ x, y: Math.max(0, 7 - x) }));
    expect(fewestPoints(kink, 1e-12)).toEqual([0, 7, 19]);
    expect(valueAt(kink, 6.25)).toBeCloseTo(0.75, 12);
    expect(valueAt(kink, -1)).toBe(7);
    expect(valueAt(kink, 30)).toBe(0);
  });

  it('refuses points that do not ascend, and none at all', () => {
    expect(() => fewestPoints([], 1)).toThrow(/points must hold at least one point, got 0/);
    const twice = [
      { x: 1, y: 0 },
      { x: 1, y: 2 },
    ];
    expect(() => fewestPoints(twice, 1)).toThrow(/points\[1\]\.x = 1: expected above/);
  });
});
