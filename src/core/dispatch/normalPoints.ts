/**
 * Standard normal points for quantiles of functions of few Gaussian variables: a Halton sequence
 * (bases 2, 3, 5, 7, 11) through the inverse normal distribution. Fixed, so that the same state
 * always gives the same quantile, and dense enough (2048) that the quantile's own error is a few
 * thousandths of its sigma.
 */
const BASES = [2, 3, 5, 7, 11];
const COUNT = 2048;

let cached: Float64Array[] | null = null;

/** Columns of COUNT points, one per dimension (at most five). */
export function normalPoints(): readonly Float64Array[] {
  cached ??= BASES.map((base) =>
    Float64Array.from({ length: COUNT }, (_, i) => inverseNormal(radicalInverse(base, i + 1))),
  );
  return cached;
}

function radicalInverse(base: number, index: number): number {
  let result = 0;
  let fraction = 1 / base;
  for (let i = index; i > 0; i = Math.floor(i / base)) {
    result += (i % base) * fraction;
    fraction /= base;
  }
  return result;
}

/**
 * Inverse of the standard normal distribution function, by bisection-safe Newton steps on a
 * complementary error function of full precision (series and continued fraction).
 *
 * @throws RangeError outside (0, 1)
 */
export function inverseNormal(p: number): number {
  if (!(p > 0 && p < 1)) throw new RangeError(`p = ${p}: expected 0 < p < 1`);
  let low = -9;
  let high = 9;
  let x = 0;
  for (let i = 0; i < 80; i++) {
    const error = normalDistribution(x) - p;
    if (error > 0) high = x;
    else low = x;
    const density = Math.exp((-x * x) / 2) / Math.sqrt(2 * Math.PI);
    let next = x - error / density;
    if (!(next > low && next < high)) next = (low + high) / 2;
    if (Math.abs(next - x) < 1e-13) return next;
    x = next;
  }
  return x;
}

/** Distribution function of the standard normal: series for |x| < 3, continued fraction beyond. */
export function normalDistribution(x: number): number {
  const a = Math.abs(x);
  const density = Math.exp((-a * a) / 2) / Math.sqrt(2 * Math.PI);
  let upper: number;
  if (a < 3) {
    // Phi(x) - 1/2 = density (x + x^3/3 + x^5/(3 5) + ...), Abramowitz & Stegun 26.2.11
    let term = a;
    let sum = a;
    for (let k = 1; k < 100 && term > 1e-17 * sum; k++) {
      term *= (a * a) / (2 * k + 1);
      sum += term;
    }
    upper = 0.5 - density * sum;
  } else {
    // Q(x) = density/(x + 1/(x + 2/(x + 3/(x + ...)))), Abramowitz & Stegun 26.2.14
    let fraction = a;
    for (let k = 60; k >= 1; k--) fraction = a + k / fraction;
    upper = density / fraction;
  }
  return x > 0 ? 1 - upper : upper;
}
