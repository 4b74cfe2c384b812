import type { UnitState } from '../../src/core/unit.js';

/** Scans after which the covariance of some tube, or any state, was not what it must be. */
export interface Unsound {
  /** Scans that were looked at. */
  scans: number;
  /** An element that is not that of its mirror place, to the bit. */
  not_symmetric: number;
  /** A variance below zero. */
  negative: number;
  /** A negative eigenvalue beyond rounding, among the scans that were looked at. */
  indefinite: number;
  /** NaN or infinity among temperatures, factors or covariance. */
  not_finite: number;
  /** Scans in which eigenvalues were looked at. */
  factorised: number;
  /** Least eigenvalue found, of a correlation matrix; 0 where none is negative beyond rounding. */
  least: number;
}

export const sound = (): Unsound => ({
  scans: 0,
  not_symmetric: 0,
  negative: 0,
  indefinite: 0,
  not_finite: 0,
  factorised: 0,
  least: 0,
});

const COUNTED = ['not_symmetric', 'negative', 'indefinite', 'not_finite', 'factorised'] as const;

/** Factorising costs a tenth of a scan, so it is done this often [scans]. */
const FACTORISE_EVERY = 30;
/**
 * Least eigenvalue of a correlation matrix that still counts as non-negative. A start at 100 K falls
 * to 0.1 K by one reading, so the rounding of what was, 2.2e-16, is 1e6 times larger against what is;
 * times a few updates.
 */
const ROUNDING = 1e-9;

/** Looks at the state after a scan and counts what is wrong with it; eigenvalues with the first and every thirtieth. */
export function lookAt(state: UnitState, counts: Unsound): void {
  const now = sound();
  const factorise = counts.scans % FACTORISE_EVERY === 0;
  counts.scans++;
  for (const store of state.stores) {
    if (!store.started) continue;
    for (const tube of store.tubes) {
      const { covariance } = tube;
      const size = Math.round(Math.sqrt(covariance.length));
      const finite = [tube.enthalpy, tube.further, covariance].every(allFinite);
      if (!finite || !Number.isFinite(tube.surprise)) now.not_finite = 1;
      if (!symmetric(covariance, size)) now.not_symmetric = 1;
      for (let i = 0; i < size; i++) {
        if (!(covariance[i * size + i]! >= 0)) now.negative = 1;
      }
      if (!factorise) continue;
      now.factorised = 1;
      if (nonNegative(covariance, size, ROUNDING)) continue;
      now.indefinite = 1;
      now.least = Math.min(now.least, leastEigenvalue(covariance, size));
    }
    if (store.wall === null) continue;
    const wall = [...store.wall.enthalpy, store.wall.steel_K];
    if (!wall.every(allFinite)) now.not_finite = 1;
  }
  for (const key of COUNTED) counts[key] += now[key];
  counts.least = Math.min(counts.least, now.least);
}

/** A plain loop: over all covariances a call for each element took a fifth of a scan. */
function allFinite(values: Float64Array): boolean {
  for (let i = 0; i < values.length; i++) if (!Number.isFinite(values[i])) return false;
  return true;
}

function symmetric(matrix: Float64Array, size: number): boolean {
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < i; j++) {
      // NaN differs from itself.
      if (matrix[i * size + j] !== matrix[j * size + i]) return false;
    }
  }
  return true;
}

/**
 * Whether a symmetric matrix P has no eigenvalue below -`tolerance` once scaled to ones on its
 * diagonal: D^-1/2 P D^-1/2 + tolerance I = L L' then exists (Cholesky; backward stable, its own
 * error is size x 2.2e-16). States without variance have to have no covariance either.
 */
export function nonNegative(matrix: Float64Array, size: number, tolerance: number): boolean {
  const scale = Float64Array.from({ length: size }, (_, i) => {
    const own = matrix[i * size + i]!;
    return own > 0 ? 1 / Math.sqrt(own) : 0;
  });
  for (let i = 0; i < size; i++) {
    if (scale[i]! > 0) continue;
    for (let j = 0; j < size; j++) if (matrix[i * size + j] !== 0) return false;
  }
  const lower = new Float64Array(size * size);
  for (let i = 0; i < size; i++) {
    for (let j = 0; j <= i; j++) {
      let rest = matrix[i * size + j]! * scale[i]! * scale[j]! + (i === j ? tolerance : 0);
      for (let k = 0; k < j; k++) rest -= lower[i * size + k]! * lower[j * size + k]!;
      if (i !== j) lower[i * size + j] = rest / lower[j * size + j]!;
      else if (rest > 0) lower[i * size + i] = Math.sqrt(rest);
      else return false;
    }
  }
  return true;
}

/** The least eigenvalue of the correlation matrix where it is negative, within a factor of two. */
function leastEigenvalue(matrix: Float64Array, size: number): number {
  let shift = ROUNDING;
  while (shift < size && !nonNegative(matrix, size, shift)) shift *= 2;
  return -shift;
}
