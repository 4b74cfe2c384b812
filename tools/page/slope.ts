/**
 * Straight line by least squares.
 * @returns its slope, and the standard error of that from the scatter about the line
 * @throws RangeError for fewer than three points, or points at one place
 */
export function slope(x: readonly number[], y: readonly number[]): { slope: number; se: number } {
  const n = x.length;
  if (n < 3 || y.length !== n) throw new RangeError(`slope needs 3 points or more, got ${n}`);
  const mean = (all: readonly number[]) => all.reduce((sum, one) => sum + one, 0) / n;
  const [mx, my] = [mean(x), mean(y)];
  const sxx = x.reduce((sum, one) => sum + (one - mx) ** 2, 0);
  if (sxx === 0) throw new RangeError('slope needs points at different places');
  const b = x.reduce((sum, one, i) => sum + (one - mx) * (y[i]! - my), 0) / sxx;
  const rest = x.reduce((sum, one, i) => sum + (y[i]! - my - b * (one - mx)) ** 2, 0);
  return { slope: b, se: Math.sqrt(rest / (n - 2) / sxx) };
}
