import type { History } from '../adapters/history/history.js';
import type { ScanTimes } from '../adapters/http/scanTimes.js';
import type {
  AlarmAnswer,
  HealthPart,
  PlantService,
  ReportQuestion,
  RestoreAnswer,
  ServiceMessage,
  Spread,
  StoredHistory,
  StoredMoment,
  UnitNow,
} from '../adapters/http/service.js';
import type { LeftOutUnit, StoreConfig } from '../config/site.js';
import type { AlarmEntry, RecordedTransition } from '../core/alarm/entry.js';
import type { AlarmReport } from '../core/alarm/report.js';
import type { Mode } from '../core/definitions.js';
import type { DispatchAnswer, ProfileView } from '../core/estimate.js';
import type { PlanAnswer, PlanQuestion } from '../core/plan/ask.js';
import type { OffersAsk } from '../core/plan/offerAsk.js';
import type { OfferReport } from '../core/plan/offerReport.js';
import type { KeptOffers } from '../core/plan/offerSummary.js';
import type { AnsweredOffers } from '../core/plan/offerTable.js';
import type { RewindRecord } from '../core/scan/rewindRecord.js';
import type { WatchView } from '../core/watch/causes.js';
import type { CycleRecord } from '../core/watch/cycleRecord.js';
import type { WatchEvent } from '../core/watch/event.js';
import type { UnitWorth } from '../core/worth/unitWorth.js';
import type { ErrorCode } from '../errors.js';
import type { AlarmPart } from './alarmPart.js';
import type { Backups } from './backups.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import { reportOffers } from './offerReports.js';
import type { Questions } from './questions.js';
import type { UnitRunner } from './unitRunner.js';

/** An offer table as it was answered and kept. */
export interface KeptTable {
  readonly no: number;
  readonly asked_ms: number;
  readonly answer: AnsweredOffers;
}

export interface PlantServiceParts {
  readonly siteName: string;
  readonly version: string;
  readonly runners: ReadonlyMap<string, UnitRunner>;
  readonly history: History;
  readonly store: StoreConfig;
  readonly leftOut?: readonly LeftOutUnit[];
  readonly questions: Questions;
  readonly counters: Counters;
  readonly alarms: AlarmPart;
  readonly clock: DaemonClock;
  readonly scanTimes: ScanTimes;
  readonly backups: Backups;
  health(): HealthPart[];
  unready(): string[];
  backlogs(): Record<string, number>;
  /** An offer table has been kept. */
  kept(unit: string, table: KeptTable): void;
}

/** An estimate further off than this is of another moment than the profile [ms]. */
const NEAR_MS = 900_000;

/** What the daemon offers to pages and programs; it reads, but for what is done to alarms. */
export class DaemonService implements PlantService {
  private readonly listeners = new Set<(message: ServiceMessage) => void>();

  constructor(private readonly parts: PlantServiceParts) {}

  get siteName(): string {
    return this.parts.siteName;
  }

  get version(): string {
    return this.parts.version;
  }

  get scanTimes(): ScanTimes {
    return this.parts.scanTimes;
  }

  backlogs(): Record<string, number> {
    return this.parts.backlogs();
  }

  unitIds(): string[] {
    return [...this.parts.runners.keys()];
  }

  leftOut(): readonly LeftOutUnit[] {
    return this.parts.leftOut ?? [];
  }

  now(id: string): UnitNow | undefined {
    const runner = this.parts.runners.get(id);
    if (!runner) return undefined;
    const { unit, view, newest_ms } = runner;
    const age_s =
      newest_ms === null ? null : Math.max(0, (this.parts.clock.now() - newest_ms) / 1000);
    const isOld = age_s !== null && age_s > unit.watch.data_age_s.limit;
    const { estimate, profile, dispatch, measured, counts, headroom } = view;
    const stale = isOld || estimate?.quality === 'stale';
    return { unit, estimate, profile, dispatch, headroom, age_s, stale, counts, ...measured };
  }

  async hours(
    id: string,
    powers_MW: readonly number[],
  ): Promise<{ time: string; answers: DispatchAnswer[] }> {
    const runner = this.runner(id);
    const time = runner.view.estimate?.time;
    if (time === undefined) throw new RangeError(`unit ${id} must have an estimate, got none yet`);
    this.parts.counters.add('questions');
    const snapshot = runner.snapshot();
    const powers_W = powers_MW.map((power) => power * 1e6);
    return { time, answers: await this.parts.questions.hours(runner.unit, snapshot, powers_W) };
  }

  async plan(id: string, question: PlanQuestion): Promise<{ time: string; answer: PlanAnswer }> {
    const runner = this.runner(id);
    const time = runner.view.estimate?.time;
    if (time === undefined) throw new RangeError(`unit ${id} must have an estimate, got none yet`);
    this.parts.counters.add('questions');
    const answer = await this.parts.questions.plan(runner.unit, runner.snapshot(), question);
    return { time, answer };
  }

  keepOffers(id: string, asked_ms: number, asked: OffersAsk, answer: AnsweredOffers): number {
    const time_ms = Date.parse(String(answer.time));
    const { unit } = this.runner(id);
    const no = this.parts.history.offers.add(unit.id, asked_ms, time_ms, asked, answer);
    this.parts.counters.add('offers_kept');
    this.parts.kept(unit.id, { no, asked_ms, answer });
    return no;
  }

  keptOffers(id: string, from_ms: number, to_ms: number, most: number): KeptOffers[] {
    return this.parts.history.offers.between(this.runner(id).unit.id, from_ms, to_ms, most);
  }

  /** The table kept last; null where none has been. */
  newestKept(id: string): KeptTable | null {
    const [newest] = this.keptOffers(id, 0, Number.MAX_SAFE_INTEGER, 1);
    const answer = newest === undefined ? null : this.answeredOffers(id, newest.no);
    if (newest === undefined || answer === null) return null;
    return { no: newest.no, asked_ms: newest.asked_ms, answer };
  }

  answeredOffers(id: string, no: number): AnsweredOffers | null {
    return this.parts.history.offers.answer(this.runner(id).unit.id, no);
  }

  async offerReport(id: string, from_ms: number, to_ms: number): Promise<OfferReport> {
    return reportOffers(this.parts.history, this.runner(id).unit, from_ms, to_ms);
  }

  async sensors(id: string, over: 'now' | 'day'): Promise<UnitWorth | null> {
    const runner = this.runner(id);
    this.parts.counters.add('questions');
    return this.parts.questions.sensors(runner.unit, over === 'day' ? null : runner.snapshot());
  }

  history(...[unit, ...ask]: Parameters<PlantService['history']>): StoredHistory {
    this.runner(unit);
    return this.parts.history.estimates.series(unit, ...ask);
  }

  momentAt(unit: string, time_ms: number): StoredMoment | null {
    this.runner(unit);
    const profile = this.parts.history.profiles.atOrBefore(unit, time_ms);
    return profile && this.moment(profile);
  }

  moments(...[unit, ...ask]: Parameters<PlantService['moments']>): Spread<StoredMoment> {
    this.runner(unit);
    const chosen = this.parts.history.profiles.spread(unit, ...ask);
    return { ...chosen, rows: chosen.rows.map((profile) => this.moment(profile)) };
  }

  watchHistory(...[unit, ...ask]: Parameters<PlantService['watchHistory']>): Spread<WatchView> {
    this.runner(unit);
    return this.parts.history.watch.spread(unit, ...ask);
  }

  private moment(profile: ProfileView): StoredMoment {
    const { estimates } = this.parts.history;
    const then = estimates.near(profile.unit, Date.parse(profile.time), NEAR_MS);
    return { profile, ...(then ?? { estimate: null, flow_kg_s: null, power_MW_el: null }) };
  }

  historySeries(unit: string): string[] {
    return this.parts.history.estimates.names(this.runner(unit).unit);
  }

  watch(unit: string): WatchView | null {
    return this.runner(unit).view.watch;
  }

  cycles(
    unit: string,
    from_ms: number,
    to_ms: number,
    kind: Mode | undefined,
    most: number,
  ): CycleRecord[] {
    this.runner(unit);
    return this.parts.history.cycles.between(unit, from_ms, to_ms, kind, most);
  }

  rewinds(...[unit, ...ask]: Parameters<PlantService['rewinds']>): RewindRecord[] {
    this.runner(unit);
    return this.parts.history.rewinds.between(unit, ...ask);
  }

  async bedReport(id: string, question: ReportQuestion): Promise<{ text: string; style: string }> {
    const { unit } = this.runner(id);
    this.parts.counters.add('questions');
    const { version, siteName, questions, store, clock, history } = this.parts;
    const made_ms = Math.floor(clock.now());
    const ask = { ...question, version, site: siteName, made_ms, store };
    try {
      return await questions.report(unit, ask);
    } catch (thrown) {
      // It reads the file beside the daemon: damage is acted on here.
      if (!history.mend(thrown)) throw thrown;
      return questions.report(unit, ask);
    }
  }

  get shelveMost_h(): number {
    return this.parts.alarms.shelveMost_h;
  }

  standing(unit?: string): AlarmEntry[] {
    return this.parts.alarms.shown(unit);
  }

  heldBack(unit?: string): AlarmEntry[] {
    return this.parts.alarms.heldBack(unit);
  }

  events(unit: string | undefined, from_ms: number, to_ms: number, most: number): WatchEvent[] {
    return this.parts.history.events.between(unit, from_ms, to_ms, most);
  }

  commandAlarm(command: unknown): AlarmAnswer {
    return this.parts.alarms.command(command);
  }

  alarmReport(unit: string | undefined, from_ms: number, to_ms: number): AlarmReport {
    return this.parts.alarms.report(unit, from_ms, to_ms);
  }

  alarmTransitions(
    ...[of, from_ms, to_ms, most]: Parameters<PlantService['alarmTransitions']>
  ): RecordedTransition[] {
    return this.parts.history.alarms.transitions(of, from_ms, to_ms, most);
  }

  backup(unit: string): Uint8Array | null {
    return this.parts.backups.make(this.runner(unit));
  }

  restore(unit: string, file: Uint8Array, who: string): Promise<RestoreAnswer> {
    return this.parts.backups.restore(this.runner(unit), file, who);
  }

  health(): HealthPart[] {
    return this.parts.health();
  }

  unready(): string[] {
    return this.parts.unready();
  }

  counters(): Record<string, number> {
    return this.parts.counters.all();
  }

  errors(): Record<ErrorCode, number> {
    return this.parts.counters.errors();
  }

  subscribe(listener: (message: ServiceMessage) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  tell(message: ServiceMessage): void {
    for (const listener of this.listeners) listener(message);
  }

  private runner(id: string): UnitRunner {
    const runner = this.parts.runners.get(id);
    if (!runner) throw new RangeError(`unit must be one of ${this.unitIds()}, got ${id}`);
    return runner;
  }
}
