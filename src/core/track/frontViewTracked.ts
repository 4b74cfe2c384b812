import { type ScalarState, stepScalar } from './scalarFilter.js';

/** A scalar followed by a Kalman filter, besides errors that no filter averages away. Plain. */
export interface TrackedScalar {
  readonly filter: ScalarState;
  /** Variance of what stays from measurement to measurement. */
  readonly lasting: number;
  /** Sum of the drifts since the last measurement. */
  readonly blindDrift: number;
}

export interface TrackedMeasurement {
  readonly value: number;
  /** Variance that is new each time, and variance that stays. */
  readonly white: number;
  readonly lasting: number;
}

export function startTracked(measurement: TrackedMeasurement): TrackedScalar {
  const { value, white, lasting } = measurement;
  return { filter: { mean: value, variance: white }, lasting, blindDrift: 0 };
}

/** Sigma of the whole: what the filter leaves, and what stays. */
export function trackedSigma(tracked: TrackedScalar): number {
  return Math.sqrt(tracked.filter.variance + tracked.lasting);
}

/**
 * Process variance for a filter whose prediction may err by the same `drift` in every step, with
 * measurement variance r: the least for which the lag that builds up, drift (1 - K)/K, stays within
 * the filter's own sigma sqrt(K r). Taking 1 - K as 1 gives K^3 = drift^2/r, and from the stationary
 * P' = K r/(1 - K), P = K r follows q = K^2 r/(1 - K). K is held to 0.9, where the filter follows
 * its measurements.
 */
export function lagVariance(drift: number, measurementVariance: number): number {
  const gain = Math.min(0.9, Math.cbrt((drift * drift) / measurementVariance));
  return (gain * gain * measurementVariance) / (1 - gain);
}

/**
 * One step of prediction by `change`, known to within `drift`, and where there is a measurement, its
 * update. The drift is taken as an error of constant sense (a biased meter): while nothing is
 * measured its steps add up linearly, and while something is, `lagVariance` holds. The lasting error
 * also turns into another one as `turned` goes from 0 to 1 (the front has moved on by one spacing of
 * the sensors), which the filter must follow: sqrt(lasting) turned joins the drift.
 */
export function stepTracked(
  tracked: TrackedScalar,
  change: number,
  drift: number,
  turned: number,
  measurement: TrackedMeasurement | null,
): TrackedScalar {
  const whole = Math.hypot(drift, Math.sqrt(tracked.lasting) * Math.min(1, turned));
  const after = tracked.blindDrift + whole;
  const blind = after * after - tracked.blindDrift * tracked.blindDrift;
  if (measurement === null) {
    const step = { change, processVariance: blind, measurement };
    return { ...tracked, filter: stepScalar(tracked.filter, step), blindDrift: after };
  }
  const { value, white, lasting } = measurement;
  const filter = stepScalar(tracked.filter, {
    change,
    // The first measurement after a blind stretch meets what has added up; then the lag rules.
    processVariance: tracked.blindDrift > 0 ? blind : lagVariance(whole, white),
    measurement: { mean: value, variance: white },
  });
  return { filter, lasting, blindDrift: 0 };
}
