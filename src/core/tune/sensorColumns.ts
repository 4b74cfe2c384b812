import type { EstimatorDefinition } from '../definitions.js';
import { ZERO_CELSIUS_K } from '../units.js';
import { NUISANCE } from './priors.js';
import type { StringRun } from './simulate.js';
import type { StringData } from './stringColumns.js';

/** 1/variance of one bin's reading [1/K2]: noise, and what a passing front adds. */
export function rowWeight(run: StringRun, at: number, noise_K: number): number {
  const front = NUISANCE.front_m * (run.slope[at] as number);
  return 1 / (noise_K * noise_K + front * front);
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
