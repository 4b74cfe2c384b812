import type { FrontViewEstimate } from '../estimate.js';
import { requireNotNegative, requirePositive } from '../misuse.js';
import {
  type FrontFit,
  type FrontReading,
  type FrontReferences,
  type FrontViewReason,
  fitFront,
} from './frontViewFit.js';
import {
  startTracked,
  stepTracked,
  type TrackedMeasurement,
  type TrackedScalar,
  trackedSigma,
} from './frontViewTracked.js';

/** What one string's front view remembers; plain and bounded. Changed only by `stepFrontView`. */
export interface FrontViewState {
  readonly id: string;
  /** Mean distance of neighbouring thermocouples [m]: over it the sensors' lasting errors change. */
  readonly spacing_m: number;
  /** Position [m]; null while the string has no front. */
  position: TrackedScalar | null;
  /** Width squared [m2]; null while no width was resolved. */
  widthSquared: TrackedScalar | null;
  /** Scans in a row that contradict the prediction. */
  misses: number;
  /** Counted: readings left out, new starts after a jump, fronts dropped, widths held above zero. */
  leftOut: number;
  restarts: number;
  dropped: number;
  floored: number;
}

export interface FrontViewInput {
  readonly readings: readonly FrontReading[];
  readonly references: FrontReferences;
  readonly length_m: number;
  /** Expected travel since the last scan, + = away from the charge inlet [m], and its sigma [m]. */
  readonly travel_m: number;
  readonly travelSigma_m: number;
  /** Expected growth of width squared since the last scan [m2]; negative while a front sharpens. */
  readonly spread_m2: number;
}

export type FrontViewStep = Omit<FrontViewEstimate, 'disagreement'> & {
  /** Why the string does not see the front now; null where it does. */
  readonly reason: FrontViewReason | null;
};

/** A fit further than this many sigmas from the prediction contradicts it... */
const JUMP_SIGMAS = 5;
/** ...and this many in a row are believed. */
const JUMP_SCANS = 3;

/** @throws RangeError for a string without two thermocouples apart */
export function startFrontView(string: {
  readonly id: string;
  readonly thermocouples: readonly { readonly position_m: number }[];
}): FrontViewState {
  const places = string.thermocouples.map((t) => t.position_m);
  const reach = Math.max(...places) - Math.min(...places);
  return {
    id: string.id,
    spacing_m: requirePositive(`spacing of string ${string.id}`, reach / (places.length - 1)),
    position: null,
    widthSquared: null,
    misses: 0,
    leftOut: 0,
    restarts: 0,
    dropped: 0,
    floored: 0,
  };
}

/**
 * Takes one scan of one string in: fit, then the two scalar filters, position and width squared.
 *
 * Prediction: position += travel, width^2 += spread. A travel that is wrong by a constant share (a
 * biased meter) does not average out: `stepTracked` keeps its lag within the sigma.
 *
 * Update: with the part of the fit's variance that is new with each scan; the rest (offsets, places,
 * shape) stays for as long as the front stands between the same sensors, and is added to what is
 * published. A fit without a width (the front stands between two sensors) repeats itself from scan
 * to scan: its variance counts as both.
 *
 * A fit that contradicts the prediction by more than 5 sigma is not taken until three in a row do;
 * then the view starts afresh from the fit (counted). A string that shows no front three times
 * where one was predicted loses it (counted), and so does a front predicted outside the bed.
 *
 * @param state changed in place
 * @returns position and width with sigmas, null where there are none
 * @throws RangeError for a length, sigma or travel that is not a finite number
 */
export function stepFrontView(state: FrontViewState, input: FrontViewInput): FrontViewStep {
  requirePositive('length_m', input.length_m);
  requireNotNegative('travelSigma_m', input.travelSigma_m);
  if (!Number.isFinite(input.travel_m)) throw new RangeError(`travel_m is ${input.travel_m}`);
  if (!Number.isFinite(input.spread_m2)) throw new RangeError(`spread_m2 is ${input.spread_m2}`);

  const fit = fitFront(input.readings, input.references);
  if (fit.seen) state.leftOut += fit.left_out;
  if (state.position === null) {
    if (fit.seen) begin(state, fit);
    return publish(state, fit.seen ? null : fit.reason);
  }
  const turned = Math.abs(input.travel_m) / state.spacing_m;
  const predicted = stepTracked(state.position, input.travel_m, input.travelSigma_m, turned, null);
  const contradicted = fit.seen
    ? jumps(predicted, fit)
    : missesFront(predicted, fit.reason, input.readings);
  state.misses = contradicted ? state.misses + 1 : 0;
  if (state.misses >= JUMP_SCANS) {
    if (fit.seen) {
      begin(state, fit);
      state.restarts++;
    } else drop(state);
    return publish(state, fit.seen ? null : fit.reason);
  }
  const taken = fit.seen && !contradicted ? fit : null;
  state.position =
    taken === null
      ? predicted
      : stepTracked(
          state.position,
          input.travel_m,
          input.travelSigma_m,
          turned,
          measuredPosition(taken),
        );
  advanceWidth(state, taken, input, turned);
  const { mean } = state.position.filter;
  if (mean < 0 || mean > input.length_m) drop(state);
  return publish(state, fit.seen ? (contradicted ? 'jump' : null) : fit.reason);
}

/**
 * (front view - tube) over the sigma of the difference, or null where one of them has none. Both
 * read the same thermocouples, so their errors are partly shared and the true sigma is smaller:
 * the figure errs towards agreement.
 */
export function disagreement(
  view: { readonly position_m: number | null; readonly position_sigma_m: number | null },
  tubePosition_m: number | null,
  tubeSigma_m: number | null,
): number | null {
  const { position_m, position_sigma_m } = view;
  if (position_m === null || position_sigma_m === null) return null;
  if (tubePosition_m === null || tubeSigma_m === null) return null;
  const sigma = Math.hypot(position_sigma_m, tubeSigma_m);
  const value = (position_m - tubePosition_m) / sigma;
  return Number.isFinite(value) ? value : null;
}

function measuredPosition(fit: FrontFit): TrackedMeasurement {
  const whole = fit.covariance[0]!;
  const white = fit.white[0]!;
  const lasting = fit.width_m === null ? whole : Math.max(0, whole - white);
  return { value: fit.position_m, white, lasting };
}

/** var(w^2) = 4 w^2 var(w), to first order. */
function measuredWidth(fit: FrontFit | null): TrackedMeasurement | null {
  if (fit === null || fit.width_m === null) return null;
  const square = fit.width_m * fit.width_m;
  const white = 4 * square * fit.white[5]!;
  return {
    value: square,
    white,
    lasting: Math.max(0, 4 * square * fit.covariance[5]! - white),
  };
}

function begin(state: FrontViewState, fit: FrontFit): void {
  state.position = startTracked(measuredPosition(fit));
  const width = measuredWidth(fit);
  state.widthSquared = width && startTracked(width);
  state.misses = 0;
}

function drop(state: FrontViewState): void {
  state.position = null;
  state.widthSquared = null;
  state.misses = 0;
  state.dropped++;
}

function jumps(predicted: TrackedScalar, fit: FrontFit): boolean {
  const variance = predicted.filter.variance + predicted.lasting + fit.covariance[0]!;
  return Math.abs(fit.position_m - predicted.filter.mean) > JUMP_SIGMAS * Math.sqrt(variance);
}

/** No front among the readings although one is predicted well inside them. */
function missesFront(
  predicted: TrackedScalar,
  reason: FrontViewReason,
  readings: readonly FrontReading[],
): boolean {
  if (reason !== 'uniform' && reason !== 'no_half_crossing') return false;
  const x = readings.filter((r) => Number.isFinite(r.temperature_K)).map((r) => r.x_m);
  const margin = JUMP_SIGMAS * trackedSigma(predicted);
  const { mean } = predicted.filter;
  return mean > Math.min(...x) + margin && mean < Math.max(...x) - margin;
}

/**
 * Growth is known to within itself, or to within that of a front that grows by its own width
 * squared over the bed's length, whichever is more.
 */
function advanceWidth(
  state: FrontViewState,
  fit: FrontFit | null,
  input: FrontViewInput,
  turned: number,
): void {
  const measured = measuredWidth(fit);
  if (state.widthSquared === null) {
    state.widthSquared = measured && startTracked(measured);
    return;
  }
  const before = state.widthSquared.filter.mean;
  const drift = Math.max(
    Math.abs(input.spread_m2),
    (before * Math.abs(input.travel_m)) / input.length_m,
  );
  // A front cannot sharpen to nothing: half its square is kept in one step, and that is counted.
  const least = -0.5 * before;
  if (input.spread_m2 < least) state.floored++;
  const change = Math.max(input.spread_m2, least);
  state.widthSquared = stepTracked(state.widthSquared, change, drift, turned, measured);
}

function publish(state: FrontViewState, reason: FrontViewReason | null): FrontViewStep {
  const { position, widthSquared } = state;
  const width = widthSquared && Math.sqrt(widthSquared.filter.mean);
  return {
    id: state.id,
    position_m: position === null ? null : position.filter.mean,
    position_sigma_m: position && trackedSigma(position),
    width_m: width,
    width_sigma_m: width && widthSquared && trackedSigma(widthSquared) / (2 * width),
    seen: position !== null && reason === null,
    reason,
  };
}
