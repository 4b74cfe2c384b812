/** The two costly parts of `applyReadings`, over plain arrays: see `readingUpdate.ts`. */

/**
 * W' = L^-1 V', one row of all states per reading: forward substitution.
 *
 * @param factor lower Cholesky factor of S, row-major, m x m
 * @param rows the m rows of V', each of `size` states
 * @throws RangeError where `factor` is not m x m
 */
export function forwardSolve(
  factor: Float64Array,
  rows: readonly Float64Array[],
  size: number,
): Float64Array {
  const m = rows.length;
  if (factor.length !== m * m) {
    throw new RangeError(`factor of ${factor.length} numbers: expected ${m * m}`);
  }
  const w = new Float64Array(m * size);
  for (let a = 0; a < m; a++) {
    const row = a * size;
    w.set(rows[a] as Float64Array, row);
    let b = 0;
    // Four rows at a time: what is left of this one is read and written once for all four.
    for (; b + 4 <= a; b += 4) {
      const l0 = factor[a * m + b] as number;
      const l1 = factor[a * m + b + 1] as number;
      const l2 = factor[a * m + b + 2] as number;
      const l3 = factor[a * m + b + 3] as number;
      const r0 = b * size;
      const r1 = r0 + size;
      const r2 = r1 + size;
      const r3 = r2 + size;
      for (let i = 0; i < size; i++) {
        w[row + i] =
          (w[row + i] as number) -
          l0 * (w[r0 + i] as number) -
          l1 * (w[r1 + i] as number) -
          l2 * (w[r2 + i] as number) -
          l3 * (w[r3 + i] as number);
      }
    }
    for (; b < a; b++) {
      const l = factor[a * m + b] as number;
      const other = b * size;
      for (let i = 0; i < size; i++) {
        w[row + i] = (w[row + i] as number) - l * (w[other + i] as number);
      }
    }
    const own = factor[a * m + a] as number;
    for (let i = 0; i < size; i++) w[row + i] = (w[row + i] as number) / own;
  }
  return w;
}

/**
 * P <- P - W W', upper triangle computed, lower mirrored, in tiles of two rows by four columns: eight
 * sums that do not wait for one another. A tile that reaches beyond the end does its last row or
 * columns more than once, from the same P: all are read before any is written.
 *
 * @param p covariance, row-major, size x size
 * @param w W', one row of `size` states per reading
 */
export function subtractOuter(p: Float64Array, w: Float64Array, size: number): void {
  const last = size - 1;
  const end = w.length;
  for (let i0 = 0; i0 < size; i0 += 2) {
    const i1 = Math.min(i0 + 1, last);
    const r0 = i0 * size;
    const r1 = i1 * size;
    for (let j0 = i0; j0 < size; j0 += 4) {
      const j1 = Math.min(j0 + 1, last);
      const j2 = Math.min(j0 + 2, last);
      const j3 = Math.min(j0 + 3, last);
      let s00 = 0;
      let s01 = 0;
      let s02 = 0;
      let s03 = 0;
      let s10 = 0;
      let s11 = 0;
      let s12 = 0;
      let s13 = 0;
      for (let a = 0; a < end; a += size) {
        const x0 = w[a + i0] as number;
        const x1 = w[a + i1] as number;
        const y0 = w[a + j0] as number;
        const y1 = w[a + j1] as number;
        const y2 = w[a + j2] as number;
        const y3 = w[a + j3] as number;
        s00 += x0 * y0;
        s01 += x0 * y1;
        s02 += x0 * y2;
        s03 += x0 * y3;
        s10 += x1 * y0;
        s11 += x1 * y1;
        s12 += x1 * y2;
        s13 += x1 * y3;
      }
      s00 = (p[r0 + j0] as number) - s00;
      s01 = (p[r0 + j1] as number) - s01;
      s02 = (p[r0 + j2] as number) - s02;
      s03 = (p[r0 + j3] as number) - s03;
      s10 = (p[r1 + j0] as number) - s10;
      s11 = (p[r1 + j1] as number) - s11;
      s12 = (p[r1 + j2] as number) - s12;
      s13 = (p[r1 + j3] as number) - s13;
      p[r0 + j0] = s00;
      p[r0 + j1] = s01;
      p[r0 + j2] = s02;
      p[r0 + j3] = s03;
      p[r1 + j0] = s10;
      p[r1 + j1] = s11;
      p[r1 + j2] = s12;
      p[r1 + j3] = s13;
      const c0 = j0 * size;
      const c1 = j1 * size;
      const c2 = j2 * size;
      const c3 = j3 * size;
      p[c0 + i0] = s00;
      p[c1 + i0] = s01;
      p[c2 + i0] = s02;
      p[c3 + i0] = s03;
      p[c0 + i1] = s10;
      p[c1 + i1] = s11;
      p[c2 + i1] = s12;
      p[c3 + i1] = s13;
    }
  }
}
