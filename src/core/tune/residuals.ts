import type { EstimatorDefinition } from '../definitions.js';
import { solve } from './linear.js';
import { KEPT } from './normal.js';
import type { TuneBin } from './record.js';
import { rowWeight, sensorRow, sensorSize } from './sensorColumns.js';
import type { StringColumns } from './stringColumns.js';
import type { StringData } from './stringData.js';

/** What one thermocouple leaves once all was fitted: rms [K], and over how many bins it lasts. */
export interface SensorResidual {
  readonly rms_K: number;
  /** The same weighted down where a front passes. */
  readonly even_K: number;
  readonly lasting: number;
}

/** Bins over which an autocorrelation is looked for: half a day. */
const LAGS = 144;

/**
 * What the sensors of a string leave after the string's own step and their own errors were fitted.
 * Successive bins leave alike (a model that is a little wrong stays so), so the variance of a mean
 * is that of white noise times the integrated autocorrelation 1 + 2 sum rho_k, taken up to where
 * rho first falls below 0.05.
 *
 * @param step change of [kept | own] columns to which the residuals are taken
 */
export function sensorResiduals(
  data: StringData,
  columns: StringColumns,
  step: Float64Array,
  bins: readonly TuneBin[],
  s: number,
  noise_K: number,
  estimator: EstimatorDefinition,
): (SensorResidual | null)[] {
  const n = data.positions_m.length;
  const q = columns.columns.length;
  const p = sensorSize(data);
  const own = new Float64Array(p);
  return data.positions_m.map((_, j) => {
    const r = new Float64Array(bins.length).fill(Number.NaN);
    const share = new Float64Array(bins.length);
    const D = new Float64Array(p * p);
    const d = new Float64Array(p);
    for (let i = 0; i < p; i++) D[i * p + i] = 1;
    let count = 0;
    for (let b = 0; b < bins.length; b++) {
      const z = bins[b]?.readings[s]?.[data.first + j] as number;
      if (!Number.isFinite(z)) continue;
      const at = b * n + j;
      let left = z - (columns.run.value[at] as number);
      for (let c = 0; c < q; c++) {
        left -= (step[c] as number) * ((columns.columns[c] as Float64Array)[at] as number);
      }
      r[b] = left;
      const weight = rowWeight(columns.run, at, noise_K, left, estimator);
      share[b] = noise_K * Math.sqrt(weight);
      count++;
      sensorRow(data, columns.run, b, j, estimator, own);
      for (let i = 0; i < p; i++) {
        const f = weight * (own[i] as number);
        if (f === 0) continue;
        d[i] = (d[i] as number) + f * left;
        for (let e = 0; e <= i; e++)
          D[i * p + e] = (D[i * p + e] as number) + f * (own[e] as number);
      }
    }
    if (count < 2 * KEPT) return null;
    const x = solve(D, p, d);
    for (let b = 0; b < bins.length; b++) {
      if (Number.isNaN(r[b] as number)) continue;
      sensorRow(data, columns.run, b, j, estimator, own);
      for (let i = 0; i < p; i++) r[b] = (r[b] as number) - (x[i] as number) * (own[i] as number);
    }
    // As of a reading that no front passes and no fault holds.
    const even = r.map((value, b) => value * (share[b] as number));
    return { rms_K: rms(r), even_K: rms(even), lasting: lasting(even) };
  });
}

function rms(r: Float64Array): number {
  let sum = 0;
  let n = 0;
  for (const value of r) {
    if (Number.isNaN(value)) continue;
    sum += value * value;
    n++;
  }
  return Math.sqrt(sum / Math.max(1, n));
}

function lasting(r: Float64Array): number {
  const variance = rms(r) ** 2;
  if (!(variance > 0)) return 1;
  let sum = 1;
  for (let lag = 1; lag < Math.min(LAGS, r.length / 4); lag++) {
    let product = 0;
    let n = 0;
    for (let b = lag; b < r.length; b++) {
      const two = (r[b] as number) * (r[b - lag] as number);
      if (Number.isNaN(two)) continue;
      product += two;
      n++;
    }
    const rho = n === 0 ? 0 : product / n / variance;
    if (rho < 0.05) break;
    sum += 2 * rho;
  }
  return sum;
}
