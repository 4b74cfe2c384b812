/** A joint normal: mean, and covariance as symmetric rows. */
export interface Gaussian {
  readonly mean: Float64Array;
  readonly covariance: Float64Array[];
}

/** Independent components around zero. */
export function independent(variances: readonly number[]): Gaussian {
  return {
    mean: new Float64Array(variances.length),
    covariance: variances.map((v, i) => {
      const row = new Float64Array(variances.length);
      row[i] = v;
      return row;
    }),
  };
}

/**
 * One scalar measurement y = h x + noise: x <- x + k (y - h x), P <- P - k k' s, with s = h P h' + r
 * and k = P h'/s, in place; symmetric to the bit.
 */
export function observe(g: Gaussian, h: readonly number[], y: number, r: number): void {
  const n = g.mean.length;
  const ph = g.covariance.map((row) => row.reduce((sum, v, j) => sum + v * (h[j] as number), 0));
  const s = ph.reduce((sum, v, i) => sum + v * (h[i] as number), r);
  if (!(s > 0)) return;
  const innovation = y - g.mean.reduce((sum, v, i) => sum + v * (h[i] as number), 0);
  for (let i = 0; i < n; i++) {
    const gain = (ph[i] as number) / s;
    g.mean[i] = (g.mean[i] as number) + gain * innovation;
    const row = g.covariance[i] as Float64Array;
    for (let j = 0; j < n; j++) {
      row[j] = (row[j] as number) - ((ph[i] as number) * (ph[j] as number)) / s;
    }
  }
}

/** Mean and covariance of A x. */
export function transformed(g: Gaussian, a: readonly (readonly number[])[]): Gaussian {
  const dot = (u: readonly number[], v: ArrayLike<number>): number =>
    u.reduce((sum, x, i) => sum + x * (v[i] as number), 0);
  return {
    mean: Float64Array.from(a, (row) => dot(row, g.mean)),
    covariance: a.map((left) => {
      const projected = g.covariance.map((row) => dot(left, row));
      return Float64Array.from(a, (right) => dot(right, projected));
    }),
  };
}
