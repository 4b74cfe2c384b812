import type { EstimatorDefinition } from '../definitions.js';
import { ZERO_CELSIUS_K } from '../units.js';
import { NUISANCE } from './priors.js';
import type { StringRun } from './simulate.js';
import type { StringData } from './stringData.js';

/** A reading so many times further off than its class allows is a fault's, and fades from the sum. */
const FAULT_TIMES = 4;
/** Displacement of a front that a sound thermocouple may show against a model that nearly fits [m]. */
const SOUND_M = 0.1;

/**
 * 1/variance of one bin's reading [1/K2]: noise, and what a passing front adds; times 1/(1 + (r/4s)^2)
 * (Cauchy), s what a sound thermocouple may be off, so that stuck and burst ones pull at nothing.
 *
 * @param left_K residual r; 0 = believe the reading
 */
export function rowWeight(
  run: StringRun,
  at: number,
  noise_K: number,
  left_K: number,
  estimator: EstimatorDefinition,
): number {
  const slope = run.slope[at] as number;
  const front = NUISANCE.front_m * slope;
  const sound = Math.hypot(noise_K, 2 * estimator.offset_sigma_K, SOUND_M * slope);
  const far = left_K / (FAULT_TIMES * sound);
  return 1 / ((noise_K * noise_K + front * front) * (1 + far * far));
}

const FIXED = 5;

/** Errors of one thermocouple: offset, gain, place, gas share and lag, and its front's wobble in each run. */
export function sensorSize(data: StringData): number {
  return FIXED + data.runs;
}

/** Row of a sensor's own columns in one bin, scaled so that each has a prior sigma of 1. */
export function sensorRow(
  data: StringData,
  run: StringRun,
  b: number,
  j: number,
  estimator: EstimatorDefinition,
  out: Float64Array,
): void {
  const at = b * data.positions_m.length + j;
  const slope = run.slope[at] as number;
  out.fill(0);
  out[0] = estimator.offset_sigma_K;
  out[1] =
    (estimator.offset_sigma_K / NUISANCE.gainReach_K) *
    ((run.value[at] as number) - ZERO_CELSIUS_K);
  out[2] = estimator.position_sigma_m * slope;
  out[3] = -NUISANCE.share * (run.lag[at] as number) * slope;
  out[4] = -NUISANCE.lag_s * (run.rate[at] as number);
  const shape = NUISANCE.shape_m * Math.sqrt(Math.abs(data.way_m[b] as number));
  out[FIXED + (data.runOf[b] as number)] =
    (data.rim ? Math.hypot(shape, NUISANCE.rimShift_m) : shape) * slope;
}
