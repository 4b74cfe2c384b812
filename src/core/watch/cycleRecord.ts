import type { Mode } from '../definitions.js';
import type { IndicatorView } from './indicator.js';

/** Width at a fixed place, so that runs can be compared: where the front passed it in this run. */
export interface WidthAtPlace {
  /** Energy-equivalent position at which it was taken [m]. */
  readonly place_m: number;
  readonly width_m: number | null;
  readonly width_sigma_m: number | null;
  readonly spread_ratio: number | null;
}

export interface StoreRun {
  readonly soc_from: number;
  readonly soc_to: number;
  readonly stored_from_MWh_th: number;
  readonly stored_to_MWh_th: number;
  /** Sigma of the stored heat at the end. */
  readonly stored_sigma_MWh_th: number;
  /** Heat or cold that the gas brought (charging, > 0) or took (discharging, < 0), by the meter; null without flow. */
  readonly carried_MWh_th: number | null;
  /** Brought less stored: what went through the wall and ends; of a stand what was lost. */
  readonly lost_MWh_th: number | null;
  readonly widths: readonly WidthAtPlace[];
  /** Of the gas that left; null while standing. */
  readonly outlet_from_K: number | null;
  readonly outlet_to_K: number | null;
  readonly hottest_K: number | null;
  readonly coldest_K: number | null;
  readonly heat_transfer_factor: number;
  readonly heat_transfer_factor_sigma: number;
  /** By string id. */
  readonly flow_factors: Readonly<Record<string, number>>;
  readonly thermocouples_rejected: number;
}

/** One charge, stand or discharge of a unit, once it is over. Numbers are finite or null. */
export interface CycleRecord {
  readonly unit: string;
  /** Counts up within the unit. */
  readonly no: number;
  readonly kind: Mode;
  /** ISO 8601 UTC, source time. */
  readonly from: string;
  readonly to: string;
  /** Why it may be less than it looks: gap in the readings, unknown flow, begun before the record. */
  readonly incomplete: readonly ('began_before' | 'gap' | 'flow_unknown' | 'power_unknown')[];
  /** Net, both counted positive; auxiliaries of a stand count as drawn. null where power was not read. */
  readonly drawn_MWh_el: number | null;
  readonly delivered_MWh_el: number | null;
  readonly power_most_MW_el: number | null;
  readonly flow_mean_kg_s: number | null;
  /** Of the unit. */
  readonly soc_from: number | null;
  readonly soc_to: number | null;
  readonly ambient_mean_K: number;
  readonly stores: Readonly<Record<string, StoreRun>>;
  /** Ids of alarms and alerts raised within it. */
  readonly raised: readonly string[];
  /** Delivered over drawn since the last time that the unit was as empty; with a discharge that closes one. */
  readonly round_trip: number | null;
  /** As they stood at its end. */
  readonly indicators: readonly IndicatorView[];
}
