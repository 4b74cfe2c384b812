import type { History } from '../../adapters/history/history.js';
import type { Journal, JournalEntry, ReadingEntry } from '../../adapters/history/journal.js';
import type { LateReading } from '../../adapters/history/lateReadings.js';
import type { Past } from '../../adapters/history/past.js';
import { believedTime } from '../../core/scan/assemble.js';
import type { WatchEvent } from '../../core/watch/event.js';
import type { RunnerStep, UnitRunner } from '../unitRunner.js';
import { JOURNAL_PAGE } from './plan.js';

const LATE_PAGE = 500;
/** Events of the past that are compared at most. */
const MOST_EVENTS = 10_000;

export interface RerunParts {
  readonly journal: Journal;
  readonly history: History;
  /** The unit as it runs. */
  readonly live: UnitRunner;
  /** The same from before the oldest late reading. */
  readonly second: UnitRunner;
  /** Source time of that state [ms]. */
  readonly from_ms: number;
  /** No scan of before is entered [ms]; absent: from the first that is made again. */
  readonly enter_from_ms?: number;
  /** Late readings up to this number of the journal are taken in. */
  readonly through_seq: number;
  /** Spacing of the states that are kept [ms]. */
  readonly point_every_ms: number;
  /** The live runner has worked off all that it has taken. */
  isAtRest(): boolean;
  /** Estimates of before a time are lost: only what is not there is entered, with this revision. */
  readonly fill?: {
    readonly before_ms: number;
    revisionAt(time_ms: number): number;
  };
  /** An entry of the journal came late. */
  late?(entry: ReadingEntry): void;
}

/**
 * Runs a unit again from a state of the past, with the readings that came late, until it has come to
 * where the live one is: entries of the journal in their order, a late reading before the first that is
 * of a later source time than it, close marks where they stand. What comes out is what would have come
 * out had all come in time, and goes into the history as it does.
 */
export class Rerun {
  scans = 0;
  /** What the scans said that were made again. */
  readonly events: WatchEvent[] = [];
  last: RunnerStep | null = null;
  readonly past: Past;
  private late: readonly LateReading[] = [];
  private lateAt = 0;
  private latePlace: LateReading;
  private hasMoreLate = true;
  private lastPoint_ms: number;
  private readonly period_ms: number;
  private readonly found_seq: number;

  constructor(private readonly parts: RerunParts) {
    const { history, second, from_ms, enter_from_ms = Number.NEGATIVE_INFINITY } = parts;
    this.period_ms = second.unit.scan_period_s * 1000;
    const open_ms = (second.openFrom ?? Number.NEGATIVE_INFINITY) * this.period_ms;
    this.past = history.past(second.unit, Math.max(open_ms, enter_from_ms));
    this.latePlace = { time_ms: this.past.from_ms, seq: -1 };
    this.lastPoint_ms = from_ms;
    const { clocks } = this.parts.live;
    second.clocks.follow(clocks);
    this.found_seq = clocks.found_seq;
  }

  /** Begin of the oldest scan that is made again [ms]. */
  get from_ms(): number {
    return this.past.from_ms;
  }

  /** Source time that it has come to [ms]. */
  get reached_ms(): number {
    return this.last?.closed.scan.time_ms ?? this.parts.from_ms;
  }

  /** In pieces, each short; to be called within transactions. `wait`: the live one has to go on first. */
  *run(): Generator<'more' | 'wait', void> {
    const { journal, live, second } = this.parts;
    // Scans may have been closed when the state was saved.
    yield* this.steps();
    for (let seq = second.seq; ; ) {
      const { entries, seq: reached } = journal.readUnit(
        ...[live.unit.id, seq, live.seq, JOURNAL_PAGE],
      );
      seq = Math.max(seq, reached);
      for (const entry of entries) {
        this.requireSameClocks();
        if (live.clocks.wasPutAside(entry)) second.startAt(entry.seq);
        else yield* this.take(entry);
      }
      yield 'more';
      if (this.isFilled) return;
      if (seq < live.seq) continue;
      yield* this.takeLateBefore(Number.POSITIVE_INFINITY);
      if (this.parts.isAtRest() && seq >= live.seq) return;
      yield 'wait';
    }
  }

  private *take(entry: JournalEntry): Generator<'more'> {
    // What a mark closes is closed with all that is of its time.
    const before_ms =
      entry.kind === 'close' ? (entry.scan_index + 1) * this.period_ms : believedTime(entry);
    yield* this.takeLateBefore(before_ms);
    const fate = this.parts.second.take(entry, 0);
    if (fate === 'late' && entry.kind === 'reading') this.parts.late?.(entry);
    yield* this.steps();
  }

  private *takeLateBefore(time_ms: number): Generator<'more'> {
    const { journal, second, live } = this.parts;
    for (let next = this.nextLate(); next && next.time_ms < time_ms; next = this.nextLate()) {
      this.lateAt++;
      this.latePlace = next;
      const entry = journal.at(next.seq);
      if (entry?.kind === 'reading' && !live.clocks.wasPutAside(entry)) second.takeLate(entry);
      yield* this.steps();
    }
  }

  private nextLate(): LateReading | undefined {
    const { history, live, through_seq } = this.parts;
    if (this.lateAt >= this.late.length && this.hasMoreLate) {
      this.late = history.late.after(live.unit.id, this.latePlace, through_seq, LATE_PAGE);
      this.lateAt = 0;
      this.hasMoreLate = this.late.length > 0;
    }
    return this.late[this.lateAt];
  }

  private *steps(): Generator<'more'> {
    const { second } = this.parts;
    for (let step = second.step('none'); step; step = second.step('none')) {
      this.requireSameClocks();
      this.enter(step);
      yield 'more';
    }
  }

  /** Begun again, what is put aside is left out. */
  private requireSameClocks(): void {
    if (this.parts.live.clocks.found_seq === this.found_seq) return;
    throw new RangeError('meanwhile clocks were found to have been ahead');
  }

  private enter(step: RunnerStep): void {
    const { live, second, history, point_every_ms } = this.parts;
    const { estimate, profile, watch, cycle, events } = step.step;
    const { index, scan } = step.closed;
    if (scan.time_ms < this.past.from_ms) return;
    if (this.parts.fill) {
      this.fill(step, this.parts.fill);
      return;
    }
    const newest_ms = live.view.estimate ? Date.parse(live.view.estimate.time) : scan.time_ms;
    this.past.enter(
      { estimate, measured: step.measured, profile, watch, cycle },
      (index + 1) * this.period_ms,
      newest_ms,
    );
    this.events.push(...events.slice(0, MOST_EVENTS - this.events.length));
    this.scans++;
    this.last = step;
    const stretch = (time_ms: number) => Math.floor(time_ms / point_every_ms);
    if (stretch(scan.time_ms) === stretch(this.lastPoint_ms)) return;
    const state = second.checkpoint(false);
    if (state) history.rewindPoints.add(second.unit, state, point_every_ms, this.lastPoint_ms);
    this.lastPoint_ms = scan.time_ms;
  }

  private fill(step: RunnerStep, { before_ms, revisionAt }: NonNullable<RerunParts['fill']>): void {
    const { estimate, profile, watch, cycle } = step.step;
    const time_ms = Date.parse(estimate.time);
    this.last = step;
    if (time_ms >= before_ms) return;
    const revised = { ...estimate, revision: revisionAt(time_ms) };
    this.past.fill({ estimate: revised, measured: step.measured, profile, watch, cycle });
    this.scans++;
  }

  /** All that was lost has been made again. */
  private get isFilled(): boolean {
    const { fill } = this.parts;
    return fill !== undefined && this.reached_ms >= fill.before_ms;
  }

  /** States of the live runner that are newer than the last of the second one are of no use any more. */
  dropStates(): void {
    const { history, live } = this.parts;
    const { id } = live.unit;
    history.rewindPoints.forgetAfter(id, this.lastPoint_ms, Number.MAX_SAFE_INTEGER);
    history.checkpoints.clear(id);
  }
}
