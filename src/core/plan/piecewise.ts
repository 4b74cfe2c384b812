/** A point of a curve of straight lines. */
export interface CurvePoint {
  readonly x: number;
  readonly y: number;
}

/**
 * The fewest points, out of those given, whose straight lines stay within a tolerance of all of them
 * (Imai & Iri 1988: the shortest way through the graph of admissible lines; every admissible line has
 * length one). Among curves of as few points the one whose largest error is least.
 *
 * @param points x ascending, at least one
 * @param tolerance in y, at least 0
 * @returns indices of the points to keep, first and last among them
 */
export function fewestPoints(points: readonly CurvePoint[], tolerance: number): number[] {
  const n = points.length;
  if (n === 0) throw new RangeError('points must hold at least one point, got 0');
  points.forEach((point, i) => {
    if (i > 0 && !(point.x > (points[i - 1] as CurvePoint).x)) {
      throw new RangeError(`points[${i}].x = ${point.x}: expected above the one before`);
    }
  });
  const count = new Int32Array(n).fill(n + 1);
  const error = new Float64Array(n).fill(Number.POSITIVE_INFINITY);
  const from = new Int32Array(n).fill(-1);
  count[0] = 1;
  error[0] = 0;
  for (let j = 1; j < n; j++) {
    for (let i = 0; i < j; i++) {
      const points_ij = (count[i] as number) + 1;
      if (points_ij > (count[j] as number)) continue;
      const own = lineError(points, i, j);
      if (own > tolerance) continue;
      const worst = Math.max(own, error[i] as number);
      if (points_ij === count[j] && worst >= (error[j] as number)) continue;
      count[j] = points_ij;
      error[j] = worst;
      from[j] = i;
    }
  }
  const kept: number[] = [];
  for (let j = n - 1; j >= 0; j = from[j] as number) {
    kept.unshift(j);
    if (j === 0) break;
  }
  return kept;
}

/** Largest distance in y of the points between two from the straight line through these. */
function lineError(points: readonly CurvePoint[], i: number, j: number): number {
  const a = points[i] as CurvePoint;
  const b = points[j] as CurvePoint;
  let worst = 0;
  for (let k = i + 1; k < j; k++) {
    const { x, y } = points[k] as CurvePoint;
    worst = Math.max(worst, Math.abs(a.y + ((b.y - a.y) * (x - a.x)) / (b.x - a.x) - y));
  }
  return worst;
}

/** Value on straight lines through points of ascending x; beyond their ends the end's. */
export function valueAt(points: readonly CurvePoint[], x: number): number {
  const last = points.length - 1;
  if (x <= (points[0] as CurvePoint).x) return (points[0] as CurvePoint).y;
  if (x >= (points[last] as CurvePoint).x) return (points[last] as CurvePoint).y;
  let low = 0;
  let high = last;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if ((points[middle] as CurvePoint).x <= x) low = middle;
    else high = middle;
  }
  const a = points[low] as CurvePoint;
  const b = points[high] as CurvePoint;
  return a.y + ((b.y - a.y) * (x - a.x)) / (b.x - a.x);
}

/** Largest distance in y of points from a curve of straight lines, over the points' own x. */
export function largestError(curve: readonly CurvePoint[], of: readonly CurvePoint[]): number {
  return of.reduce((worst, { x, y }) => Math.max(worst, Math.abs(valueAt(curve, x) - y)), 0);
}
