import { inverseNormal } from '../dispatch/normalPoints.js';

/** Points per dimension: the error of a 10 % quantile is below a twentieth of a sigma. */
export const NORMAL_COUNT = 2048;

const columns: Float64Array[] = [];

/**
 * Standard normal points in any number of dimensions, fixed: Latin hypercube sampling (McKay,
 * Beckman & Conover 1979), each column the middles of equal parts of probability in an order of its
 * own. The same state so always gives the same answer, and sums of columns keep their variance.
 */
export function latinNormals(dimensions: number): readonly Float64Array[] {
  while (columns.length < dimensions) {
    const column = Float64Array.from({ length: NORMAL_COUNT }, (_, i) =>
      inverseNormal((i + 0.5) / NORMAL_COUNT),
    );
    shuffle(column, 0x9e3779b9 + columns.length);
    columns.push(column);
  }
  return columns.slice(0, dimensions);
}

/** Fisher-Yates with the generator of Marsaglia 2003 (xorshift32). */
function shuffle(values: Float64Array, seed: number): void {
  let x = seed | 0 || 1;
  for (let i = values.length - 1; i > 0; i--) {
    x ^= x << 13;
    x ^= x >>> 17;
    x ^= x << 5;
    const j = (x >>> 0) % (i + 1);
    const own = values[i] as number;
    values[i] = values[j] as number;
    values[j] = own;
  }
}
