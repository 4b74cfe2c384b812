import type { ImplausibleReading } from './track/plausible.js';
import type { StoreModel, StoreState } from './track/storeTracker.js';

/**
 * What became of a store's thermocouples in a scan, each counted once:
 * thermocouples = used + rejected + left_out + missing.
 */
export interface ThermocoupleCounts {
  readonly thermocouples: number;
  /** Taken in; where a profile is drawn anew, also what was read in the minutes before. */
  readonly used: number;
  /** Out of use by a verdict. Those of a `group_fault` are used on and count as used. */
  readonly rejected: number;
  /** Read, without a verdict, and yet not taken in: not settled, or in doubt for now. */
  readonly left_out: number;
  /** Without a verdict and without a reading. */
  readonly missing: number;
}

/** What a scan brought and what of it was not used, for those who run the plant's instruments. */
export interface ScanCounts {
  readonly stores: Readonly<Record<string, ThermocoupleCounts>>;
  /**
   * Running mean, by store, of the innovations' squares over what was expected, 1 = as expected: the
   * mean over its tubes. Far above 1 the rock is not as the configuration says.
   */
  readonly surprise: Readonly<Record<string, number>>;
  /** Readings of other channels that no plant produces; while there is one the quality is no `good`. */
  readonly implausible: readonly ImplausibleReading[];
  /** Mode as told and flow as metered contradict each other, now; scans in which they did so far. */
  readonly mode_disagrees: boolean;
  readonly mode_disagreements: number;
}

/** Counts a store's thermocouples after a scan was taken in; `values` in the order of the channels. */
export function countThermocouples(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
): ThermocoupleCounts {
  let thermocouples = 0;
  let rejected = 0;
  let read = 0;
  model.channels.forEach((row, k) => {
    row.forEach((at, s) => {
      const verdict = state.sensors[k]?.[s]?.verdict ?? null;
      thermocouples++;
      if (verdict !== null && verdict !== 'group_fault') rejected++;
      else if (Number.isFinite(values[at])) read++;
    });
  });
  // A start may use what one with a verdict read just before it.
  const used = Math.min(state.used, thermocouples - rejected);
  const left_out = Math.max(0, read - used);
  return {
    thermocouples,
    used,
    rejected,
    left_out,
    missing: thermocouples - used - rejected - left_out,
  };
}
