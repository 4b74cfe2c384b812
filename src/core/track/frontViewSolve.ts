import { cholesky, SHAPE_SIZE, type Shape, solve, symmetrise } from './frontViewAlgebra.js';
import { normalDensity, normalDistribution } from './frontViewNormal.js';

/** Readings of one string, columns of equal length. */
export interface FrontData {
  readonly x_m: Float64Array;
  readonly temperature_K: Float64Array;
  /** Noise that is new with every scan [K]. */
  readonly white_K: Float64Array;
  /** Error that stays from scan to scan (offset) [K]. */
  readonly lasting_K: Float64Array;
  /** Uncertainty of where the sensor sits [m]. */
  readonly place_m: Float64Array;
}

/** Independent normal priors: ln(width/m), plateaus [K], skew. */
export interface FrontPrior {
  readonly logWidth: number;
  readonly logWidthSigma: number;
  readonly charged_K: number;
  readonly discharged_K: number;
  readonly plateauSigma_K: number;
  readonly skewSigma: number;
}

export interface FrontSolution {
  readonly parameters: Shape;
  /** Posterior covariance, 5 x 5 row-major, exactly symmetric. */
  readonly covariance: Float64Array;
  /** The part of it that is new with every scan. */
  readonly white: Float64Array;
  /** Sum of squared normalised residuals, priors included, over its degrees of freedom. */
  readonly misfit: number;
  /** Index of the reading with the largest studentised residual, r^2/(var - var of the fit there). */
  readonly worst: number;
}

/** Steps towards weights that the next pass changes, and towards what is given. */
const MOST_STEPS = 60;
const MOST_LAST_STEPS = 240;
/** Done when a step would gain less than this in the sum of squares: a thousandth of a sigma. */
const ENOUGH = 1e-6;

const N = SHAPE_SIZE;

/**
 * Weighted least squares of a front that may be skewed, with weak priors:
 *
 *   T(x) = A + (B - A) Phi(g),  g = sinh(asinh(u) + e),  u = (x - p)/w
 *
 * For e = 0 this is the erf front; the transform (Jones & Pewsey, Biometrika 96, 2009) is monotone
 * for every e. Rock's heat capacity rises with temperature, so real fronts have one long flank: an
 * erf alone puts the middle of such a front off by a tenth of its width. By Levenberg-Marquardt steps
 * (Levenberg 1944, Marquardt 1963) on the analytic derivatives, with c = cosh(asinh(u) + e) and
 * D = (B - A) phi(g):
 *
 *   dT/dp = -D c/(sqrt(1 + u^2) w),  dT/dln w = u w dT/dp,  dT/de = D c,  dT/dA = 1 - Phi,  dT/dB = Phi
 *
 * A reading's variance is white^2 + lasting^2 + (dT/dx place)^2; the last term needs the slope and
 * is taken from the solution before, twice. Only the last pass has to settle: where a plateau lies
 * outside the readings, it, width and place of the inflection make up for each other along a bent
 * valley, and sharp weights take a hundred steps and more along it, those with places a few. Covariance: H^-1 of the final weights; of it the white
 * part is H^-1 J' W S W J H^-1 with S the white variances.
 *
 * @returns null where the steps do not settle
 */
export function solveFront(data: FrontData, prior: FrontPrior, start: Shape): FrontSolution | null {
  const fit: Fit = {
    data,
    prior,
    weights: new Float64Array(data.x_m.length),
    evaluated: null,
    jacobian: new Float64Array(N * data.x_m.length),
    model_K: new Float64Array(data.x_m.length),
    system: emptySystem(),
    trial: emptySystem(),
    factor: new Float64Array(N * N),
  };
  let at = start;
  // Without uncertain places the weights do not depend on the slope.
  const passes = data.place_m.some((place) => place > 0) ? 3 : 1;
  for (let pass = 0; pass < passes; pass++) {
    weigh(fit, at);
    const isLast = pass === passes - 1;
    const reached = descend(fit, at, isLast ? MOST_LAST_STEPS : MOST_STEPS);
    if (reached === null || (isLast && !reached.settled)) return null;
    at = reached.at;
  }
  const { system, factor } = fit;
  normalEquations(fit, at, system);
  if (!cholesky(system.matrix, 0, factor)) return null;
  const covariance = new Float64Array(N * N);
  for (let j = 0; j < N; j++) {
    const unit: Shape = [0, 0, 0, 0, 0];
    unit[j] = 1;
    covariance.set(solve(factor, unit), N * j);
  }
  symmetrise(covariance, N);
  // One datum more for each of the four priors.
  const freedom = data.x_m.length + 4 - N;
  return {
    parameters: at,
    covariance,
    white: whitePart(fit, covariance),
    misfit: freedom > 0 ? system.squares / freedom : 1,
    worst: worstReading(fit, covariance),
  };
}

/** A fit that is under way: its arrays are made once, as each costs as much as a step. */
interface Fit {
  readonly data: FrontData;
  readonly prior: FrontPrior;
  readonly weights: Float64Array;
  /** Shape to which `jacobian` belongs, a row of five derivatives per reading, and its temperatures. */
  evaluated: Shape | null;
  readonly jacobian: Float64Array;
  readonly model_K: Float64Array;
  /** Of the shape reached, and of the one that is tried; they change places. */
  system: NormalEquations;
  trial: NormalEquations;
  readonly factor: Float64Array;
}

const emptySystem = (): NormalEquations => ({
  matrix: new Float64Array(N * N),
  gradient: [0, 0, 0, 0, 0],
  squares: 0,
});

function weigh(fit: Fit, at: Shape): void {
  const { data, weights, jacobian } = fit;
  evaluate(fit, at);
  for (let i = 0; i < weights.length; i++) {
    const slope = jacobian[N * i]!;
    weights[i] =
      1 / (data.white_K[i]! ** 2 + data.lasting_K[i]! ** 2 + (slope * data.place_m[i]!) ** 2);
  }
}

/** @returns where the steps led to; null where no step leads down any more */
function descend(
  fit: Fit,
  start: Shape,
  most: number,
): { readonly at: Shape; readonly settled: boolean } | null {
  let at = start;
  normalEquations(fit, at, fit.system);
  let damping = 1e-3;
  for (let step = 0; step < most; step++) {
    const { system, trial, factor } = fit;
    if (!cholesky(system.matrix, damping, factor)) {
      damping *= 10;
      continue;
    }
    const move = solve(factor, system.gradient);
    // A step of more than a factor e in width, or 1 in skew, leaves the region where the tangent
    // means anything.
    const shorten = Math.min(1, 1 / Math.max(1e-300, Math.abs(move[1]), Math.abs(move[4])));
    const next: Shape = [...at];
    for (let k = 0; k < N; k++) next[k]! += shorten * move[k]!;
    normalEquations(fit, next, trial);
    const gain = system.squares - trial.squares;
    if (gain >= 0) {
      at = next;
      fit.system = trial;
      fit.trial = system;
      damping = Math.max(1e-9, damping / 10);
      if (gain < ENOUGH && shorten === 1 && damping < 1e-2) return { at, settled: true };
    } else {
      // At the minimum round-off alone decides the sign of a gain far below `ENOUGH`.
      if (-gain < 1e-12 * (1 + system.squares)) return { at, settled: true };
      damping *= 10;
      if (damping > 1e12) return null;
    }
  }
  return { at, settled: false };
}

interface NormalEquations {
  /** Lower triangle of J'WJ + priors, row-major. */
  readonly matrix: Float64Array;
  /** J'W r + priors, the direction of descent. */
  readonly gradient: Shape;
  squares: number;
}

function normalEquations(fit: Fit, at: Shape, out: NormalEquations): void {
  const { data, prior, weights, jacobian, model_K } = fit;
  evaluate(fit, at);
  const { matrix: h, gradient: g } = out;
  h.fill(0);
  g.fill(0);
  let squares = 0;
  for (let i = 0; i < weights.length; i++) {
    const residual = data.temperature_K[i]! - model_K[i]!;
    const weight = weights[i]!;
    const row = N * i;
    squares += weight * residual * residual;
    for (let a = 0; a < N; a++) {
      const wa = weight * jacobian[row + a]!;
      g[a]! += wa * residual;
      for (let b = 0; b <= a; b++) h[N * a + b]! += wa * jacobian[row + b]!;
    }
  }
  const means = [prior.logWidth, prior.charged_K, prior.discharged_K, 0];
  const { logWidthSigma, plateauSigma_K, skewSigma } = prior;
  [logWidthSigma, plateauSigma_K, plateauSigma_K, skewSigma].forEach((sigma, k) => {
    const weight = 1 / (sigma * sigma);
    const off = means[k]! - at[k + 1]!;
    h[(N + 1) * (k + 1)]! += weight;
    g[k + 1]! += weight * off;
    squares += weight * off * off;
  });
  out.squares = squares;
}

/** Model temperatures at all readings, and the rows of derivatives. */
function evaluate(fit: Fit, at: Shape): void {
  if (fit.evaluated === at) return;
  fit.evaluated = at;
  const { jacobian, model_K } = fit;
  const { x_m } = fit.data;
  const [p, A, e] = [at[0], at[2], at[4]];
  const w = Math.exp(at[1]);
  const ch = Math.cosh(e);
  const sh = Math.sinh(e);
  const rise = at[3] - A;
  for (let i = 0; i < x_m.length; i++) {
    const u = (x_m[i]! - p) / w;
    const root = Math.sqrt(1 + u * u);
    const z = u * ch + root * sh;
    const c = root * ch + u * sh;
    const density = normalDensity(z);
    const share = normalDistribution(z, density);
    const steep = rise * density * c;
    const row = N * i;
    jacobian[row] = -steep / (root * w);
    jacobian[row + 1] = (-steep * u) / root;
    jacobian[row + 2] = 1 - share;
    jacobian[row + 3] = share;
    jacobian[row + 4] = steep;
    model_K[i] = A + rise * share;
  }
}

/** Of the shape last evaluated. */
function worstReading(fit: Fit, covariance: Float64Array): number {
  const { data, weights, jacobian, model_K } = fit;
  let worst = 0;
  let most = -1;
  for (let i = 0; i < weights.length; i++) {
    const row = N * i;
    let spread = 0;
    for (let a = 0; a < N; a++)
      for (let b = 0; b < N; b++)
        spread += jacobian[row + a]! * covariance[N * a + b]! * jacobian[row + b]!;
    // A reading that the fit follows entirely (leverage 1) can show no residual.
    const free = 1 / weights[i]! - spread;
    const size = free > 0 ? (data.temperature_K[i]! - model_K[i]!) ** 2 / free : 0;
    if (size > most) {
      most = size;
      worst = i;
    }
  }
  return worst;
}

/** Of the shape last evaluated. */
function whitePart(fit: Fit, covariance: Float64Array): Float64Array {
  const { data, weights, jacobian } = fit;
  const white = new Float64Array(N * N);
  const gain: Shape = [0, 0, 0, 0, 0];
  for (let i = 0; i < weights.length; i++) {
    for (let a = 0; a < N; a++) {
      let sum = 0;
      for (let b = 0; b < N; b++) sum += covariance[N * a + b]! * jacobian[N * i + b]!;
      gain[a] = sum * weights[i]! * data.white_K[i]!;
    }
    for (let a = 0; a < N; a++)
      for (let b = 0; b < N; b++) white[N * a + b]! += gain[a]! * gain[b]!;
  }
  return white;
}
