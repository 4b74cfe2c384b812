import { describe, expect, it } from 'vitest';
import { inverse, solve } from '../../../src/core/tune/linear.js';

/** A symmetric positive matrix with entries that no round number hides. */
function sample(n: number): Float64Array {
  const b = Float64Array.from({ length: n * n }, (_, i) => Math.sin(1 + 3.7 * i));
  const a = new Float64Array(n * n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      for (let k = 0; k < n; k++) a[i * n + j]! += b[i * n + k]! * b[j * n + k]!;
    }
    a[i * n + i]! += 1;
  }
  return a;
}

describe('small symmetric systems', () => {
  it('inverts: A times its inverse is one, and symmetric to the bit', () => {
    const n = 7;
    const a = sample(n);
    const b = inverse(a, n);
    for (let i = 0; i < n; i++) {
      for (let j = 0; j < n; j++) {
        let sum = 0;
        for (let k = 0; k < n; k++) sum += a[i * n + k]! * b[k * n + j]!;
        // Condition number below 100: rounding stays below 1e-13.
        expect(sum).toBeCloseTo(i === j ? 1 : 0, 12);
        expect(b[i * n + j]).toBe(b[j * n + i]);
      }
    }
  });

  it('solves as the inverse does, and refuses a matrix that is not positive', () => {
    const n = 5;
    const a = sample(n);
    const right = Float64Array.from({ length: n }, (_, i) => i - 2.5);
    const x = solve(a, n, right);
    const b = inverse(a, n);
    x.forEach((value, i) => {
      let sum = 0;
      for (let k = 0; k < n; k++) sum += b[i * n + k]! * right[k]!;
      expect(value).toBeCloseTo(sum, 12);
    });
    expect(() => solve(Float64Array.of(1, 2, 2, 1), 2, Float64Array.of(1, 1))).toThrow(RangeError);
  });
});
