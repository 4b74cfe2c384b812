import type {
  AlarmAnswer,
  HealthPart,
  HistoryPoint,
  PlantService,
  ReportQuestion,
  RestoreAnswer,
  ServiceMessage,
  Spread,
  StoredHistory,
  StoredMoment,
  UnitNow,
} from '../../../src/adapters/http/service.js';
import { STYLE_HASH } from '../../../src/adapters/report/style.js';
import { inputOf, isFault, readCommand } from '../../../src/core/alarm/command.js';
import {
  type AlarmEntry,
  entryOf,
  type RecordedTransition,
} from '../../../src/core/alarm/entry.js';
import { type AlarmReport, alarmReport } from '../../../src/core/alarm/report.js';
import { type AlarmState, isHeldBack, NORMAL } from '../../../src/core/alarm/state.js';
import { type AlarmInput, type AlarmStep, stepAlarm } from '../../../src/core/alarm/step.js';
import type { Mode, UnitDefinition } from '../../../src/core/definitions.js';
import type {
  DispatchAnswer,
  Estimate,
  ProfileView,
  StoreEstimate,
} from '../../../src/core/estimate.js';
import type { PlanQuestion } from '../../../src/core/plan/ask.js';
import type { Headroom } from '../../../src/core/plan/headroom.js';
import type { OffersAsk } from '../../../src/core/plan/offerAsk.js';
import { type OfferReport, offerReport } from '../../../src/core/plan/offerReport.js';
import { type KeptOffers, summaryOf } from '../../../src/core/plan/offerSummary.js';
import type { AnsweredOffers } from '../../../src/core/plan/offerTable.js';
import type { RewindRecord } from '../../../src/core/scan/rewindRecord.js';
import type { ScanCounts } from '../../../src/core/scanCounts.js';
import type { WatchView } from '../../../src/core/watch/causes.js';
import type { CycleRecord } from '../../../src/core/watch/cycleRecord.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import type { UnitWorth } from '../../../src/core/worth/unitWorth.js';
import { ERRORS, type ErrorCode } from '../../../src/errors.js';
import { COLD, HOT, unitOf } from './scriptedDefinitions.js';
import { scriptedOffers } from './scriptedOffers.js';
import { scriptedSchedule } from './scriptedSchedule.js';
import { marchedSchedule, scriptedCapability } from './scriptedTrade.js';

const START_MS = Date.UTC(2026, 0, 31, 6);

/** Error function, Abramowitz & Stegun 7.1.26, absolute error below 1.5e-7. */
function erf(x: number): number {
  const t = 1 / (1 + 0.3275911 * Math.abs(x));
  const series =
    ((((1.061405429 * t - 1.453152027) * t + 1.421413741) * t - 0.284496736) * t + 0.254829592) * t;
  return Math.sign(x) * (1 - series * Math.exp(-x * x));
}

/** What the script of a unit says of one moment. */
interface Moment {
  charged: number;
  mode: 'charge' | 'discharge' | 'stand';
}

/** Worths that only have the right shape: the further from the middle, the more precious. */
function worthOf(unit: UnitDefinition, over: 'now' | 'day', mode: Mode): UnitWorth {
  const spread = (factor: number) => ({
    soc_sigma_rms: 0.002 * factor,
    soc_sigma_worst: 0.003 * factor,
    position_sigma_rms_m: 0.02 * factor,
    position_sigma_worst_m: null,
  });
  const changed = (rise: number) => ({
    ...{ store: spread(1 + rise), string: spread(1 + 2 * rise) },
    ...{ rise, most_in: rise > 0 ? ('charge' as const) : null },
  });
  return {
    unit: unit.id,
    over:
      over === 'day'
        ? { kind: 'day', charge_h: 7, discharge_h: 6, stand_h: 11 }
        : { kind: 'now', mode, hours: 5 },
    full_hours: 6,
    rejected: [],
    stores: unit.stores.map((store) => ({
      store: store.id,
      all: spread(1),
      sensors: store.strings.flatMap((string) =>
        string.thermocouples.map(({ id, position_m, group }) => ({
          ...{ id, string_id: string.id, position_m, group, in_use: true },
          ...changed(0.01 * Math.abs(position_m / store.bed.length_m - 0.5)),
        })),
      ),
      groups: [],
      strings: store.strings.map(({ id, radius_m, thermocouples }) => ({
        ...{ id, radius_m, thermocouples: thermocouples.length, all: spread(0.7), ...changed(1) },
        one_more: over === 'day' ? [{ position_m: 1, ...changed(-0.01) }] : [],
      })),
    })),
  };
}

function within<T>(
  stored: readonly T[],
  timeOf: (one: T) => string,
  from_ms: number,
  to_ms: number,
  points: number,
): Spread<T> {
  const found = stored.filter((one) => {
    const time_ms = Date.parse(timeOf(one));
    return time_ms >= from_ms && time_ms <= to_ms;
  });
  const thinned = found.length > points;
  return { rows: found.slice(-points), thinned, every_ms: 600_000 };
}

/**
 * A plant that moves by a script instead of by physics: fronts are error functions that travel with
 * the charge. Everything else of PlantService is kept in memory. `step()` is one scan.
 */
export class ScriptedPlant implements PlantService {
  siteName = 'Test site';
  readonly version = '0.1.0-test';
  readonly units: UnitDefinition[];
  readonly parts: HealthPart[] = [
    { name: 'journal', ok: true, detail: 'writing' },
    { name: 'database', ok: true, detail: 'reachable' },
  ];
  readonly count: Record<string, number> = { 'mqtt.messages': 1200, 'mqtt.late-messages': 3 };
  readonly acknowledged: { id: string; who: string }[] = [];
  /** Age of the newest reading [s], set by the test. */
  age_s: number | null = 4;
  stale = false;
  counts: ScanCounts | null = null;
  /** false: no scan has come yet. */
  started = true;
  moment: Moment = { charged: 0.62, mode: 'discharge' };
  scans = 0;
  failHours: Error | null = null;
  shelveMost_h = 8;
  private readonly alarms = new Map<string, { event: WatchEvent; alarm: AlarmState }>();
  private readonly past: WatchEvent[] = [];
  private readonly transitions: RecordedTransition[] = [];
  private readonly listeners = new Set<(message: ServiceMessage) => void>();

  constructor(units: UnitDefinition[] = [unitOf('north', 'North unit', [HOT, COLD])]) {
    this.units = units;
  }

  get listening(): number {
    return this.listeners.size;
  }

  backlogs(): Record<string, number> {
    return { pipeline: 0, influxdb: 12 };
  }

  unitIds(): string[] {
    return this.units.map((unit) => unit.id);
  }

  /** Source time of the newest scan. */
  time(scans = this.scans): string {
    return new Date(START_MS + scans * 30_000).toISOString();
  }

  step(change = this.moment.mode === 'charge' ? 0.004 : -0.004): void {
    this.scans += 1;
    const charged =
      this.moment.mode === 'stand' ? this.moment.charged : this.moment.charged + change;
    this.moment = { ...this.moment, charged: Math.min(0.98, Math.max(0.02, charged)) };
    for (const unit of this.unitIds()) this.say({ kind: 'state', unit });
  }

  say(message: ServiceMessage): void {
    for (const listener of this.listeners) listener(message);
  }

  raise(event: Partial<WatchEvent> & Pick<WatchEvent, 'kind' | 'subject'>): WatchEvent {
    const unit = event.unit ?? this.units[0]!.id;
    const full: WatchEvent = {
      id: `${unit}/${event.kind}/${event.subject}`,
      unit,
      class: 'alert',
      priority: 'medium',
      transition: 'raised',
      time: this.time(),
      value: 1.62,
      limit: 1.5,
      message: `The front in ${event.subject} is 1.62 times as wide as a healthy bed would show.`,
      ...event,
    };
    const before = this.alarms.get(full.id);
    const raised = full.transition === 'raised';
    this.alarms.set(full.id, {
      event: raised ? full : (before?.event ?? full),
      alarm: this.moved(before?.alarm ?? NORMAL, { kind: full.transition }).state,
    });
    this.past.push(full);
    this.say({ kind: 'event', unit, event: full });
    return full;
  }

  now(id: string): UnitNow | undefined {
    const unit = this.units.find((candidate) => candidate.id === id);
    if (unit === undefined) return undefined;
    const sense = { charge: 1, stand: 0, discharge: -1 }[this.moment.mode];
    return {
      unit,
      estimate: this.started ? this.estimate(unit) : null,
      profile: this.started ? this.profile(unit) : null,
      dispatch: this.started
        ? {
            time: this.time(this.scans - 2),
            answers: unit.hours_at_W.map((w) => this.answer(w / 1e6)),
          }
        : null,
      age_s: this.started ? this.age_s : null,
      stale: this.stale,
      counts: this.counts,
      headroom: this.headroom && {
        time: this.headroom.time,
        answers: this.headroom.powers_MW.map((power) => this.taken(power)),
      },
      flow_kg_s: this.started ? 12.4 * sense : null,
      power_MW_el: this.started ? [-1.85, 0, 2.2][sense + 1]! : null,
    };
  }

  private answer(power_MW: number): DispatchAnswer {
    const hours = (this.moment.charged * 16) / power_MW;
    const spread = { p90: hours * 0.96, p50: hours, p10: hours * 1.03 };
    return {
      power_MW,
      hours: spread,
      energy_MWh_el: {
        p90: spread.p90 * power_MW,
        p50: spread.p50 * power_MW,
        p10: spread.p10 * power_MW,
      },
      ends_by: power_MW > 3 ? 'flow' : 'hot_outlet',
    };
  }

  /** What the indicators show, and the runs that are over. */
  watched: WatchView | null = null;
  readonly runs: CycleRecord[] = [];

  watch(): WatchView | null {
    return this.watched;
  }

  cycles(unit: string, from_ms: number, to_ms: number, kind: Mode | undefined, most: number) {
    const within = this.runs.filter(
      (one) =>
        one.unit === unit &&
        (kind ?? one.kind) === one.kind &&
        Date.parse(one.to) >= from_ms &&
        Date.parse(one.from) <= to_ms,
    );
    return within.slice(-most);
  }

  readonly rewound: RewindRecord[] = [];
  /** Of the newest estimate. */
  revision = 0;

  rewinds(unit: string, from_ms: number, to_ms: number, most: number) {
    const reaches = ({ from, to }: RewindRecord) =>
      Date.parse(to) >= from_ms && Date.parse(from) <= to_ms;
    return this.rewound.filter((one) => one.unit === unit && reaches(one)).slice(0, most);
  }

  /** Reports asked for, as they came. */
  readonly reportsAsked: ReportQuestion[] = [];

  async bedReport(_unit: string, question: ReportQuestion) {
    this.reportsAsked.push(question);
    return { text: `report as ${question.format}`, style: STYLE_HASH };
  }

  failPlan: Error | null = null;
  /** A schedule follows from the charge instead of being short by a tenth, whatever is asked. */
  marches = false;
  /** Delay of each answer about what lies ahead [ms]. */
  planTakes_ms = 0;
  /** Questions about what lies ahead, as they came. */
  readonly planAsked: PlanQuestion[] = [];

  async plan(unit: string, question: PlanQuestion) {
    if (this.failPlan !== null) throw this.failPlan;
    if (this.now(unit) === undefined) throw new RangeError(`unit: ${unit}`);
    this.planAsked.push(question);
    if (this.planTakes_ms > 0) await new Promise((done) => setTimeout(done, this.planTakes_ms));
    if (question.kind === 'offers') {
      const charge_MWh = this.moment.charged * 16;
      const answer = scriptedOffers(question.ask, Date.parse(this.time()), charge_MWh);
      return { time: this.time(), answer };
    }
    if (question.kind === 'schedule') {
      const now_ms = Date.parse(this.time());
      const answer = this.marches
        ? marchedSchedule(question.ask, now_ms, this.moment.charged)
        : scriptedSchedule(question.ask, now_ms);
      return { time: this.time(), answer };
    }
    if (question.kind === 'capability') {
      const { unit: definition } = this.now(unit)!;
      return { time: this.time(), answer: scriptedCapability(definition, this.moment.charged) };
    }
    if (question.kind !== 'headroom') throw new RangeError(`not scripted: ${question.kind}`);
    const answer = question.ask.powers_W.map((power_W) => this.taken(power_W / 1e6));
    return { time: this.time(), answer };
  }

  private taken(power_MW_el: number): Headroom {
    const { hours, energy_MWh_el } = this.answer(power_MW_el);
    return {
      power_MW_el,
      hours,
      energy_MWh_el,
      ends_by: 'hot_outlet',
      derated_after_hours: null,
      derated_to_MW_el: null,
      refused: null,
      limited_by: null,
    };
  }

  /** Headroom as last worked out. */
  headroom: { time: string; powers_MW: number[] } | null = null;

  /** Offer tables that were to be kept, and what the report of them says. */
  readonly kept: { summary: KeptOffers; answer: AnsweredOffers }[] = [];
  report: OfferReport | null = null;

  keepOffers(_unit: string, asked_ms: number, asked: OffersAsk, answer: AnsweredOffers): number {
    const no = this.kept.length + 1;
    const time_ms = Date.parse(String(answer.time));
    const offers = answer.offers.map(summaryOf);
    this.kept.push({ summary: { no, asked_ms, time_ms, asked, offers }, answer });
    return no;
  }

  keptOffers(_unit: string, from_ms: number, to_ms: number, most: number): KeptOffers[] {
    const own = this.kept.map(({ summary }) => summary).reverse();
    return own.filter((one) => one.asked_ms >= from_ms && one.asked_ms <= to_ms).slice(0, most);
  }

  answeredOffers(_unit: string, no: number): AnsweredOffers | null {
    return this.kept[no - 1]?.answer ?? null;
  }

  async offerReport(): Promise<OfferReport> {
    return this.report ?? offerReport(this.units[0]!, [], []);
  }

  async hours(unit: string, powers_MW: readonly number[]) {
    if (this.failHours !== null) throw this.failHours;
    if (this.now(unit) === undefined) throw new RangeError(`unit: ${unit}`);
    return { time: this.time(), answers: powers_MW.map((power) => this.answer(power)) };
  }

  async sensors(unit: string, over: 'now' | 'day'): Promise<UnitWorth | null> {
    if (this.failHours !== null) throw this.failHours;
    if (!this.started) return null;
    return worthOf(this.now(unit)!.unit, over, this.moment.mode);
  }

  /** theta along a string: the front stands at `charged` of the length. */
  private theta(store: UnitDefinition['stores'][number], lead_m: number, x: number): number {
    const front = this.moment.charged * store.bed.length_m + lead_m;
    const beyond = 0.5 * (1 + erf((x - front) / (Math.SQRT2 * 0.55)));
    return store.kind === 'hot' ? 1 - beyond : beyond;
  }

  profile(unit: UnitDefinition): ProfileView {
    const stores = unit.stores.map((store) => {
      const x_m = Array.from({ length: 100 }, (_, i) => ((i + 0.5) / 100) * store.bed.length_m);
      const span = store.reference_hot_K - store.reference_cold_K;
      const at = (x: number, lead: number) =>
        store.reference_cold_K + span * this.theta(store, lead, x);
      const leads = [0.18, 0, -0.12];
      const tubes = store.strings.map((string, i) => ({
        id: string.id,
        temperature_K: x_m.map((x) => at(x, leads[i]!)),
        sigma_K: x_m.map(
          (x) => 2 + Math.abs(at(x - 0.1, leads[i]!) - at(x + 0.1, leads[i]!)) * 0.3,
        ),
      }));
      const readings = store.strings.flatMap((string, i) =>
        string.thermocouples.map(({ id, position_m }, j) => {
          const stuck = string.id === 'B' && j === 9;
          const open = string.id === 'C' && j === 3;
          const noise = Math.sin(12.9 * (i * 14 + j) + this.scans) * 2;
          return {
            id,
            string: string.id,
            position_m,
            value_K: open
              ? null
              : stuck
                ? store.reference_cold_K + span * 0.7
                : at(position_m, leads[i]!) + noise,
            verdict: open ? ('open' as const) : stuck ? ('stuck' as const) : null,
          };
        }),
      );
      return [store.id, { x_m, tubes, mean_K: x_m.map((x) => at(x, 0)), readings }] as const;
    });
    return { time: this.time(), unit: unit.id, stores: Object.fromEntries(stores) };
  }

  private estimate(unit: UnitDefinition): Estimate {
    return {
      time: this.time(),
      unit: unit.id,
      revision: this.revision,
      mode: this.moment.mode,
      quality: this.stale ? 'stale' : 'good',
      state_of_charge: this.moment.charged,
      stores: Object.fromEntries(unit.stores.map((store) => [store.id, this.storeEstimate(store)])),
    };
  }

  private storeEstimate(store: UnitDefinition['stores'][number]): StoreEstimate {
    const position_m = this.moment.charged * store.bed.length_m;
    const hot = store.kind === 'hot';
    const rejected = store.strings.flatMap((string) => {
      if (string.id === 'A') return [];
      const index = string.id === 'B' ? 9 : 3;
      const verdict = string.id === 'B' ? ('stuck' as const) : ('open' as const);
      const { id } = string.thermocouples[index]!;
      return [{ id, verdict, since: this.time(0), evidence: 'by the script' }];
    });
    return {
      soc: this.moment.charged,
      soc_sigma: 0.004,
      stored_MWh_th: this.moment.charged * (hot ? 42 : 21),
      stored_sigma_MWh_th: hot ? 0.18 : 0.09,
      fronts: [{ position_m, position_sigma_m: 0.03, width_m: 0.55, width_sigma_m: 0.04 }],
      fronts_reason: null,
      energy_position_m: position_m,
      spread_ratio: hot ? 1.12 : 1.04,
      heat_transfer_factor: 0.93,
      heat_transfer_factor_sigma: 0.05,
      strings: store.strings.map((string, i) => ({
        id: string.id,
        flow_factor: [1.06, 1, 0.97][i]!,
        flow_factor_sigma: 0.012,
        position_m: position_m + [0.18, 0, -0.12][i]!,
        width_m: 0.55,
      })),
      front_views: store.strings.map((string) => ({
        id: string.id,
        position_m: position_m + 0.04,
        position_sigma_m: 0.05,
        width_m: 0.57,
        width_sigma_m: 0.06,
        seen: true,
        disagreement: 0.7,
      })),
      sensors: { used: 40, rejected },
      outlet_K: this.moment.mode === 'stand' ? null : hot ? 768.4 : 117.9,
    };
  }

  historySeries(): string[] {
    const hours = ['p90', 'p50', 'p10'].flatMap((level) =>
      [1, 2].map((power) => `hours_${level}_at_${power}_MW`),
    );
    return ['state_of_charge', ...hours, 'quality', 'state_of_charge.min', 'state_of_charge.max'];
  }

  /** Hours only in every fifth row, as the daemon works them out less often than it scans. */
  history(_unit: string, from_ms: number, to_ms: number, points: number): StoredHistory {
    return { points: this.points(from_ms, to_ms, points), bucket_ms: this.bucket_ms };
  }

  /** Whether what is stored is told as thinned; the script thins nothing. */
  bucket_ms: number | null = null;
  /** What is stored of profiles and of indicators. */
  readonly storedMoments: StoredMoment[] = [];
  readonly storedWatch: WatchView[] = [];

  momentAt(_unit: string, time_ms: number): StoredMoment | null {
    return this.storedMoments.findLast((one) => Date.parse(one.profile.time) <= time_ms) ?? null;
  }

  moments(_unit: string, from_ms: number, to_ms: number, points: number): Spread<StoredMoment> {
    return within(this.storedMoments, ({ profile }) => profile.time, from_ms, to_ms, points);
  }

  watchHistory(_unit: string, from_ms: number, to_ms: number, points: number): Spread<WatchView> {
    return within(this.storedWatch, ({ time }) => time, from_ms, to_ms, points);
  }

  private points(from_ms: number, to_ms: number, points: number): HistoryPoint[] {
    const rows = Math.min(points, 300);
    return Array.from({ length: rows }, (_, i) => {
      const t = rows === 1 ? to_ms : from_ms + ((to_ms - from_ms) * i) / (rows - 1);
      const hoursBack = (START_MS + this.scans * 30_000 - t) / 3_600_000;
      const charged = Math.abs(((((this.moment.charged + hoursBack / 10) % 2) + 2) % 2) - 1);
      const gap = i % 97 === 96;
      const at = (power: number, share: number) =>
        gap || i % 5 !== 0 ? null : (charged * 16 * share) / power;
      return {
        time: new Date(t).toISOString(),
        state_of_charge: gap ? null : charged,
        hours_p90_at_1_MW: at(1, 0.95),
        hours_p50_at_1_MW: at(1, 1),
        hours_p10_at_1_MW: at(1, 1.04),
        hours_p90_at_2_MW: at(2, 0.95),
        hours_p50_at_2_MW: at(2, 1),
        hours_p10_at_2_MW: at(2, 1.04),
        quality: 'good',
      };
    });
  }

  private moved(alarm: AlarmState, input: AlarmInput): AlarmStep {
    return stepAlarm(alarm, input, { time_ms: Date.parse(this.time()), latching: false });
  }

  private entries(unit?: string): AlarmEntry[] {
    return [...this.alarms.values()].flatMap(({ event, alarm }) =>
      alarm.state === 'normal' || (unit !== undefined && event.unit !== unit)
        ? []
        : [entryOf(event, alarm, event)],
    );
  }

  standing(unit?: string): AlarmEntry[] {
    return this.entries(unit).filter(({ state }) => !isHeldBack(state));
  }

  heldBack(unit?: string): AlarmEntry[] {
    return this.entries(unit).filter(({ state }) => isHeldBack(state));
  }

  events(unit: string | undefined, from_ms: number, to_ms: number, most: number): WatchEvent[] {
    const within = this.past.filter((event) => {
      const time = Date.parse(event.time);
      return time >= from_ms && time <= to_ms && (unit === undefined || event.unit === unit);
    });
    return within.slice(-most);
  }

  commandAlarm(value: unknown): AlarmAnswer {
    const command = readCommand(value, this.shelveMost_h);
    if (isFault(command)) return { accepted: false, fault: command };
    const { id, who, action } = command;
    const known = this.alarms.get(id);
    const ids = this.entries().map((entry) => entry.id);
    if (known === undefined) {
      const expected = ids.length > 0 ? `one of ${ids.join(', ')}` : 'none stands at present';
      return {
        accepted: false,
        fault: { code: 'unknown_event', field: 'id', value: id, expected },
      };
    }
    const step = this.moved(known.alarm, inputOf(command, Date.parse(this.time())));
    if (step.refused !== null) {
      const fault = { code: 'wrong_state' as const, field: 'action', value: action };
      return { accepted: false, fault: { ...fault, expected: step.refused } };
    }
    if (action === 'acknowledge') this.acknowledged.push({ id, who });
    this.alarms.set(id, { ...known, alarm: step.state });
    const { time_ms, ...rest } = step.transition!;
    const time = new Date(time_ms).toISOString();
    this.transitions.push({ id, unit: known.event.unit, kind: known.event.kind, time, ...rest });
    this.say({ kind: 'alarms', unit: known.event.unit });
    const entry = this.entries().find((one) => one.id === id) ?? null;
    return { accepted: true, command, entry };
  }

  alarmTransitions(): RecordedTransition[] {
    return this.transitions;
  }

  alarmReport(unit: string | undefined, from_ms: number, to_ms: number): AlarmReport {
    const annunciations = this.past
      .filter((event) => event.class === 'alarm' && event.transition === 'raised')
      .map(({ id, time, priority }) => ({ id, time_ms: Date.parse(time), priority }));
    return alarmReport({
      ...{ unit: unit ?? null, from_ms, to_ms, annunciations, alerts: 0 },
      entries: this.entries(unit),
    });
  }

  backup(): Uint8Array {
    return Buffer.from('a state');
  }

  async restore(unit: string, file: Uint8Array, who: string): Promise<RestoreAnswer> {
    if (Buffer.from(file).toString() !== 'a state')
      return { accepted: false, is: 'unusable', fault: 'the file is no backup of a unit' };
    const time = new Date(START_MS).toISOString();
    const record = {
      ...{
        unit,
        done: time,
        from: time,
        to: time,
        scans: 3,
        late_used: 0,
        revised: 2,
        revision: 1,
      },
      ...{ differences: [], differences_left_out: 0, restored: { state_of: time, who } },
    };
    return { accepted: true, record, same_shape: true, reaches: true, anew: [], lost: [] };
  }

  errors(): Record<ErrorCode, number> {
    const codes = Object.keys(ERRORS) as ErrorCode[];
    return Object.fromEntries(codes.map((code, i) => [code, i])) as Record<ErrorCode, number>;
  }

  /** What it is not ready for. */
  missing: string[] = [];

  unready(): string[] {
    return this.missing;
  }

  health(): HealthPart[] {
    return this.parts;
  }

  counters(): Record<string, number> {
    return this.count;
  }

  subscribe(listener: (message: ServiceMessage) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }
}
