/** Textbook linear algebra on dense row-major matrices, for second computations in tests. */
export type Dense = number[][];

export function denseOf(flat: ArrayLike<number>, size: number): Dense {
  return Array.from({ length: size }, (_, i) =>
    Array.from({ length: size }, (_, j) => flat[i * size + j] as number),
  );
}

export function transposed(a: Dense): Dense {
  return (a[0] as number[]).map((_, j) => a.map((row) => row[j] as number));
}

export function product(a: Dense, b: Dense): Dense {
  const bt = transposed(b);
  return a.map((row) => bt.map((column) => dot(row, column)));
}

export function dot(a: readonly number[], b: readonly number[]): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += (a[i] as number) * (b[i] as number);
  return sum;
}

export function plus(a: Dense, b: Dense, factor = 1): Dense {
  return a.map((row, i) => row.map((v, j) => v + factor * (b[i]?.[j] as number)));
}

/** Inverse by Gauss-Jordan elimination with row pivots. */
export function inverse(a: Dense): Dense {
  const n = a.length;
  const m = a.map((row, i) => [...row, ...row.map((_, j) => (i === j ? 1 : 0))]);
  for (let c = 0; c < n; c++) {
    let p = c;
    for (let r = c + 1; r < n; r++) {
      if (Math.abs(m[r]?.[c] as number) > Math.abs(m[p]?.[c] as number)) p = r;
    }
    [m[c], m[p]] = [m[p] as number[], m[c] as number[]];
    const pivot = m[c] as number[];
    const head = pivot[c] as number;
    for (let j = 0; j < 2 * n; j++) pivot[j] = (pivot[j] as number) / head;
    for (let r = 0; r < n; r++) {
      if (r === c) continue;
      const row = m[r] as number[];
      const f = row[c] as number;
      if (f !== 0) {
        for (let j = 0; j < 2 * n; j++) row[j] = (row[j] as number) - f * (pivot[j] as number);
      }
    }
  }
  return m.map((row) => row.slice(n));
}

/**
 * Least eigenvalue of a symmetric matrix scaled to unit diagonal (rows of zero variance left out),
 * by cyclic Jacobi rotations (Golub & Van Loan, Matrix Computations, 8.5): how far a covariance is
 * from being positive semi-definite, free of its units.
 */
export function leastEigenvalue(a: Dense): number {
  const kept = a.map((_, i) => i).filter((i) => (a[i]?.[i] as number) > 0);
  const m = kept.map((i) =>
    kept.map(
      (j) => (a[i]?.[j] as number) / Math.sqrt((a[i]?.[i] as number) * (a[j]?.[j] as number)),
    ),
  );
  const n = m.length;
  for (let sweep = 0; sweep < 60; sweep++) {
    let off = 0;
    for (let p = 0; p < n; p++) {
      for (let q = p + 1; q < n; q++) {
        const apq = m[p]?.[q] as number;
        off += apq * apq;
        if (Math.abs(apq) < 1e-300) continue;
        const theta = ((m[q]?.[q] as number) - (m[p]?.[p] as number)) / (2 * apq);
        const t = Math.sign(theta || 1) / (Math.abs(theta) + Math.sqrt(theta * theta + 1));
        const c = 1 / Math.sqrt(t * t + 1);
        const s = t * c;
        for (let k = 0; k < n; k++) {
          const row = m[k] as number[];
          const kp = row[p] as number;
          const kq = row[q] as number;
          row[p] = c * kp - s * kq;
          row[q] = s * kp + c * kq;
        }
        const rp = m[p] as number[];
        const rq = m[q] as number[];
        for (let k = 0; k < n; k++) {
          const pk = rp[k] as number;
          const qk = rq[k] as number;
          rp[k] = c * pk - s * qk;
          rq[k] = s * pk + c * qk;
        }
      }
    }
    if (off < 1e-22) break;
  }
  return m.reduce((least, row, i) => Math.min(least, row[i] as number), Number.POSITIVE_INFINITY);
}
