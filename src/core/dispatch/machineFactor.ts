/**
 * The plant's own power per metered kilogram over that of the machine model at the same flow, one
 * per direction: learned while the unit runs. ln(factor) is a slow random walk, measured by
 * ln((|P| -/+ auxiliaries)/(m w)). What it tells of the meter, the rock and the other direction is
 * worked out in `calibrate`.
 */
export interface MachineFactor {
  /** ln(factor) and its variance; variance is null before the first measurement. */
  log: number;
  variance: number | null;
  /** Time since the last change of mode [s]. */
  steady_s: number;
  /** Mean flow at which it was learned [kg/s], 0 before; time since then [s], Infinity before. */
  flow_kg_s: number;
  age_s: number;
  /** Running mean of the innovations over what their scatter allows, 0 = as expected. */
  surprise: number;
}

/** A factor that has learned nothing: ln = 0, its variance null, settled in no mode yet. */
export function startMachineFactor(): MachineFactor {
  return {
    log: 0,
    variance: null,
    steady_s: 0,
    flow_kg_s: 0,
    age_s: Number.POSITIVE_INFINITY,
    surprise: 0,
  };
}

/** Readings of power and flow scatter by this share, over this correlation time: a meter's short-term error. */
const SCATTER = 0.01;
const CORRELATION_S = 600;
/** Fouling takes one to two per cent of a machine in some weeks: 0.1 % in an hour, 0.5 % in a day. */
const WALK_PER_SQRT_H = 0.001;
/** After a change of mode the loop needs this long to settle [s]. */
const SETTLE_S = 600;
/** Off by so many sigmas for a correlation time, meter or machine have changed: learn anew. */
const CHANGED = 4;
/** The mean flow forgets over this time of running [s]. */
const FLOW_MEMORY_S = 4 * 3600;

/**
 * One scan's news of the factor.
 *
 * @param ratio measured over modelled power per metered kilogram; NaN = no news
 * @param flow_kg_s metered flow of the scan
 * @returns the variance of a change of meter or machine, 0 = none: what was learned before, in the
 *   other direction too, is that much less sure
 */
export function stepMachineFactor(
  state: MachineFactor,
  ratio: number,
  dt_s: number,
  flow_kg_s: number,
): number {
  state.steady_s += dt_s;
  if (!(ratio > 0.2 && ratio < 5) || state.steady_s < SETTLE_S) return 0;
  const noise = SCATTER ** 2 * Math.max(1, (2 * CORRELATION_S) / dt_s);
  state.age_s = 0;
  if (state.variance === null) {
    state.log = Math.log(ratio);
    state.variance = noise;
    state.flow_kg_s = flow_kg_s;
    return 0;
  }
  const innovation = Math.log(ratio) - state.log;
  const scale = Math.sqrt(state.variance + SCATTER ** 2);
  const share = 1 - Math.exp(-dt_s / CORRELATION_S);
  state.surprise += share * (innovation / scale - state.surprise);
  const changed = Math.abs(state.surprise) > CHANGED;
  if (changed) {
    state.variance += innovation ** 2;
    state.surprise = 0;
  }
  const gain = state.variance / (state.variance + noise);
  state.log += gain * innovation;
  state.variance *= 1 - gain;
  state.flow_kg_s +=
    Math.max(gain, 1 - Math.exp(-dt_s / FLOW_MEMORY_S)) * (flow_kg_s - state.flow_kg_s);
  return changed ? innovation ** 2 : 0;
}

/** Time passes, in whatever mode: the factor walks. */
export function ageMachineFactor(state: MachineFactor, dt_s: number): void {
  if (state.variance === null) return;
  state.variance += (WALK_PER_SQRT_H ** 2 * dt_s) / 3600;
  state.age_s += dt_s;
}
