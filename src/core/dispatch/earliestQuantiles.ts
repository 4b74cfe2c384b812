import type { Quantiles } from '../estimate.js';
import { normalPoints } from './normalPoints.js';

/**
 * Quantiles of the earliest of jointly Gaussian times, in hours, over fixed quasi-random points:
 * the discharge ends with the first rule that breaks. Times before now count as now.
 *
 * @param mean time of each rule [s]
 * @param covariance of the times, symmetric, may be singular [s2]
 */
export function earliestQuantiles(
  mean: readonly number[],
  covariance: readonly Float64Array[],
): Quantiles {
  const n = mean.length;
  const factor = cholesky(covariance);
  const points = normalPoints();
  const count = (points[0] as Float64Array).length;
  const hours = new Float64Array(count);
  for (let k = 0; k < count; k++) {
    let least = Number.POSITIVE_INFINITY;
    for (let a = 0; a < n; a++) {
      let value = mean[a] as number;
      for (let b = 0; b <= a; b++) {
        value += (factor[a]?.[b] as number) * (points[b]?.[k] as number);
      }
      least = Math.min(least, value);
    }
    hours[k] = Math.max(0, least) / 3600;
  }
  hours.sort();
  const at = (p: number): number => hours[Math.min(count - 1, Math.floor(p * count))] as number;
  return { p90: at(0.1), p50: at(0.5), p10: at(0.9) };
}

/** Lower factor of a covariance that may be singular: a vanishing pivot gives a zero column. */
export function cholesky(a: readonly Float64Array[]): Float64Array[] {
  const n = a.length;
  const out = a.map(() => new Float64Array(n));
  for (let j = 0; j < n; j++) {
    for (let i = j; i < n; i++) {
      let sum = a[i]?.[j] as number;
      for (let k = 0; k < j; k++) sum -= (out[i]?.[k] as number) * (out[j]?.[k] as number);
      const pivot = out[j]?.[j] as number;
      if (i === j) (out[i] as Float64Array)[j] = Math.sqrt(Math.max(0, sum));
      else (out[i] as Float64Array)[j] = pivot > 1e-9 ? sum / pivot : 0;
    }
  }
  return out;
}
