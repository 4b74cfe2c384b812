import type { Mode } from '../definitions.js';
import type { FrontEstimate } from '../estimate.js';

/** One sigma over the time that was weighed. */
export interface Spread {
  /** State of charge [-]: root of the mean square over time, and the greatest. */
  readonly soc_sigma_rms: number;
  readonly soc_sigma_worst: number;
  /** Front position [m], over fronts that stand wholly in the bed; null where there was none. */
  readonly position_sigma_rms_m: number | null;
  readonly position_sigma_worst_m: number | null;
}

/** Sums from which a spread is made; changed in place by `tally`. */
export interface Tally {
  time_s: number;
  soc: number;
  soc_worst: number;
  front_time_s: number;
  front: number;
  front_worst_m: number;
  /** Greatest rise of the state of charge's variance over what it is compared with, and when. */
  rise: number;
  rise_in: Mode | null;
}

/** Sums over no time at all. */
export function startTally(): Tally {
  return {
    time_s: 0,
    soc: 0,
    soc_worst: 0,
    front_time_s: 0,
    front: 0,
    front_worst_m: 0,
    rise: 0,
    rise_in: null,
  };
}

/** What is known at the end of a step. */
export interface Sigmas {
  readonly soc: number;
  readonly fronts: readonly FrontEstimate[];
}

/** Adds a step; `compared` is the state of charge's sigma with all thermocouples [-]. */
export function tally(sums: Tally, now: Sigmas, dt_s: number, mode: Mode, compared: number): void {
  sums.time_s += dt_s;
  sums.soc += now.soc * now.soc * dt_s;
  sums.soc_worst = Math.max(sums.soc_worst, now.soc);
  const rise = now.soc * now.soc - compared * compared;
  if (rise > sums.rise) {
    sums.rise = rise;
    sums.rise_in = mode;
  }
  for (const { width_m, position_sigma_m } of now.fronts) {
    // Where a front leaves the bed its slope fades, and with it the sense of a position.
    if (width_m === null || position_sigma_m === null) continue;
    sums.front_time_s += dt_s;
    sums.front += position_sigma_m * position_sigma_m * dt_s;
    sums.front_worst_m = Math.max(sums.front_worst_m, position_sigma_m);
  }
}

/** @throws RangeError where nothing was tallied */
export function spreadOf(sums: Tally): Spread {
  if (!(sums.time_s > 0)) throw new RangeError(`time_s = ${sums.time_s}: expected above 0`);
  const seen = sums.front_time_s > 0;
  return {
    soc_sigma_rms: Math.sqrt(sums.soc / sums.time_s),
    soc_sigma_worst: sums.soc_worst,
    position_sigma_rms_m: seen ? Math.sqrt(sums.front / sums.front_time_s) : null,
    position_sigma_worst_m: seen ? sums.front_worst_m : null,
  };
}
