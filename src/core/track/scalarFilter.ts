import KalmanFilter from 'kalmanjs';
import { requireNotNegative, requirePositive } from '../misuse.js';

/** Mean and variance of one scalar; plain, so that it can be saved and restored. */
export interface ScalarState {
  readonly mean: number;
  readonly variance: number;
}

export interface ScalarStep {
  /** Expected change since the last step, added to the mean. */
  readonly change: number;
  /** Variance of that change, >= 0. */
  readonly processVariance: number;
  /** null: nothing was measured, the filter only predicts. Variance > 0. */
  readonly measurement: ScalarState | null;
}

function requireFinite(name: string, value: number): void {
  if (!Number.isFinite(value))
    throw new RangeError(`${name} must be a finite number, got ${value}`);
}

/**
 * One step of the scalar Kalman filter (Kalman 1960), computed by kalmanjs 1.1.0:
 *
 *   x' = x + u,  P' = P + q,   K = P'/(P' + r),   x = x' + K (z - x'),  P = P' - K P'
 *
 * The one place that touches kalmanjs, whose traps are closed here: its R is the process noise and
 * its Q the measurement noise; a NaN makes its next call start afresh without a word, null counts
 * as 0 and strings are coerced, so every argument is checked first; it keeps state of its own, so a
 * filter is made for each call and fed the state by its first call (which takes z as the mean and Q
 * as the variance); its time update without a measurement is one with infinite noise.
 *
 * @param state mean [unit of the caller], variance [unit^2] >= 0
 * @returns the state after the step; its variance is never negative
 * @throws RangeError for an argument that is not finite, a negative variance, or a measurement
 *   without one
 */
export function stepScalar(state: ScalarState, step: ScalarStep): ScalarState {
  requireFinite('state.mean', state.mean);
  requireNotNegative('state.variance', state.variance);
  requireFinite('change', step.change);
  requireNotNegative('processVariance', step.processVariance);
  const { measurement } = step;
  const filter = new KalmanFilter({ R: 0, Q: state.variance, A: 1, B: 1, C: 1 });
  filter.filter(state.mean);
  filter.setProcessNoise(step.processVariance);
  if (measurement === null) {
    filter.setMeasurementNoise(Number.POSITIVE_INFINITY);
    filter.filter(0, step.change);
  } else {
    requireFinite('measurement.mean', measurement.mean);
    filter.setMeasurementNoise(requirePositive('measurement.variance', measurement.variance));
    filter.filter(measurement.mean, step.change);
  }
  // `uncertainty` is the variance before the next update: without process noise, the present one.
  filter.setProcessNoise(0);
  const variance = filter.uncertainty();
  // K may round to just above 1 where P' is huge against r; P' r/(P' + r) is the same number then.
  const before = state.variance + step.processVariance;
  const noise = measurement?.variance ?? 0;
  return {
    mean: filter.lastMeasurement(),
    variance: variance >= 0 ? variance : noise / (1 + noise / before),
  };
}
