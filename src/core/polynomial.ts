/**
 * Value of c[0] + c[1] x + c[2] x^2 + ... (Horner).
 *
 * @param coefficients from the lowest power up; an empty list gives 0
 */
export function polynomial(coefficients: readonly number[], x: number): number {
  let sum = 0;
  for (let i = coefficients.length - 1; i >= 0; i--) sum = sum * x + (coefficients[i] as number);
  return sum;
}

/** Coefficients of the antiderivative that is 0 at x = 0. */
export function integralOf(coefficients: readonly number[]): number[] {
  return [0, ...coefficients.map((c, i) => c / (i + 1))];
}

/** Coefficients of the derivative. */
export function derivativeOf(coefficients: readonly number[]): number[] {
  return coefficients.slice(1).map((c, i) => c * (i + 1));
}
