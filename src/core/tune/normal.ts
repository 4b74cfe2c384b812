import type { EstimatorDefinition } from '../definitions.js';
import { STORE_PARAMETERS } from './fitTypes.js';
import { backward, choleskyInPlace, forward } from './linear.js';
import type { TuneBin } from './record.js';
import { rowWeight, sensorRow, sensorSize } from './sensorColumns.js';
import type { StringColumns } from './stringColumns.js';
import type { StringData } from './stringData.js';

/** Normal equations of one string after its nuisance was eliminated, and the way back to it. */
export interface StringNormal {
  /** Over the store's parameters and the string's own flow: information and right-hand side. */
  readonly information: Float64Array;
  readonly right: Float64Array;
  readonly size: number;
  /** Change of the string's own states for a change of the former. */
  own(step: Float64Array): Float64Array;
}

/** Columns that are no nuisance: the store's own and the string's flow. */
export const KEPT = STORE_PARAMETERS.length + 1;

/**
 * Least squares of one string's residuals r = z - run, over kept columns, the string's own and each
 * sensor's own:
 *
 *   min sum w (r - G g - S s)^2 + sum (u/sigma)^2
 *
 * Sensors' own columns are eliminated one sensor at a time, then the string's (Schur complements), so
 * that the cost is that of many small systems.
 *
 * @param noise_K noise of one bin's reading [K]
 * @param doubting whether readings far off are taken for faults: not before the model nearly fits
 */
export function stringNormal(
  data: StringData,
  columns: StringColumns,
  bins: readonly TuneBin[],
  s: number,
  noise_K: number,
  doubting: boolean,
  estimator: EstimatorDefinition,
): StringNormal {
  const q = columns.columns.length;
  const p = sensorSize(data);
  const n = data.positions_m.length;
  const A = new Float64Array(q * q);
  const right = new Float64Array(q);
  const row = new Float64Array(q);
  const own = new Float64Array(p);
  for (let j = 0; j < n; j++) {
    if (!data.used[j]) continue;
    const B = new Float64Array(p * q);
    const D = new Float64Array(p * p);
    const d = new Float64Array(p);
    for (let i = 0; i < p; i++) D[i * p + i] = 1;
    for (let b = 0; b < bins.length; b++) {
      const z = bins[b]?.readings[s]?.[data.first + j] as number;
      if (!Number.isFinite(z)) continue;
      const at = b * n + j;
      const r = z - (columns.run.value[at] as number);
      const weight = rowWeight(columns.run, at, noise_K, doubting ? r : 0, estimator);
      for (let c = 0; c < q; c++) row[c] = (columns.columns[c] as Float64Array)[at] as number;
      sensorRow(data, columns.run, b, j, estimator, own);
      for (let c = 0; c < q; c++) {
        const f = weight * (row[c] as number);
        if (f === 0) continue;
        right[c] = (right[c] as number) + f * r;
        for (let e = 0; e <= c; e++)
          A[c * q + e] = (A[c * q + e] as number) + f * (row[e] as number);
      }
      for (let i = 0; i < p; i++) {
        const f = weight * (own[i] as number);
        if (f === 0) continue;
        d[i] = (d[i] as number) + f * r;
        for (let c = 0; c < q; c++)
          B[i * q + c] = (B[i * q + c] as number) + f * (row[c] as number);
        for (let e = 0; e <= i; e++)
          D[i * p + e] = (D[i * p + e] as number) + f * (own[e] as number);
      }
    }
    eliminate(A, right, q, B, D, d, p);
  }
  for (let c = KEPT; c < q; c++) {
    const sigma = Math.max(1e-6, columns.sigmas[c - KEPT] as number);
    A[c * q + c] = (A[c * q + c] as number) + 1 / sigma ** 2;
    right[c] = (right[c] as number) - (columns.values[c - KEPT] as number) / sigma ** 2;
  }
  return withoutOwn(A, right, q);
}

/** A <- A - B' D^-1 B, right <- right - B' D^-1 d; lower triangles. */
function eliminate(
  A: Float64Array,
  right: Float64Array,
  q: number,
  B: Float64Array,
  D: Float64Array,
  d: Float64Array,
  p: number,
): void {
  choleskyInPlace(D, p);
  forward(D, p, B, q);
  forward(D, p, d);
  for (let i = 0; i < p; i++) {
    for (let c = 0; c < q; c++) {
      const f = B[i * q + c] as number;
      if (f === 0) continue;
      right[c] = (right[c] as number) - f * (d[i] as number);
      for (let e = 0; e <= c; e++) {
        A[c * q + e] = (A[c * q + e] as number) - f * (B[i * q + e] as number);
      }
    }
  }
}

function withoutOwn(A: Float64Array, right: Float64Array, q: number): StringNormal {
  const m = q - KEPT;
  const at = (r: number, c: number) => (r >= c ? A[r * q + c] : A[c * q + r]) as number;
  const L = new Float64Array(m * m);
  const B = new Float64Array(m * KEPT);
  const d = new Float64Array(m);
  for (let i = 0; i < m; i++) {
    for (let c = 0; c <= i; c++) L[i * m + c] = at(KEPT + i, KEPT + c);
    for (let c = 0; c < KEPT; c++) B[i * KEPT + c] = at(KEPT + i, c);
    d[i] = right[KEPT + i] as number;
  }
  choleskyInPlace(L, m);
  const W = B.slice();
  const v = d.slice();
  forward(L, m, W, KEPT);
  forward(L, m, v);
  const information = new Float64Array(KEPT * KEPT);
  const reduced = right.slice(0, KEPT);
  for (let c = 0; c < KEPT; c++) {
    for (let e = 0; e < KEPT; e++) {
      let sum = at(c, e);
      for (let i = 0; i < m; i++) sum -= (W[i * KEPT + c] as number) * (W[i * KEPT + e] as number);
      information[c * KEPT + e] = sum;
    }
    for (let i = 0; i < m; i++) {
      reduced[c] = (reduced[c] as number) - (W[i * KEPT + c] as number) * (v[i] as number);
    }
  }
  return {
    information,
    right: reduced,
    size: KEPT,
    own(step) {
      const x = d.slice();
      for (let i = 0; i < m; i++) {
        for (let c = 0; c < KEPT; c++) {
          x[i] = (x[i] as number) - (B[i * KEPT + c] as number) * (step[c] as number);
        }
      }
      forward(L, m, x);
      backward(L, m, x);
      return x;
    },
  };
}
