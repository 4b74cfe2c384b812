import { requireNotNegative, requirePositive } from '../misuse.js';
import { findFronts } from './fronts.js';
import type { Shape } from './frontViewAlgebra.js';
import { bracketFront, steepReadings } from './frontViewBracket.js';
import { BAD_MISFIT, publishFront } from './frontViewPublish.js';
import { type FrontData, type FrontPrior, solveFront } from './frontViewSolve.js';

/** One thermocouple of a string that gave a value this scan. */
export interface FrontReading {
  readonly x_m: number;
  /** NaN: missing; the reading is left out. */
  readonly temperature_K: number;
  /** Noise that is new with every scan [K]. */
  readonly sigma_K: number;
  /** Error that stays (offset, calibration) [K]; 0 where left out. */
  readonly lasting_K?: number;
  /** Uncertainty of the sensor's place [m]; 0 where left out. */
  readonly place_m?: number;
}

/** Reference temperatures of the store: at x = 0 once charged, and once discharged. */
export interface FrontReferences {
  readonly charged_K: number;
  readonly discharged_K: number;
}

export const FRONT_VIEW_REASONS = [
  'too_few_readings',
  'uniform',
  'no_half_crossing',
  'several_fronts',
  'reversed',
  'outside_sensors',
  'not_settled',
  'jump',
] as const;
export type FrontViewReason = (typeof FRONT_VIEW_REASONS)[number];

export interface FrontFit {
  readonly seen: true;
  /** theta = 0.5 of the store's references on the fitted shape [m]. */
  readonly position_m: number;
  /**
   * Half the distance between theta = 0.16 and 0.84 of the references on the fitted shape [m]; null
   * where it does not reach them, or fewer than two readings stand in it.
   */
  readonly width_m: number | null;
  /**
   * Sigma of the fitted curve [m], where it stands in readings: by it its shape may err, whether or not
   * it reaches the levels of a width. null for a front that is narrower than their spacing.
   */
  readonly scale_m: number | null;
  readonly hot_plateau_K: number;
  readonly cold_plateau_K: number;
  /**
   * Covariance of (position, width, hot plateau, cold plateau), 4 x 4 row-major, symmetric; zeros
   * for a width that is null.
   */
  readonly covariance: Float64Array;
  /** The part of it that is new with every scan; the rest stays while the front stays. */
  readonly white: Float64Array;
  /** Sum of squared normalised residuals over degrees of freedom; near 1 where the shape fits. */
  readonly misfit: number;
  /** Readings left out because the others agree much better without them: 0 or 1. */
  readonly left_out: 0 | 1;
}

export interface NoFrontFit {
  readonly seen: false;
  readonly reason: FrontViewReason;
}

/** Sigma of the prior on each plateau, as a share of the range between the references. */
const PLATEAU_PRIOR = 0.1;
/** Sigma of the prior on the skew: at 0.15 one half is 1.13 times as wide as the other. */
const SKEW_PRIOR = 0.15;
/**
 * A fit of BAD_MISFIT is tried without its worst reading, and that is taken where it makes the squared
 * residuals smaller by this factor, with at least as many left. Not without the first or the last one:
 * what differs there alone is a new front that enters.
 */
const BETTER = 4;
const LEAST_LEFT = 6;

/**
 * Fits the front of one string, by weighted least squares of an erf front that may be skewed, between
 * plateaus of its own (`solveFront`). Independent of the bed model.
 *
 * Position and width are those of the definition, on the fitted curve and by the references of the
 * store: theta = 0.5, and half the way from 0.16 to 0.84 (`publishFront`). Priors, weak on purpose:
 * each plateau at its reference with a tenth of the range, no skew +/- 0.15, ln w over everything from
 * a quarter of the spacing to half the readings' reach as plus and minus one sigma. They decide only
 * what the readings leave open, such as a plateau outside the string. Where the residuals are larger
 * than their sigmas (the front has another shape) the covariance grows by chi squared over its
 * degrees of freedom (Birge 1932); where they are four times smaller without the worst reading, it
 * is left out instead (`left_out`): sensors are judged elsewhere, but one that fails now must not
 * bend the view until then. A front with fewer than two readings in its steep part has no width, and
 * its position is that of `bracketFront`. That is for narrow fronts alone: a wide one whose fit does not
 * settle (a new front that has run into the old one is no shape of this kind) is not seen.
 *
 * @param readings any order; missing ones as NaN
 * @param references charged and discharged temperature [K]
 * @returns the fit, or why there is none
 * @throws RangeError for equal references, or a sigma that is not positive
 */
export function fitFront(
  readings: readonly FrontReading[],
  references: FrontReferences,
): FrontFit | NoFrontFit {
  const { charged_K, discharged_K } = references;
  const range = Math.abs(charged_K - discharged_K);
  requirePositive('range between charged_K and discharged_K', range);
  const sorted = readings
    .filter((reading) => Number.isFinite(reading.temperature_K))
    .sort((a, b) => a.x_m - b.x_m);
  if (sorted.length < 3) return none('too_few_readings');
  const data = columns(sorted);
  const merged = mergePlaces(data);
  if (merged.x.length < 3) return none('too_few_readings');

  const found = findFronts(
    merged.x,
    merged.T,
    Math.max(charged_K, discharged_K),
    Math.min(charged_K, discharged_K),
  );
  if (found.reason !== null)
    return none(found.reason === 'uniform' ? 'uniform' : 'no_half_crossing');
  const front = found.fronts[0]!;
  if (found.fronts.length > 1) return none('several_fronts');
  if (front.slope_K_m > 0 !== discharged_K > charged_K) return none('reversed');

  const reach = merged.x[merged.x.length - 1]! - merged.x[0]!;
  const narrow = (0.25 * reach) / (merged.x.length - 1);
  const wide = 0.5 * reach;
  const prior: FrontPrior = {
    charged_K,
    discharged_K,
    plateauSigma_K: PLATEAU_PRIOR * range,
    skewSigma: SKEW_PRIOR,
    logWidth: 0.5 * Math.log(narrow * wide),
    logWidthSigma: 0.5 * Math.log(wide / narrow),
  };
  const start: Shape = [
    front.position_m,
    Math.log(Math.min(wide, Math.max(narrow, front.width_m ?? narrow))),
    charged_K,
    discharged_K,
    0,
  ];
  const solution = solveFront(data, prior, start);
  if (solution !== null && steepReadings(data, solution.parameters) >= 2) {
    const { misfit, worst } = solution;
    const isInside = worst > 0 && worst < sorted.length - 1;
    if (misfit > BAD_MISFIT && isInside && sorted.length > LEAST_LEFT) {
      const fewer = columns(sorted.filter((_, i) => i !== worst));
      const better = solveFront(fewer, prior, solution.parameters);
      if (better !== null && BETTER * better.misfit < misfit)
        return publishFront(better, fewer, references, 1);
    }
    return publishFront(solution, data, references, 0);
  }
  // Between the references, as there is no curve to tell its plateaus.
  if (solution === null && steepReadings(data, start) >= 2) return none('not_settled');
  return bracketFront(data, prior, front.position_m) ?? none('not_settled');
}

function none(reason: FrontViewReason): NoFrontFit {
  return { seen: false, reason };
}

function columns(readings: readonly FrontReading[]): FrontData {
  const empty = (): Float64Array => new Float64Array(readings.length);
  const data: FrontData = {
    x_m: empty(),
    temperature_K: empty(),
    white_K: empty(),
    lasting_K: empty(),
    place_m: empty(),
  };
  readings.forEach((r, i) => {
    if (!Number.isFinite(r.x_m)) throw new RangeError(`x_m must be finite, got ${r.x_m}`);
    data.x_m[i] = r.x_m;
    data.temperature_K[i] = r.temperature_K;
    data.white_K[i] = requirePositive('sigma_K', r.sigma_K);
    data.lasting_K[i] = requireNotNegative('lasting_K', r.lasting_K ?? 0);
    data.place_m[i] = requireNotNegative('place_m', r.place_m ?? 0);
  });
  return data;
}

/** Sensors at one place count as their mean where a profile is needed. */
function mergePlaces(data: FrontData): { x: Float64Array; T: Float64Array } {
  const x: number[] = [];
  const T: number[] = [];
  let count = 0;
  for (let i = 0; i < data.x_m.length; i++) {
    const k = x.length - 1;
    if (k >= 0 && data.x_m[i] === x[k]) {
      count++;
      T[k]! += (data.temperature_K[i]! - T[k]!) / count;
    } else {
      x.push(data.x_m[i]!);
      T.push(data.temperature_K[i]!);
      count = 1;
    }
  }
  return { x: Float64Array.from(x), T: Float64Array.from(T) };
}
