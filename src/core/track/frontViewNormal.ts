const INVERSE_ROOT_TWO_PI = 0.3989422804014327;
/** Beyond this the distribution is 0 or 1 to double precision (Phi(-8.3) = 5e-17). */
const FAR = 8.3;

/** Density of the standard normal distribution, exp(-u^2/2)/sqrt(2 pi). */
export function normalDensity(u: number): number {
  return INVERSE_ROOT_TWO_PI * Math.exp(-0.5 * u * u);
}

/**
 * Standard normal distribution Phi(u), absolute error below 1e-15.
 *
 * Phi(u) = 1/2 + density(u) (u + u^3/3 + u^5/(3 5) + ...): all terms have one sign, so nothing
 * cancels (Marsaglia, Evaluating the Normal Distribution, J. Stat. Softw. 11(4), 2004).
 *
 * @param u any number; infinite gives 0 or 1
 * @param density its density, where it is known already
 * @throws RangeError for NaN
 */
export function normalDistribution(u: number, density = normalDensity(u)): number {
  if (Number.isNaN(u)) throw new RangeError(`u must be a number, got ${u}`);
  if (u >= FAR) return 1;
  if (u <= -FAR) return 0;
  const square = u * u;
  let term = u;
  let sum = u;
  for (let k = 3; Math.abs(term) > 5e-17 * Math.abs(sum); k += 2) {
    term *= square / k;
    sum += term;
  }
  return 0.5 + sum * density;
}

/**
 * The u with Phi(u) = q, by Newton steps from 0. Phi is concave above 0 and convex below, so that
 * each step stays short of the root and none overshoots.
 *
 * @param q between 1e-6 and 1 - 1e-6
 * @throws RangeError outside
 */
export function normalQuantile(q: number): number {
  if (!(q >= 1e-6 && q <= 1 - 1e-6)) throw new RangeError(`q ${q} is not in [1e-6, 1 - 1e-6]`);
  let u = 0;
  for (let i = 0; i < 60; i++) {
    const step = (q - normalDistribution(u)) / normalDensity(u);
    u += step;
    if (Math.abs(step) < 1e-12) break;
  }
  return u;
}
