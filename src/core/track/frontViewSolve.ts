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

/** Independent normal priors: plateaus [K] and ln(width/m). */
export interface FrontPrior {
  readonly charged_K: number;
  readonly discharged_K: number;
  readonly plateauSigma_K: number;
  readonly logWidth: number;
  readonly logWidthSigma: number;
}

/** Order of the four parameters: midpoint p [m], ln w, plateau at the charge inlet A, other B [K]. */
export type Four = [number, number, number, number];

export interface FrontSolution {
  readonly parameters: Four;
  /** Posterior covariance, 4 x 4 row-major, exactly symmetric. */
  readonly covariance: Float64Array;
  /** The part of it that is new with every scan. */
  readonly white: Float64Array;
  /** Sum of squared normalised residuals, priors included, over its degrees of freedom. */
  readonly misfit: number;
  /** Index of the reading with the largest studentised residual, r^2/(var - var of the fit there). */
  readonly worst: number;
}

const MOST_STEPS = 60;
/** Done when a step would gain less than this in the sum of squares: a thousandth of a sigma. */
const ENOUGH = 1e-6;

/**
 * Weighted least squares of T(x) = A + (B - A) Phi((x - p)/w) with weak priors, by
 * Levenberg-Marquardt steps (Levenberg 1944, Marquardt 1963) on the analytic derivatives
 *
 *   dT/dp = -(B - A) phi/w,  dT/dln w = -(B - A) phi u,  dT/dA = 1 - Phi,  dT/dB = Phi.
 *
 * A reading's variance is white^2 + lasting^2 + (dT/dx place)^2; the last term needs the slope and
 * is taken from the solution before, twice. Covariance: H^-1 of the final weights; of it the white
 * part is H^-1 J' W S W J H^-1 with S the white variances.
 *
 * @returns null where the steps do not settle
 */
export function solveFront(data: FrontData, prior: FrontPrior, start: Four): FrontSolution | null {
  const weights = new Float64Array(data.x_m.length);
  let at = start;
  // Without uncertain places the weights do not depend on the slope.
  const passes = data.place_m.some((place) => place > 0) ? 3 : 1;
  for (let pass = 0; pass < passes; pass++) {
    weigh(data, at, weights);
    const settled = descend(data, weights, prior, at);
    if (settled === null) return null;
    at = settled;
  }
  const system = normalEquations(data, weights, prior, at);
  const factor = cholesky(system.matrix, 0);
  if (factor === null) return null;
  const covariance = new Float64Array(16);
  for (let j = 0; j < 4; j++) {
    const unit: Four = [0, 0, 0, 0];
    unit[j] = 1;
    covariance.set(solve(factor, unit), 4 * j);
  }
  symmetrise(covariance);
  const freedom = data.x_m.length + 3 - 4;
  return {
    parameters: at,
    covariance,
    white: whitePart(data, weights, at, covariance),
    misfit: freedom > 0 ? system.squares / freedom : 1,
    worst: worstReading(data, weights, at, covariance),
  };
}

function weigh(data: FrontData, [p, logW, A, B]: Four, weights: Float64Array): void {
  const w = Math.exp(logW);
  for (let i = 0; i < weights.length; i++) {
    const slope = ((B - A) / w) * normalDensity((data.x_m[i]! - p) / w);
    weights[i] =
      1 / (data.white_K[i]! ** 2 + data.lasting_K[i]! ** 2 + (slope * data.place_m[i]!) ** 2);
  }
}

function descend(
  data: FrontData,
  weights: Float64Array,
  prior: FrontPrior,
  start: Four,
): Four | null {
  let at = start;
  let system = normalEquations(data, weights, prior, at);
  let damping = 1e-3;
  for (let step = 0; step < MOST_STEPS; step++) {
    const factor = cholesky(system.matrix, damping);
    if (factor === null) {
      damping *= 10;
      continue;
    }
    const move = solve(factor, system.gradient);
    // A step of more than a factor e in width leaves the region where the tangent means anything.
    const shorten = Math.min(1, 1 / Math.max(1e-300, Math.abs(move[1])));
    const next: Four = [
      at[0] + shorten * move[0],
      at[1] + shorten * move[1],
      at[2] + shorten * move[2],
      at[3] + shorten * move[3],
    ];
    const trial = normalEquations(data, weights, prior, next);
    const gain = system.squares - trial.squares;
    if (gain >= 0) {
      at = next;
      system = trial;
      damping = Math.max(1e-9, damping / 10);
      if (gain < ENOUGH && shorten === 1 && damping < 1e-2) return at;
    } else {
      // At the minimum round-off alone decides the sign of a gain far below `ENOUGH`.
      if (-gain < 1e-12 * (1 + system.squares)) return at;
      damping *= 10;
      if (damping > 1e12) return null;
    }
  }
  return null;
}

interface NormalEquations {
  /** Lower triangle of J'WJ + priors, row-major 4 x 4. */
  readonly matrix: Float64Array;
  /** J'W r + priors, the direction of descent. */
  readonly gradient: Four;
  readonly squares: number;
}

function normalEquations(
  data: FrontData,
  weights: Float64Array,
  prior: FrontPrior,
  [p, logW, A, B]: Four,
): NormalEquations {
  const w = Math.exp(logW);
  const h = new Float64Array(16);
  const g: Four = [0, 0, 0, 0];
  const j: Four = [0, 0, 0, 0];
  let squares = 0;
  for (let i = 0; i < weights.length; i++) {
    const residual = data.temperature_K[i]! - derivatives(data.x_m[i]!, p, w, A, B, j);
    const weight = weights[i]!;
    squares += weight * residual * residual;
    for (let a = 0; a < 4; a++) {
      const wa = weight * (j[a] as number);
      g[a] = (g[a] as number) + wa * residual;
      for (let b = 0; b <= a; b++) h[4 * a + b] = (h[4 * a + b] as number) + wa * (j[b] as number);
    }
  }
  const plateau = 1 / prior.plateauSigma_K ** 2;
  const width = 1 / prior.logWidthSigma ** 2;
  const off = [prior.logWidth - logW, prior.charged_K - A, prior.discharged_K - B];
  [width, plateau, plateau].forEach((weight, k) => {
    h[5 * (k + 1)]! += weight;
    g[k + 1]! += weight * off[k]!;
    squares += weight * off[k]! * off[k]!;
  });
  return { matrix: h, gradient: g, squares };
}

/** Model temperature at x; fills the derivatives. */
function derivatives(x: number, p: number, w: number, A: number, B: number, j: Four): number {
  const u = (x - p) / w;
  const density = normalDensity(u);
  const share = normalDistribution(u, density);
  const steep = (B - A) * density;
  j[0] = -steep / w;
  j[1] = -steep * u;
  j[2] = 1 - share;
  j[3] = share;
  return A + (B - A) * share;
}

function worstReading(
  data: FrontData,
  weights: Float64Array,
  [p, logW, A, B]: Four,
  covariance: Float64Array,
): number {
  const j: Four = [0, 0, 0, 0];
  let worst = 0;
  let most = -1;
  for (let i = 0; i < weights.length; i++) {
    const model = derivatives(data.x_m[i]!, p, Math.exp(logW), A, B, j);
    let spread = 0;
    for (let k = 0; k < 16; k++) spread += j[k >> 2]! * covariance[k]! * j[k & 3]!;
    // A reading that the fit follows entirely (leverage 1) can show no residual.
    const free = 1 / weights[i]! - spread;
    const size = free > 0 ? (data.temperature_K[i]! - model) ** 2 / free : 0;
    if (size > most) {
      most = size;
      worst = i;
    }
  }
  return worst;
}

function whitePart(
  data: FrontData,
  weights: Float64Array,
  [p, logW, A, B]: Four,
  covariance: Float64Array,
): Float64Array {
  const w = Math.exp(logW);
  const white = new Float64Array(16);
  const j: Four = [0, 0, 0, 0];
  const gain: Four = [0, 0, 0, 0];
  for (let i = 0; i < weights.length; i++) {
    derivatives(data.x_m[i]!, p, w, A, B, j);
    for (let a = 0; a < 4; a++) {
      let sum = 0;
      for (let b = 0; b < 4; b++) sum += covariance[4 * a + b]! * j[b]!;
      gain[a] = sum * weights[i]! * data.white_K[i]!;
    }
    for (let a = 0; a < 4; a++)
      for (let b = 0; b < 4; b++) white[4 * a + b]! += gain[a]! * gain[b]!;
  }
  return white;
}

/** Lower factor of the matrix with its diagonal raised by `damping`; null where not positive. */
function cholesky(matrix: Float64Array, damping: number): Float64Array | null {
  const l = new Float64Array(16);
  for (let a = 0; a < 4; a++) {
    for (let b = 0; b <= a; b++) {
      let sum = matrix[4 * a + b]!;
      if (a === b) sum *= 1 + damping;
      for (let k = 0; k < b; k++) sum -= l[4 * a + k]! * l[4 * b + k]!;
      if (a !== b) l[4 * a + b] = sum / l[5 * b]!;
      else if (sum > 1e-14 * matrix[5 * a]! && sum < Number.POSITIVE_INFINITY)
        l[5 * a] = Math.sqrt(sum);
      else return null;
    }
  }
  return l;
}

function solve(l: Float64Array, right: Four): Four {
  const x: Four = [...right];
  for (let a = 0; a < 4; a++) {
    for (let k = 0; k < a; k++) x[a]! -= l[4 * a + k]! * x[k]!;
    x[a]! /= l[5 * a]!;
  }
  for (let a = 3; a >= 0; a--) {
    for (let k = a + 1; k < 4; k++) x[a]! -= l[4 * k + a]! * x[k]!;
    x[a]! /= l[5 * a]!;
  }
  return x;
}

/** Averages the two halves of a 4 x 4 in place: exact symmetry where round-off left none. */
export function symmetrise(m: Float64Array): void {
  for (let a = 0; a < 4; a++) {
    for (let b = 0; b < a; b++) {
      const mean = 0.5 * (m[4 * a + b]! + m[4 * b + a]!);
      m[4 * a + b] = mean;
      m[4 * b + a] = mean;
    }
  }
}
