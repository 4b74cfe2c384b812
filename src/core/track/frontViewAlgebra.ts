/** The shape: place p [m], ln w, plateau at the charge inlet A and at the other end B [K], skew e. */
export type Shape = [number, number, number, number, number];
export const SHAPE_SIZE = 5;

const N = SHAPE_SIZE;

/**
 * Lower factor of the matrix with its diagonal raised by `damping` into `l`, of which only that half is
 * read and written. False where the matrix is not positive.
 */
export function cholesky(matrix: Float64Array, damping: number, l: Float64Array): boolean {
  for (let a = 0; a < N; a++) {
    for (let b = 0; b <= a; b++) {
      let sum = matrix[N * a + b]!;
      if (a === b) sum *= 1 + damping;
      for (let k = 0; k < b; k++) sum -= l[N * a + k]! * l[N * b + k]!;
      if (a !== b) l[N * a + b] = sum / l[(N + 1) * b]!;
      else if (sum > 1e-14 * matrix[(N + 1) * a]! && sum < Number.POSITIVE_INFINITY)
        l[(N + 1) * a] = Math.sqrt(sum);
      else return false;
    }
  }
  return true;
}

/** Solves L L' x = right for the factor of `cholesky`. */
export function solve(l: Float64Array, right: Shape): Shape {
  const x: Shape = [...right];
  for (let a = 0; a < N; a++) {
    for (let k = 0; k < a; k++) x[a]! -= l[N * a + k]! * x[k]!;
    x[a]! /= l[(N + 1) * a]!;
  }
  for (let a = N - 1; a >= 0; a--) {
    for (let k = a + 1; k < N; k++) x[a]! -= l[N * k + a]! * x[k]!;
    x[a]! /= l[(N + 1) * a]!;
  }
  return x;
}

/** Averages the two halves of an n x n in place: exact symmetry where round-off left none. */
export function symmetrise(m: Float64Array, n: number): void {
  for (let a = 0; a < n; a++) {
    for (let b = 0; b < a; b++) {
      const mean = 0.5 * (m[n * a + b]! + m[n * b + a]!);
      m[n * a + b] = mean;
      m[n * b + a] = mean;
    }
  }
}
