import type { Quality, RejectedSensor } from '../estimate.js';
import type { CauseView } from '../watch/causes.js';
import type { CycleRecord } from '../watch/cycleRecord.js';
import type { WatchEvent } from '../watch/event.js';
import type { IndicatorView } from '../watch/indicator.js';

/** One point of the thinned series that the report draws. */
export interface ReportPoint {
  readonly time: string;
  readonly state_of_charge: number | null;
  readonly power_MW_el: number | null;
  /** By store id. */
  readonly stores: Readonly<Record<string, ReportStorePoint>>;
}

export interface ReportStorePoint {
  readonly soc: number | null;
  readonly width_m: number | null;
  readonly spread_ratio: number | null;
  readonly heat_transfer_factor: number | null;
  /** By string id. */
  readonly flow_factors: Readonly<Record<string, number | null>>;
}

/** Temperatures along a store at a chosen time. */
export interface ReportProfile {
  readonly time: string;
  /** What the unit did: the end of a charge, of a rest, of a discharge. */
  readonly words: string;
  readonly stores: Readonly<
    Record<
      string,
      {
        readonly x_m: readonly number[];
        readonly mean_K: readonly number[];
        readonly readings: readonly {
          readonly id: string;
          readonly string: string;
          readonly position_m: number;
          readonly value_K: number | null;
          readonly rejected: boolean;
        }[];
      }
    >
  >;
}

/** What a thermocouple did over the span. */
export interface ReportSensor {
  readonly id: string;
  readonly store: string;
  readonly string: string;
  readonly position_m: number;
  readonly group: string | null;
  /** Verdict at the end of the span, null = believed. */
  readonly now: RejectedSensor | null;
  /** Verdicts that began within the span. */
  readonly verdicts: readonly {
    readonly from: string;
    readonly until: string | null;
    readonly message: string;
  }[];
}

/** What is known of the scans in the span, by the estimates that are still kept of it. */
export interface ReportReadings {
  readonly scans: number;
  /** Before this time only one estimate in so many seconds is kept; null: all are. */
  readonly thinned_before: string | null;
  readonly thinned_to_s: number;
  /** Scans by quality. */
  readonly quality: Readonly<Record<Quality, number>>;
  /** Longest time without a scan [h], and hours without one beyond the scan period in sum. */
  readonly longest_gap_h: number;
  readonly missing_h: number;
}

/** How the alarms behaved, by the figures of ISA-18.2; null where they are not kept. */
export interface ReportAlarmFigures {
  readonly annunciated: number;
  readonly per_day: number;
  readonly most_in_10_min: number;
  /** Stretches of more alarms than a person can answer, by the standard's measure. */
  readonly floods: number;
  readonly share_in_flood: number;
  readonly chattering: readonly string[];
  readonly most_frequent: readonly { readonly id: string; readonly count: number }[];
}

/** All that a report is made of: gathered once, for HTML, JSON and CSV alike. Numbers are finite or null. */
export interface ReportData {
  readonly site: string;
  readonly unit: string;
  readonly unit_name: string;
  readonly version: string;
  /** Span asked for, and when the report was made; ISO 8601 UTC. */
  readonly from: string;
  readonly to: string;
  readonly made: string;
  readonly rated: { readonly power_MW_el: number; readonly hours: number };
  readonly stores: readonly {
    readonly id: string;
    readonly kind: 'hot' | 'cold';
    readonly length_m: number;
    readonly reference_hot_K: number;
    readonly reference_cold_K: number;
    readonly strings: readonly string[];
  }[];
  readonly readings: ReportReadings;
  readonly series: readonly ReportPoint[];
  /** Runs that ended in the span, so that each belongs to one span only; some began before it. */
  readonly cycles: readonly CycleRecord[];
  readonly profiles: readonly ReportProfile[];
  readonly sensors: readonly ReportSensor[];
  /** Newest within the span. */
  readonly indicators: readonly IndicatorView[];
  readonly causes: readonly CauseView[];
  /** Oldest first; of too many the newest. */
  readonly events: readonly WatchEvent[];
  readonly older_events_left_out: boolean;
  /** What stood degraded at the beginning of the span, by kind and subject. */
  readonly degraded_at_start: readonly Pick<IndicatorView, 'kind' | 'subject'>[];
  readonly alarms: ReportAlarmFigures | null;
}
