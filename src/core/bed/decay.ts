/**
 * The two exponentials of the time step, for a whole array at once: a call for each number costs as
 * much as the sum itself. Both are right to a few roundings.
 */

/** Steps of the table per unit, and where it ends: beyond, the library's function is called. */
const PER_UNIT = 16;
const END = 40;
const POINTS = Float64Array.from({ length: END * PER_UNIT + 1 }, (_, j) => Math.exp(-j / PER_UNIT));

/**
 * x <- 1 - exp(-x) for x >= 0: exp(-x) is the nearest of the table's points times its Taylor series
 * of degree 7 over |r| <= 1/32, whose rest is below (1/32)^8/8! = 2e-17.
 */
export function oneLessDecay(values: Float64Array): void {
  const points = POINTS;
  const end = END;
  const perUnit = PER_UNIT;
  const width = 1 / PER_UNIT;
  for (let i = 0; i < values.length; i++) {
    const x = values[i] as number;
    if (!(x >= 0 && x < end)) {
      values[i] = 1 - Math.exp(-x);
      continue;
    }
    const j = (x * perUnit + 0.5) | 0;
    const r = j * width - x;
    const q = r * r;
    const even = 1 + q * (1 / 2 + q * (1 / 24 + q * (1 / 720)));
    const odd = 1 + q * (1 / 6 + q * (1 / 120 + q * (1 / 5040)));
    values[i] = 1 - (points[j] as number) * (even + r * odd);
  }
}

/** Largest p of the series: a time step has at most 0.75 and a little, see `planSubsteps`. */
const SERIES_END = 0.8;

/**
 * out <- out (1 - exp(-p))/p, by the series sum (-p)^k/(k+1)! to k = 15: no digits lost for small p,
 * and the rest is below 0.8^16/17! = 8e-17. Even and odd terms apart, so that two chains run at once.
 */
export function timesMeanDecay(values: Float64Array, out: Float64Array): void {
  const end = SERIES_END;
  for (let i = 0; i < values.length; i++) {
    const p = values[i] as number;
    if (!(p < end)) {
      out[i] = ((out[i] as number) * (1 - Math.exp(-p))) / p;
      continue;
    }
    const q = p * p;
    const even =
      1 +
      q *
        (1 / 6 +
          q *
            (1 / 120 +
              q *
                (1 / 5040 +
                  q *
                    (1 / 362880 +
                      q * (1 / 39916800 + q * (1 / 6227020800 + q * (1 / 1307674368000)))))));
    const odd =
      1 / 2 +
      q *
        (1 / 24 +
          q *
            (1 / 720 +
              q *
                (1 / 40320 +
                  q *
                    (1 / 3628800 +
                      q * (1 / 479001600 + q * (1 / 87178291200 + q * (1 / 20922789888000)))))));
    out[i] = (out[i] as number) * (even - p * odd);
  }
}
