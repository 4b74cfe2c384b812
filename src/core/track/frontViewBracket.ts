import type { Shape } from './frontViewAlgebra.js';
import type { FrontFit } from './frontViewFit.js';
import { normalDensity, normalQuantile } from './frontViewNormal.js';
import type { FrontData, FrontPrior } from './frontViewSolve.js';

/** A reading between these shares of the step stands in the steep part of an erf front. */
const STEEP_SHARE = 0.03;
/** |u| at that share: Phi(-1.88) = 0.03. */
const STEEP_U = 1.88;
/** A reading must also differ from the plateau by this many of its sigmas. */
const CLEAR = 3;

/**
 * How many readings stand in the steep part between the plateaus A and B of a fitted shape. The
 * first and the last do not count: with nothing beyond them, a plateau of their own height would
 * explain them as well.
 */
export function steepReadings(data: FrontData, [, , A, B]: Shape): number {
  let count = 0;
  for (let i = 1; i + 1 < data.x_m.length; i++) if (isSteep(data, i, A, B)) count++;
  return count;
}

function isSteep(data: FrontData, i: number, A: number, B: number): boolean {
  const share = (data.temperature_K[i]! - A) / (B - A);
  const noise = CLEAR * Math.hypot(data.white_K[i]!, data.lasting_K[i]!);
  const least = Math.max(STEEP_SHARE, noise / Math.abs(B - A));
  return share > least && share < 1 - least;
}

/**
 * Position of a front that is narrower than the spacing of the sensors.
 *
 * It stands somewhere between the two readings around the crossing. Where one of these stands in the
 * steep part at u = Phi^-1(share), the front is (u50 - u) w from it, and w is at most
 * gap/(1.88 + |u|), because the reading beyond is on its plateau. Of the interval that remains the
 * middle is given, with the variance of a uniform distribution, interval^2/12, and that of the
 * readings at half the greatest width. No width.
 *
 * @param crossing_m where straight lines between the readings pass the middle [m]
 * @returns null where the readings around the crossing are not on either side of it
 */
export function bracketFront(
  data: FrontData,
  prior: FrontPrior,
  crossing_m: number,
): FrontFit | null {
  const { x_m } = data;
  let right = 1;
  while (right < x_m.length - 1 && x_m[right]! < crossing_m) right++;
  let left = right - 1;
  while (left > 0 && x_m[left] === x_m[right]) left--;
  const gap = x_m[right]! - x_m[left]!;
  if (!(gap > 0)) return null;
  const charged = plateau(data, 0, left, prior.charged_K, prior.plateauSigma_K);
  const discharged = plateau(data, right + 1, x_m.length, prior.discharged_K, prior.plateauSigma_K);
  const [A, B] = [charged.mean, discharged.mean];
  let from = x_m[left]!;
  let to = x_m[right]!;
  let noise = 0;
  // Without a reading beyond, a plateau is a guess and shares of the step mean nothing.
  if (charged.count > 0 && discharged.count > 0) {
    const half = quantileOf((0.5 * (prior.charged_K + prior.discharged_K) - A) / (B - A));
    const steep = [left, right].find((i) => isSteep(data, i, A, B));
    if (steep !== undefined) {
      const u = quantileOf((data.temperature_K[steep]! - A) / (B - A));
      const widest = gap / (STEEP_U + Math.abs(u));
      const reach = x_m[steep]! + widest * (half - u);
      if (steep === left) to = Math.min(to, Math.max(from, reach));
      else from = Math.max(from, Math.min(to, reach));
      const reading = Math.hypot(data.white_K[steep]!, data.lasting_K[steep]!);
      const error = Math.sqrt(reading ** 2 + charged.variance + discharged.variance);
      noise = (0.5 * widest * error) / (Math.abs(B - A) * normalDensity(u));
    }
  }
  const covariance = new Float64Array(16);
  const place = Math.max(data.place_m[left]!, data.place_m[right]!);
  covariance[0] = (to - from) ** 2 / 12 + noise ** 2 + place ** 2;
  const hotFirst = prior.charged_K > prior.discharged_K;
  covariance[10] = hotFirst ? charged.variance : discharged.variance;
  covariance[15] = hotFirst ? discharged.variance : charged.variance;
  return {
    seen: true,
    position_m: 0.5 * (from + to),
    width_m: null,
    scale_m: null,
    hot_plateau_K: hotFirst ? A : B,
    cold_plateau_K: hotFirst ? B : A,
    covariance,
    white: covariance.slice(),
    misfit: 1,
    left_out: 0,
  };
}

/** Within the steep part; the middle of the references may lie off it where a plateau is. */
function quantileOf(share: number): number {
  return normalQuantile(Math.min(1 - STEEP_SHARE, Math.max(STEEP_SHARE, share)));
}

/** Weighted mean of the readings [from, to) and of the prior. */
function plateau(data: FrontData, from: number, to: number, prior_K: number, sigma_K: number) {
  let weight = 1 / sigma_K ** 2;
  let sum = prior_K * weight;
  let count = 0;
  for (let i = from; i < to; i++) {
    const own = 1 / (data.white_K[i]! ** 2 + data.lasting_K[i]! ** 2);
    weight += own;
    sum += own * data.temperature_K[i]!;
    count++;
  }
  return { mean: sum / weight, variance: 1 / weight, count };
}
