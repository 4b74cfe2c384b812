import type { History } from '../adapters/history/history.js';
import type { LateReading } from '../adapters/history/lateReadings.js';
import { isOfTheMachine, type WatchEvent } from '../core/watch/event.js';
import { hindsight } from '../core/watch/hindsight.js';
import { reasonOf } from '../errors.js';
import { type Stretch, voidAfter } from './clockStretch.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';
import type { RunnerStep, UnitRunner } from './unitRunner.js';

/** Events kept while the history cannot be written; what is beyond is counted as lost. */
const MOST_UNSTORED = 10_000;
/** Steps kept while the history cannot be written; with so many the journal is not worked off further. */
const MOST_WAITING = 500;
/** Late readings that are noted together at the latest, and most kept while they cannot be. */
const NOTE_TOGETHER = 500;
const MOST_UNNOTED = 200_000;
/** After a start the first states to go back to are kept in turn within this time: 20 ms each. */
const FIRST_POINTS_MS = 60_000;

export interface EnteringOptions {
  readonly history: History;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly checkpoint_every_ms: number;
  /** Share of these intervals by which a unit comes later than the first, so that not all come at once. */
  phase(unit: string): number;
  /** Spacing of the states that late readings rewind to, and how far back they are kept [ms]; 0 = none. */
  readonly point_every_ms: number;
  readonly reach_ms: number;
  /** A step of a unit whose estimate is new. */
  stepped(runner: UnitRunner, step: RunnerStep): void;
  /** An event that is new. */
  event(event: WatchEvent): void;
  /** Alarms of a unit have changed without an event: a rule, or the time. */
  alarmsMoved(unit: string): void;
}

/** What a unit has gone back from: saved within a span of the journal, told of after a source time [ms]. */
interface BackFrom {
  readonly from_seq: number;
  readonly through_seq: number;
  readonly after_ms: number;
}

/** What comes out of units goes into the history: estimates, events, states, and what came late. */
export class Entering {
  private readonly nextCheckpoint = new Map<string, number>();
  private readonly nextPoint = new Map<string, number>();
  private readonly unnoted = new Map<string, LateReading[]>();
  private storeTrouble: string | null = null;
  /** Steps told while the history could not be written: no saved state is stored before them. */
  private waiting: { readonly runner: UnitRunner; readonly step: RunnerStep }[] = [];
  /** Events told while the history could not be written, in their order. */
  private unstored: WatchEvent[] = [];

  /** What units have gone back from and the history still has. */
  private readonly backFrom = new Map<string, BackFrom>();
  /** Units whose alarms are of before they went back. */
  private readonly unaligned = new Set<string>();

  constructor(private readonly options: EnteringOptions) {}

  /** Why the journal or the history could not be read or written the last time, null if they could. */
  get trouble(): string | null {
    return this.storeTrouble;
  }

  enter(runner: UnitRunner, step: RunnerStep): void {
    const { history, counters, stepped, event, alarmsMoved } = this.options;
    const { estimate, events } = step.step;
    const time_ms = Date.parse(estimate.time);
    try {
      const news = history.write(() => {
        const taken = this.takeBack();
        // What waited comes first: the order of what is forwarded.
        for (const one of this.waiting) this.put(one.runner, one.step);
        const { isNew, moved } = this.put(runner, step);
        const late = this.unstored.filter((one) => history.events.add(one));
        this.keepPoint(runner, time_ms);
        const own = events.filter((one) => history.events.add(one));
        const aligned = isNew ? this.aligned(runner, estimate.time) : [];
        return { isNew, moved, taken, late, events: [...own, ...aligned] };
      });
      if (news.isNew) this.unaligned.delete(runner.unit.id);
      this.written(news.late, news.taken);
      if (news.isNew) stepped(runner, step);
      for (const one of news.events) event(one);
      if (news.moved) alarmsMoved(runner.unit.id);
    } catch (thrown) {
      // What cannot be stored is said all the same, and stored with the next scan that can be.
      this.storeFailed('history_failures', thrown);
      this.waiting.push({ runner, step });
      this.unstored.push(...events);
      counters.add('events_lost', this.unstored.splice(MOST_UNSTORED).length);
      stepped(runner, step);
      for (const one of events) event(one);
    }
    this.checkpointIfDue(runner, time_ms);
  }

  /** A unit has gone back to before clocks were ahead: what is due by source times is due anew. */
  wentBack({ unit }: UnitRunner, stretch: Stretch): void {
    this.nextCheckpoint.delete(unit.id);
    this.nextPoint.delete(unit.id);
    // A second one, while the history cannot be written, goes back no further than what came of the first.
    const { from_seq, through_seq } = stretch;
    const after_ms = voidAfter(stretch);
    const before = this.backFrom.get(unit.id) ?? { from_seq, after_ms };
    this.backFrom.set(unit.id, {
      from_seq: Math.min(from_seq, before.from_seq),
      through_seq,
      after_ms: Math.min(after_ms, before.after_ms),
    });
    this.unaligned.add(unit.id);
    this.waiting = this.waiting.filter(
      ({ runner, step }) => runner.unit !== unit || step.closed.scan.time_ms <= after_ms,
    );
  }

  /**
   * What units told by clocks that were ahead goes before anything else of them is written, within a
   * transaction; gives the estimates that go.
   */
  private takeBack(): number {
    const { history } = this.options;
    let estimates = 0;
    for (const [unit, { from_seq, through_seq, after_ms }] of this.backFrom) {
      history.rewindPoints.forgetSaved(unit, from_seq, through_seq);
      estimates += history.takeBack(unit, after_ms);
    }
    return estimates;
  }

  /** What is told of alarms by clocks that were ahead and does not hold is returned, within a transaction. */
  private aligned(runner: UnitRunner, time: string): WatchEvent[] {
    const { id } = runner.unit;
    if (!this.unaligned.has(id)) return [];
    const { history } = this.options;
    const active = history.alarms.active(id).filter(({ kind }) => !isOfTheMachine(kind));
    return hindsight(active, runner.standing, time, 'clocks that are right again').filter((one) =>
      history.events.add(one),
    );
  }

  /** What units have gone back from is in the history still: nothing may be saved of them before it goes. */
  get isToTakeBack(): boolean {
    return this.backFrom.size > 0;
  }

  /** So much waits to be stored that no more may be added. */
  get isFull(): boolean {
    return this.waiting.length >= MOST_WAITING;
  }

  /** Tries to store what waits; false where the history cannot be written still. */
  retry(): boolean {
    const { history } = this.options;
    try {
      const { taken, late } = history.write(() => {
        const estimates = this.takeBack();
        for (const { runner, step } of this.waiting) this.put(runner, step);
        return { taken: estimates, late: this.unstored.filter((one) => history.events.add(one)) };
      });
      this.written(late, taken);
      return true;
    } catch (thrown) {
      this.storeFailed('history_failures', thrown);
      return false;
    }
  }

  /** What waited has been stored, and so many estimates taken back. */
  private written(late: readonly WatchEvent[], taken: number): void {
    this.storeTrouble = null;
    this.backFrom.clear();
    this.options.counters.add('estimates_taken_back', taken);
    this.waiting = [];
    this.unstored = [];
    for (const unit of new Set(late.map((one) => one.unit))) this.options.alarmsMoved(unit);
  }

  /** Within a transaction. */
  private put(runner: UnitRunner, { step, measured }: RunnerStep) {
    const { history } = this.options;
    const { estimate, profile, cycle, watch } = step;
    const isNew = history.estimates.add(runner.unit, estimate, measured);
    if (profile) history.profiles.add(profile);
    if (cycle) history.cycles.add(cycle);
    if (watch) history.watch.add(watch);
    // A scan that is known, as in a replay after a restart, has moved its alarms already.
    const time_ms = Date.parse(estimate.time);
    const moved = isNew && history.alarms.scan(runner.unit.id, estimate.mode, time_ms);
    return { isNew, moved };
  }

  /**
   * Notes that a reading came late, at the latest with the next state that is saved: a restart from
   * that one would not see it come again.
   */
  noteLate(unit: string, reading: LateReading): void {
    const list = this.unnoted.get(unit) ?? [];
    this.unnoted.set(unit, list);
    if (list.length >= MOST_UNNOTED) this.options.counters.add('late_lost');
    else list.push(reading);
    if (list.length >= NOTE_TOGETHER) this.flushLate(unit);
  }

  /** Writes what is noted of a unit; false where the history cannot be written. */
  flushLate(unit: string): boolean {
    const { history } = this.options;
    try {
      history.write(() => this.writeLate(unit));
      this.unnoted.delete(unit);
      return true;
    } catch (thrown) {
      this.storeFailed('history_failures', thrown);
      return false;
    }
  }

  /** @param last with the newest profile, which is shown until the next start has its own */
  save(runner: UnitRunner, last = false): void {
    const { history } = this.options;
    const checkpoint = runner.checkpoint();
    const isToWrite = this.waiting.length > 0 || this.backFrom.size > 0;
    if (!checkpoint || (isToWrite && !this.retry())) return;
    const { id } = runner.unit;
    try {
      const told = history.write(() => {
        this.writeLate(id);
        history.checkpoints.add(runner.unit, checkpoint);
        runner.unsaved = false;
        if (last && runner.view.profile) history.profiles.add(runner.view.profile, true);
        // A restart from here knows of no alarm that is of before the unit went back.
        return this.aligned(runner, new Date(checkpoint.time_ms).toISOString());
      });
      this.unnoted.delete(id);
      this.unaligned.delete(id);
      for (const one of told) this.options.event(one);
    } catch (thrown) {
      this.storeFailed('history_failures', thrown);
    }
  }

  /** `KIND/SUBJECT` of what the unit's estimator has raised. */
  standingOf(unit: string): ReadonlySet<string> {
    try {
      const events = this.options.history.alarms.active(unit);
      const own = events.filter(({ kind }) => !isOfTheMachine(kind));
      return new Set(own.map(({ kind, subject }) => `${kind}/${subject}`));
    } catch (thrown) {
      this.storeFailed('history_failures', thrown);
      return new Set();
    }
  }

  storeFailed(kind: 'journal_failures' | 'history_failures', thrown: unknown): void {
    this.storeTrouble = reasonOf(thrown);
    this.options.counters.failed(thrown);
    this.options.counters.add(kind);
    this.options.notices.warn(kind, this.storeTrouble);
  }

  private checkpointIfDue(runner: UnitRunner, time_ms: number): void {
    const due = this.nextCheckpoint.get(runner.unit.id);
    if (due !== undefined && time_ms < due && !runner.unsaved) return;
    const { checkpoint_every_ms, phase } = this.options;
    // The first interval of each unit is another, so that states are saved one after the other.
    const share = due === undefined ? 1 - phase(runner.unit.id) : 1;
    this.nextCheckpoint.set(runner.unit.id, time_ms + share * checkpoint_every_ms);
    // The first of this process would only repeat the one that it was restored from.
    if (due !== undefined || runner.unsaved) this.save(runner);
  }

  private writeLate(unit: string): void {
    const list = this.unnoted.get(unit);
    if (list) this.options.history.late.add(unit, list);
  }

  /**
   * Keeps the state where its stretch has none, for late readings to go back to: the first of it, of
   * further units the first behind their phase in it; where the process starts amid a stretch, in turn
   * within a minute.
   */
  private keepPoint(runner: UnitRunner, time_ms: number): void {
    const { unit } = runner;
    const { history, point_every_ms, reach_ms } = this.options;
    if (!this.nextPoint.has(unit.id))
      this.nextPoint.set(unit.id, time_ms + this.options.phase(unit.id) * FIRST_POINTS_MS);
    if (reach_ms === 0 || time_ms < (this.nextPoint.get(unit.id) ?? Number.NEGATIVE_INFINITY))
      return;
    const begin_ms = Math.floor(time_ms / point_every_ms) * point_every_ms;
    const from_ms = begin_ms + this.options.phase(unit.id) * point_every_ms;
    this.nextPoint.set(unit.id, time_ms < from_ms ? from_ms : begin_ms + point_every_ms);
    if (time_ms < from_ms) return;
    if (history.rewindPoints.hasOneOf(unit.id, time_ms, point_every_ms)) return;
    const checkpoint = runner.checkpoint(false);
    if (checkpoint) history.rewindPoints.add(unit, checkpoint, point_every_ms);
  }
}
