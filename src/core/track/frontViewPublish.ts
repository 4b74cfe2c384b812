import { SHAPE_SIZE, type Shape, symmetrise } from './frontViewAlgebra.js';
import type { FrontFit, FrontReferences, NoFrontFit } from './frontViewFit.js';
import { normalDensity, normalQuantile } from './frontViewNormal.js';
import type { FrontData, FrontSolution } from './frontViewSolve.js';

/** Nearer to a plateau than this share of the fitted step, a level is not passed with any certainty. */
const NEAR_PLATEAU = 0.02;
/** A fit whose squared residuals are this many times too large has another shape, or a reading that is wrong. */
export const BAD_MISFIT = 4;
const LEVELS = { low: 0.16, middle: 0.5, high: 0.84 };

/**
 * From the shape's parameters to what is published, with the covariance carried along to first order.
 *
 * The curve passes the level T at x = p + w sinh(asinh(z) - e), Phi(z) = (T - A)/(B - A). Position is
 * the place of theta = 0.5 of the references, inside the readings only; width half the distance
 * between those of 0.16 and 0.84.
 *
 * Where squared residuals are more than BAD_MISFIT times too large the front is of another kind, as a new
 * one that runs into an old, wide one: readings on plateaus fit none the less, so that Birge's factor, a
 * mean over the string, says too little. What is left is that the middle is passed between two readings,
 * gap^2/12; it is added by the share of the residuals that is beyond.
 */
export function publishFront(
  solution: FrontSolution,
  data: FrontData,
  { charged_K, discharged_K }: FrontReferences,
  left_out: 0 | 1,
): FrontFit | NoFrontFit {
  const shape = solution.parameters;
  const cold = Math.min(charged_K, discharged_K);
  const range = Math.abs(charged_K - discharged_K);
  const at = (theta: number) => crossing(shape, cold + theta * range);
  const middle = at(LEVELS.middle);
  if (middle === null) return { seen: false, reason: 'no_half_crossing' };
  const last = data.x_m.length - 1;
  if (!(middle.x_m >= data.x_m[0]! && middle.x_m <= data.x_m[last]!))
    return { seen: false, reason: 'outside_sensors' };

  const low = at(LEVELS.low);
  const high = at(LEVELS.high);
  const sense = charged_K > discharged_K ? 0.5 : -0.5;
  const width =
    low === null || high === null
      ? null
      : {
          value: sense * (low.x_m - high.x_m),
          gradient: low.gradient.map((value, k) => sense * (value - high.gradient[k]!)) as Shape,
        };
  const A: Shape = [0, 0, 1, 0, 0];
  const B: Shape = [0, 0, 0, 1, 0];
  const inletIsHot = charged_K > discharged_K;
  const rows: Shape[] = [
    middle.gradient,
    width?.gradient ?? [0, 0, 0, 0, 0],
    inletIsHot ? A : B,
    inletIsHot ? B : A,
  ];
  const covariance = carry(rows, solution.covariance, Math.max(1, solution.misfit));
  const beyond = Math.max(0, 1 - BAD_MISFIT / solution.misfit);
  covariance[0]! += (beyond * gapAbout(data.x_m, middle.x_m) ** 2) / 12;
  return {
    seen: true,
    position_m: middle.x_m,
    width_m: width?.value ?? null,
    scale_m: Math.exp(shape[1]),
    hot_plateau_K: inletIsHot ? shape[2] : shape[3],
    cold_plateau_K: inletIsHot ? shape[3] : shape[2],
    covariance,
    white: carry(rows, solution.white, 1),
    misfit: solution.misfit,
    left_out,
  };
}

/** Where the curve passes a temperature, and how that moves with the parameters; null near a plateau. */
function crossing(
  [p, logW, A, B, e]: Shape,
  level_K: number,
): { x_m: number; gradient: Shape } | null {
  const w = Math.exp(logW);
  const step = B - A;
  const share = (level_K - A) / step;
  if (!(share > NEAR_PLATEAU && share < 1 - NEAR_PLATEAU)) return null;
  const z = normalQuantile(share);
  const root = Math.sqrt(1 + z * z);
  const u = z * Math.cosh(e) - root * Math.sinh(e);
  const c = root * Math.cosh(e) - z * Math.sinh(e);
  // du/dz = c/root, dz/dshare = 1/density, dshare/dA = -(1 - share)/step, dshare/dB = -share/step.
  const perShare = (w * c) / (root * normalDensity(z) * step);
  return {
    x_m: p + w * u,
    gradient: [1, w * u, -(1 - share) * perShare, -share * perShare, -w * c],
  };
}

/** Distance of the two places about one among them [m]. */
function gapAbout(x_m: Float64Array, at_m: number): number {
  let right = 1;
  while (right < x_m.length - 1 && x_m[right]! < at_m) right++;
  return x_m[right]! - x_m[right - 1]!;
}

/** factor M C M' for four rows M of five, 4 x 4 row-major, exactly symmetric. */
function carry(rows: readonly Shape[], c: Float64Array, factor: number): Float64Array {
  const out = new Float64Array(16);
  for (let a = 0; a < 4; a++) {
    for (let b = 0; b < 4; b++) {
      let sum = 0;
      for (let k = 0; k < SHAPE_SIZE; k++) {
        const left = rows[a]![k]!;
        if (left === 0) continue;
        for (let l = 0; l < SHAPE_SIZE; l++) sum += left * c[SHAPE_SIZE * k + l]! * rows[b]![l]!;
      }
      out[4 * a + b] = factor * sum;
    }
  }
  symmetrise(out, 4);
  return out;
}
