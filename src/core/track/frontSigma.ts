import type { Crossing, FoundFront } from './fronts.js';

/** Covariance of the temperatures at points i and j of the profile [K2]. */
export type Covariance = (i: number, j: number) => number;

export interface FrontSigma {
  readonly position_sigma_m: number;
  /** null where the front has no width. */
  readonly width_sigma_m: number | null;
}

/** dx/dT of one crossing: at the points `index` and `index + 1` [m/K]. */
export interface CrossingDerivative {
  readonly index: number;
  readonly left_m_K: number;
  readonly right_m_K: number;
}

/**
 * How a crossing moves with the two temperatures beside it.
 *
 * From x = x_i + w (x_j - x_i), w = (L - T_i)/(T_j - T_i), s = (T_j - T_i)/(x_j - x_i):
 * dx/dT_i = -(1 - w)/s and dx/dT_j = -w/s, exact for the straight line between them.
 */
export function crossingDerivative(crossing: Crossing): CrossingDerivative {
  return {
    index: crossing.index,
    left_m_K: -(1 - crossing.weight) / crossing.slope_K_m,
    right_m_K: -crossing.weight / crossing.slope_K_m,
  };
}

/** a' P b of two crossings [m2]. */
function product(a: CrossingDerivative, b: CrossingDerivative, P: Covariance): number {
  const { index: i } = a;
  const { index: j } = b;
  return (
    a.left_m_K * (b.left_m_K * P(i, j) + b.right_m_K * P(i, j + 1)) +
    a.right_m_K * (b.left_m_K * P(i + 1, j) + b.right_m_K * P(i + 1, j + 1))
  );
}

/**
 * First-order standard deviations of a front's position and width.
 *
 * var(x50) = g' P g, and var(width) = (var(x16) + var(x84) - 2 cov(x16, x84))/4, with g of
 * `crossingDerivative` and P the covariance of the profile's temperatures. With equal sigma_T and
 * full correlation of the two neighbours this is sigma_T/|dT/dx|.
 *
 * @param front a front of `findFronts` on the same profile
 * @param covariance_K2 symmetric, of the temperatures by their index [K2]
 * @throws RangeError where the covariance is not one: a negative or non-finite variance
 */
export function frontSigma(front: FoundFront, covariance_K2: Covariance): FrontSigma {
  const middle = crossingDerivative(front.crossing50);
  const position = root('position', product(middle, middle, covariance_K2));
  if (front.width_m === null || front.crossing16 === null || front.crossing84 === null)
    return { position_sigma_m: position, width_sigma_m: null };
  const low = crossingDerivative(front.crossing16);
  const high = crossingDerivative(front.crossing84);
  const own = product(low, low, covariance_K2) + product(high, high, covariance_K2);
  const shared = 2 * product(low, high, covariance_K2);
  // Full correlation leaves a difference of equal terms: round-off below zero is zero.
  const width = own - shared;
  return {
    position_sigma_m: position,
    width_sigma_m: root('width', width < 0 && width > -1e-9 * own ? 0 : width) / 2,
  };
}

function root(name: string, variance: number): number {
  if (!(variance >= 0) || variance === Number.POSITIVE_INFINITY)
    throw new RangeError(`covariance_K2 gives the ${name} a variance of ${variance} m2`);
  return Math.sqrt(variance);
}
