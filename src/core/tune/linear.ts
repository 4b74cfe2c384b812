/**
 * Small dense linear algebra over Float64Array, row-major: symmetric positive matrices only, of up
 * to some hundred rows.
 */

/**
 * Lower triangle L of A = L L', in place of A's lower triangle; the upper one is left as it is.
 *
 * @param a n x n, row-major; its lower triangle is read and overwritten
 * @throws RangeError where A is not positive definite
 */
export function choleskyInPlace(a: Float64Array, n: number): void {
  for (let j = 0; j < n; j++) {
    let d = a[j * n + j] as number;
    for (let k = 0; k < j; k++) d -= (a[j * n + k] as number) ** 2;
    if (!(d > 0)) throw new RangeError(`matrix must be positive definite, pivot ${j} is ${d}`);
    const root = Math.sqrt(d);
    a[j * n + j] = root;
    for (let i = j + 1; i < n; i++) {
      let s = a[i * n + j] as number;
      for (let k = 0; k < j; k++) s -= (a[i * n + k] as number) * (a[j * n + k] as number);
      a[i * n + j] = s / root;
    }
  }
}

/** b <- L^-1 b in place; b holds `columns` right-hand sides, row-major n x columns. */
export function forward(l: Float64Array, n: number, b: Float64Array, columns = 1): void {
  for (let i = 0; i < n; i++) {
    for (let k = 0; k < i; k++) {
      const f = l[i * n + k] as number;
      if (f === 0) continue;
      for (let c = 0; c < columns; c++) {
        b[i * columns + c] = (b[i * columns + c] as number) - f * (b[k * columns + c] as number);
      }
    }
    const d = l[i * n + i] as number;
    for (let c = 0; c < columns; c++) b[i * columns + c] = (b[i * columns + c] as number) / d;
  }
}

/** b <- L'^-1 b in place. */
export function backward(l: Float64Array, n: number, b: Float64Array, columns = 1): void {
  for (let i = n - 1; i >= 0; i--) {
    for (let k = i + 1; k < n; k++) {
      const f = l[k * n + i] as number;
      if (f === 0) continue;
      for (let c = 0; c < columns; c++) {
        b[i * columns + c] = (b[i * columns + c] as number) - f * (b[k * columns + c] as number);
      }
    }
    const d = l[i * n + i] as number;
    for (let c = 0; c < columns; c++) b[i * columns + c] = (b[i * columns + c] as number) / d;
  }
}

/** Inverse of a symmetric positive matrix, symmetric to the bit; `a` is kept. */
export function inverse(a: Float64Array, n: number): Float64Array {
  const l = Float64Array.from(a);
  choleskyInPlace(l, n);
  const out = new Float64Array(n * n);
  for (let i = 0; i < n; i++) out[i * n + i] = 1;
  forward(l, n, out, n);
  backward(l, n, out, n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < i; j++) {
      const mean = 0.5 * ((out[i * n + j] as number) + (out[j * n + i] as number));
      out[i * n + j] = mean;
      out[j * n + i] = mean;
    }
  }
  return out;
}

/** x of A x = b for a symmetric positive A; both kept. */
export function solve(a: Float64Array, n: number, b: Float64Array): Float64Array {
  const l = Float64Array.from(a);
  choleskyInPlace(l, n);
  const x = Float64Array.from(b);
  forward(l, n, x);
  backward(l, n, x);
  return x;
}
