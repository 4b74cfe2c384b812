import type { Mode } from '../definitions.js';
import type { IndicatorView } from './indicator.js';

/** Width at a fixed place, so that runs can be compared: where the front passed it in this run. */
export interface WidthAtPlace {
  /** Energy-equivalent position at which it was taken [m]: 25, 50 and 75 % of the length, where passed. */
  readonly place_m: number;
  /** The same as a share of the length. */
  readonly share: number;
  readonly width_m: number | null;
  readonly width_sigma_m: number | null;
  readonly spread_ratio: number | null;
}

export interface StoreRun {
  readonly soc_from: number;
  readonly soc_to: number;
  /** Both by the heat capacity as it was known at the end, so that what is learned of it is no loss. */
  readonly stored_from_MWh_th: number;
  readonly stored_to_MWh_th: number;
  /** Sigma of the stored heat at the end. */
  readonly stored_sigma_MWh_th: number;
  /**
   * Heat or cold that the gas brought (charging, > 0) or took (discharging, < 0), by the meter and the gas
   * temperatures, as measured, else as estimated; null without flow.
   */
  readonly carried_MWh_th: number | null;
  /** Brought less stored: what went through the wall and ends; of a stand what was lost. */
  readonly lost_MWh_th: number | null;
  /** Of a stand, at most: errors of readings in both states of charge, and what changed of the lasting ones. */
  readonly lost_sigma_MWh_th: number | null;
  readonly widths: readonly WidthAtPlace[];
  /** Of the gas that left while it ran, at first and at last; null while standing. */
  readonly outlet_from_K: number | null;
  readonly outlet_to_K: number | null;
  /** Of all rock, as estimated. */
  readonly hottest_K: number | null;
  readonly coldest_K: number | null;
  readonly heat_transfer_factor: number;
  readonly heat_transfer_factor_sigma: number;
  /** By string id. */
  readonly flow_factors: Readonly<Record<string, number>>;
  readonly thermocouples_rejected: number;
}

/** What a round trip went over: from a moment of the same state of charge to the end of the run. */
export interface RoundTripOver {
  readonly from: string;
  readonly drawn_MWh_el: number;
  readonly delivered_MWh_el: number;
  /** State of charge at the end less that at the beginning, by store: what differs in spite of an equal mean. */
  readonly soc_left: Readonly<Record<string, number>>;
}

/** When a discharge was to end, as it was told at its begin: what was promised, beside `to`. */
export interface ToldRunEnd {
  readonly made: string;
  /** The power that it was told for; where the power changed for good, moved to the newest. */
  readonly power_MW_el: number;
  /** By p50, and by p90: not before, with 90 % probability. */
  readonly end: string;
  readonly firm_end: string;
}

/**
 * One charge, stand or discharge of a unit, once it is over. Records follow each other without gap or
 * overlap, but where a day brought no reading. Numbers are finite or null.
 */
export interface CycleRecord {
  readonly unit: string;
  /** Counts up within the unit, since the estimator was started afresh. */
  readonly no: number;
  readonly kind: Mode;
  /** ISO 8601 UTC, source time; an edge lies half-way between the two scans about it. */
  readonly from: string;
  readonly to: string;
  /** Why it may be less than it looks: gap in the readings, unknown flow, begun before the record. */
  readonly incomplete: readonly ('began_before' | 'gap' | 'flow_unknown' | 'power_unknown')[];
  /** Time that it ran, or stood, itself: without pauses [h]. */
  readonly running_h: number;
  /** Net, both counted positive; auxiliaries of a stand count as drawn. null where power was not read. */
  readonly drawn_MWh_el: number | null;
  readonly delivered_MWh_el: number | null;
  readonly power_most_MW_el: number | null;
  /** While it ran; null of a stand. */
  readonly flow_mean_kg_s: number | null;
  /** Of the unit. */
  readonly soc_from: number | null;
  readonly soc_to: number | null;
  readonly ambient_mean_K: number;
  readonly stores: Readonly<Record<string, StoreRun>>;
  /** Ids of alarms and alerts raised within it. */
  readonly raised: readonly string[];
  /** Of a discharge; null where it was too short, or the estimate no guide. */
  readonly told: ToldRunEnd | null;
  /** Delivered over drawn since the stores were last as full, see cycle/moments.ts; of a discharge that closes one. */
  readonly round_trip: number | null;
  readonly round_trip_over: RoundTripOver | null;
  /** As they stood when it was known to be over. */
  readonly indicators: readonly IndicatorView[];
}
