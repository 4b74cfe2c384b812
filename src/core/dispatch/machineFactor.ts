/**
 * The plant's own power per metered kilogram over that of the machine model, one per direction:
 * learned while the unit runs, so that a biased meter and an inexact machine cancel in the hours.
 * ln(factor) is a slow random walk, measured by ln((|P| -/+ auxiliaries)/(m w)).
 */
export interface MachineFactor {
  /** ln(factor) and its variance; variance is null before the first measurement. */
  log: number;
  variance: number | null;
  /** Time since the last change of mode [s]. */
  steady_s: number;
}

export function startMachineFactor(): MachineFactor {
  return { log: 0, variance: null, steady_s: 0 };
}

/** Readings of power and flow scatter by this share, over this correlation time. */
const SCATTER = 0.03;
const CORRELATION_S = 600;
const WALK_PER_SQRT_H = 0.004;
/** After a change of mode the loop needs this long to settle [s]. */
const SETTLE_S = 600;

/**
 * One scan's news of the factor.
 *
 * @param ratio measured over modelled power per metered kilogram; NaN = no news
 * @param prior what is expected before anything was learned: the mean flow factor (a meter that
 *   reads low makes the power per metered kilogram high by the same share), and its relative sigma
 */
export function stepMachineFactor(
  state: MachineFactor,
  ratio: number,
  dt_s: number,
  prior: { factor: number; sigma: number },
): void {
  state.steady_s += dt_s;
  if (state.variance !== null) state.variance += (WALK_PER_SQRT_H ** 2 * dt_s) / 3600;
  if (!(ratio > 0.2 && ratio < 5) || state.steady_s < SETTLE_S) return;
  if (state.variance === null) {
    state.log = Math.log(prior.factor);
    state.variance = prior.sigma ** 2;
  }
  const noise = SCATTER ** 2 * Math.max(1, (2 * CORRELATION_S) / dt_s);
  const gain = state.variance / (state.variance + noise);
  state.log += gain * (Math.log(ratio) - state.log);
  state.variance *= 1 - gain;
}

/** The factor to use now, and its relative sigma. */
export function machineFactor(
  state: MachineFactor,
  prior: { factor: number; sigma: number },
): { factor: number; sigma: number } {
  if (state.variance === null) return prior;
  return { factor: Math.exp(state.log), sigma: Math.sqrt(state.variance) };
}
