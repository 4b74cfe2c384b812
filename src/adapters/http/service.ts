import type { LeftOutUnit } from '../../config/site.js';
import type { AlarmCommand, CommandFault } from '../../core/alarm/command.js';
import type { AlarmEntry, RecordedTransition } from '../../core/alarm/entry.js';
import type { AlarmReport } from '../../core/alarm/report.js';
import type { Mode, UnitDefinition } from '../../core/definitions.js';
import type { DispatchAnswer, Estimate, ProfileView } from '../../core/estimate.js';
import type { PlanAnswer, PlanQuestion } from '../../core/plan/ask.js';
import type { Headroom } from '../../core/plan/headroom.js';
import type { OffersAsk } from '../../core/plan/offerAsk.js';
import type { OfferReport } from '../../core/plan/offerReport.js';
import type { KeptOffers } from '../../core/plan/offerSummary.js';
import type { AnsweredOffers } from '../../core/plan/offerTable.js';
import type { RewindRecord } from '../../core/scan/rewindRecord.js';
import type { ScanCounts } from '../../core/scanCounts.js';
import type { WatchView } from '../../core/watch/causes.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import type { WatchEvent } from '../../core/watch/event.js';
import type { UnitWorth } from '../../core/worth/unitWorth.js';
import type { ErrorCode } from '../../errors.js';
import type { ScanTimes } from './scanTimes.js';

/** What became of a command about an alarm; `entry` is null where it has left the list by it. */
export type AlarmAnswer =
  | { readonly accepted: true; readonly command: AlarmCommand; readonly entry: AlarmEntry | null }
  | { readonly accepted: false; readonly fault: CommandFault };

/** What became of a unit that was to be put back to a backup. */
export type RestoreAnswer =
  | {
      readonly accepted: true;
      readonly record: RewindRecord;
      /** The unit's definition is of the same shape as then; else it was carried over. */
      readonly same_shape: boolean;
      /** The journal had every reading since. */
      readonly reaches: boolean;
      readonly anew: readonly string[];
      readonly lost: readonly string[];
    }
  | { readonly accepted: false; readonly is: 'unusable' | 'busy'; readonly fault: string };

/** A maintenance report that is asked for. */
export interface ReportQuestion {
  readonly from_ms: number;
  readonly to_ms: number;
  readonly format: 'html' | 'json' | 'csv';
  /** Of csv. */
  readonly table: 'runs' | 'findings' | 'indicators' | 'thermocouples' | 'events';
}

export interface UnitNow {
  readonly unit: UnitDefinition;
  readonly estimate: Estimate | null;
  readonly profile: ProfileView | null;
  readonly dispatch: { readonly time: string; readonly answers: readonly DispatchAnswer[] } | null;
  /** Age of the newest reading against the wall clock [s], null before the first. */
  readonly age_s: number | null;
  readonly stale: boolean;
  /** What of the newest scan was used and what not; null or absent before the first. */
  readonly counts?: ScanCounts | null;
  readonly flow_kg_s: number | null;
  readonly power_MW_el: number | null;
  /** What it can still take, as last worked out in this process; null or absent before. */
  readonly headroom?: { readonly time: string; readonly answers: readonly Headroom[] } | null;
}

export interface HealthPart {
  readonly name: string;
  readonly ok: boolean;
  readonly detail: string;
}

export interface HistoryPoint {
  readonly time: string;
  readonly [series: string]: number | string | null;
}

/** Stored series over a span of time. */
export interface StoredHistory {
  readonly points: readonly HistoryPoint[];
  /** Length of the stretches that a point stands for [ms]; null: points are rows as stored. */
  readonly bucket_ms: number | null;
}

/** A stored profile, with the estimate nearest in time and what was measured then. */
export interface StoredMoment {
  readonly profile: ProfileView;
  readonly estimate: Estimate | null;
  readonly flow_kg_s: number | null;
  readonly power_MW_el: number | null;
}

/** What is stored at intervals over a span of time, oldest first. */
export interface Spread<T> {
  readonly rows: readonly T[];
  /** More are stored than these. */
  readonly thinned: boolean;
  /** Usual spacing of what is given [ms]. */
  readonly every_ms: number;
}

export type ServiceMessage =
  | { readonly kind: 'state'; readonly unit: string }
  /** The list of alarms is another one, without an event. */
  | { readonly kind: 'alarms'; readonly unit: string }
  | { readonly kind: 'event'; readonly unit: string; readonly event: WatchEvent };

/** What the daemon offers to the HTTP adapter; the adapter knows nothing else of the daemon. */
export interface PlantService {
  readonly siteName: string;
  readonly version: string;
  unitIds(): string[];
  /** Units that are not run, as their configuration has faults; absent: none. */
  leftOut?(): readonly LeftOutUnit[];
  /** How late scans are; absent where no scans are taken in. */
  readonly scanTimes?: ScanTimes;
  /** What waits: for the estimator (`pipeline`), for the database, for each webhook, by name. */
  backlogs(): Readonly<Record<string, number>>;
  /** undefined for an unknown unit. */
  now(unit: string): UnitNow | undefined;
  hours(
    unit: string,
    powers_MW: readonly number[],
  ): Promise<{ time: string; answers: DispatchAnswer[] }>;
  /** What lies ahead of the present state, with the time of the estimate it stands on. */
  plan(unit: string, question: PlanQuestion): Promise<{ time: string; answer: PlanAnswer }>;
  /** Keeps an offer table as it was answered, for good; gives its number. */
  keepOffers(unit: string, asked_ms: number, asked: OffersAsk, answer: AnsweredOffers): number;
  /** Kept tables by the time of asking, newest first. */
  keptOffers(unit: string, from_ms: number, to_ms: number, most: number): KeptOffers[];
  /** A kept table as it was answered; null where there is none of this number. */
  answeredOffers(unit: string, no: number): AnsweredOffers | null;
  /** Kept offers asked between two times against what was then delivered. */
  offerReport(unit: string, from_ms: number, to_ms: number): Promise<OfferReport>;
  /**
   * What thermocouples are worth over the hours ahead of the present state, or over a settled day.
   * null before every store has started.
   */
  sensors(unit: string, over: 'now' | 'day'): Promise<UnitWorth | null>;
  /**
   * At most `points` points of the series named. Of more rows a point per stretch: numbers as means
   * with `NAME.min` and `NAME.max`, words as the last.
   */
  history(
    unit: string,
    from_ms: number,
    to_ms: number,
    points: number,
    names: readonly string[],
  ): StoredHistory;
  /** Names of series that there are, extremes among them. */
  historySeries(unit: string): string[];
  /** The stored profile at or before a time; null where there is none. */
  momentAt(unit: string, time_ms: number): StoredMoment | null;
  /** At most `points` stored profiles of a span. */
  moments(unit: string, from_ms: number, to_ms: number, points: number): Spread<StoredMoment>;
  /** At most `points` of what indicators showed in a span. */
  watchHistory(unit: string, from_ms: number, to_ms: number, points: number): Spread<WatchView>;
  /** What the indicators of the newest scan show; null before the first. */
  watch(unit: string): WatchView | null;
  /** Runs that lie in a span or reach into it, the newest `most` of them, oldest first. */
  cycles(
    unit: string,
    from_ms: number,
    to_ms: number,
    kind: Mode | undefined,
    most: number,
  ): CycleRecord[];
  /** Rewinds whose scans lie in a span or reach into it, newest first, at most `most`. */
  rewinds(unit: string, from_ms: number, to_ms: number, most: number): RewindRecord[];
  /** The report as text, and the hash of its style for the policy of the browser. */
  bedReport(unit: string, question: ReportQuestion): Promise<{ text: string; style: string }>;
  /** Alarms and alerts that are shown, and those held back: shelved, suppressed, out of service. */
  standing(unit?: string): AlarmEntry[];
  heldBack(unit?: string): AlarmEntry[];
  /** Longest time for which one may be shelved [h]. */
  readonly shelveMost_h: number;
  events(unit: string | undefined, from_ms: number, to_ms: number, most: number): WatchEvent[];
  /** Follows a command about an alarm, as it came, or says what is wrong with it. */
  commandAlarm(command: unknown): AlarmAnswer;
  alarmReport(unit: string | undefined, from_ms: number, to_ms: number): AlarmReport;
  /** Newest first. */
  alarmTransitions(
    of: { readonly unit?: string | undefined; readonly id?: string | undefined },
    from_ms: number,
    to_ms: number,
    most: number,
  ): RecordedTransition[];
  /** The whole state of a unit as a file; null before its first scan. */
  backup(unit: string): Uint8Array | null;
  restore(unit: string, file: Uint8Array, who: string): Promise<RestoreAnswer>;
  health(): HealthPart[];
  /** Why it cannot do its work yet, or not now; empty where it can. */
  unready(): string[];
  /** Counters by name: messages in, malformed, late, repeated, ... */
  counters(): Record<string, number>;
  /** Failures that the daemon went on from, by code. */
  errors(): Record<ErrorCode, number>;
  /** Returns the function that ends the subscription. */
  subscribe(listener: (message: ServiceMessage) => void): () => void;
}
