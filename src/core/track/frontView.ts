import type { FrontViewEstimate } from '../estimate.js';
import { requireNotNegative, requirePositive } from '../misuse.js';
import {
  type FrontFit,
  type FrontReading,
  type FrontReferences,
  type FrontViewReason,
  fitFront,
  type NoFrontFit,
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
  /**
   * How far the front in the readings stands from the rock's, + = away from the charge inlet [m], and
   * its sigma [m]: a junction that sees the share s of the gas reads the rock at x - s l, l the signed
   * gas lag G cf/hv, less the way the front goes within its own lag. 0 where left out.
   */
  readonly readingShift_m?: number;
  readonly readingShiftSigma_m?: number;
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

/**
 * Share of the width by which position and width of a real front differ from those of the best fitting
 * shape: flanks that losses and earlier cycles left. Measured, rms over a day with reversals on the
 * finer plant of test/plant, three draws; see DEVELOPERS.md.
 */
const SHAPE_ERROR = 0.025;

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
  requireNotNegative('readingShiftSigma_m', input.readingShiftSigma_m ?? 0);
  for (const name of ['travel_m', 'spread_m2', 'readingShift_m'] as const) {
    const value = input[name] ?? 0;
    if (!Number.isFinite(value)) throw new RangeError(`${name} is ${value}`);
  }

  const fit = fitFront(input.readings, input.references);
  const measured = fit.seen ? measuredPosition(fit, input) : null;
  const width = measuredWidth(fit);
  if (fit.seen) state.leftOut += fit.left_out;
  const reason = fit.seen ? null : fit.reason;
  if (state.position === null) {
    if (measured !== null) begin(state, measured, width);
    return publish(state, reason);
  }
  const turned = Math.abs(input.travel_m) / state.spacing_m;
  const predicted = stepTracked(state.position, input.travel_m, input.travelSigma_m, turned, null);
  const contradicted =
    measured !== null ? jumps(predicted, measured) : missesFront(predicted, reason, input.readings);
  state.misses = contradicted ? state.misses + 1 : 0;
  if (state.misses >= JUMP_SCANS) {
    if (measured !== null) {
      begin(state, measured, width);
      state.restarts++;
    } else drop(state);
    return publish(state, reason);
  }
  const taken = contradicted ? null : measured;
  state.position =
    taken === null
      ? predicted
      : stepTracked(state.position, input.travel_m, input.travelSigma_m, turned, taken);
  advanceWidth(state, contradicted ? null : width, input, turned);
  const { mean } = state.position.filter;
  if (mean < 0 || mean > input.length_m) drop(state);
  return publish(state, contradicted && measured !== null ? 'jump' : reason);
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

function measuredPosition(fit: FrontFit, input: FrontViewInput): TrackedMeasurement {
  const whole = fit.covariance[0]!;
  const white = fit.white[0]!;
  const scale = fit.width_m ?? fit.scale_m;
  const lasting = scale === null ? whole : Math.max(0, whole - white) + (SHAPE_ERROR * scale) ** 2;
  return {
    value: fit.position_m - (input.readingShift_m ?? 0),
    white,
    lasting: lasting + (input.readingShiftSigma_m ?? 0) ** 2,
  };
}

/** var(w^2) = 4 w^2 var(w), to first order. */
function measuredWidth(fit: FrontFit | NoFrontFit): TrackedMeasurement | null {
  if (!fit.seen || fit.width_m === null) return null;
  const square = fit.width_m ** 2;
  const lasting = Math.max(0, fit.covariance[5]! - fit.white[5]!) + SHAPE_ERROR ** 2 * square;
  return { value: square, white: 4 * square * fit.white[5]!, lasting: 4 * square * lasting };
}

function begin(
  state: FrontViewState,
  position: TrackedMeasurement,
  width: TrackedMeasurement | null,
): void {
  state.position = startTracked(position);
  state.widthSquared = width && startTracked(width);
  state.misses = 0;
}

function drop(state: FrontViewState): void {
  state.position = null;
  state.widthSquared = null;
  state.misses = 0;
  state.dropped++;
}

function jumps(predicted: TrackedScalar, measured: TrackedMeasurement): boolean {
  const variance =
    predicted.filter.variance + predicted.lasting + measured.white + measured.lasting;
  return Math.abs(measured.value - predicted.filter.mean) > JUMP_SIGMAS * Math.sqrt(variance);
}

/** No front among the readings although one is predicted well inside them. */
function missesFront(
  predicted: TrackedScalar,
  reason: FrontViewReason | null,
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
  measured: TrackedMeasurement | null,
  input: FrontViewInput,
  turned: number,
): void {
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
