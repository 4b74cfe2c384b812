import type { ReadingEntry } from '../../adapters/history/journal.js';
import type { RewindRecord } from '../../core/scan/rewindRecord.js';
import type { WatchEvent } from '../../core/watch/event.js';
import { RockhourError, reasonOf } from '../../errors.js';
import type { Log } from '../../log.js';
import type { SteadyClock } from '../clock.js';
import type { Entering } from '../entering.js';
import type { RunnerStep, UnitRunner } from '../unitRunner.js';
import type { GivenStart } from './given.js';
import { type Remade, remakeWork } from './remake.js';
import { rewindWords, tellRemade, tellRewound } from './told.js';
import { type Outcome, restoreWork, rewindWork, type WorkParts } from './work.js';

export interface RewinderOptions extends WorkParts {
  readonly runners: readonly UnitRunner[];
  readonly steady: SteadyClock;
  readonly log: Log;
  readonly entering: Entering;
  /** Pause after a failure [ms]; without it 5 s. */
  readonly retry_ms?: number;
  /** Entries that the live units still have to work off. */
  backlog(): number;
  stepped(runner: UnitRunner, step: RunnerStep): void;
  event(event: WatchEvent): void;
  alarmsMoved(unit: string): void;
}

/** Work in one go [ms]: a scan, rather, where that is longer. */
const SLICE_MS = 10;
/** Pause where the live units have work, or are to go on first [ms]. */
const PAUSE_MS = 5;
/** Further behind the journal than this, the live units come first [entries]. */
const MOST_BEHIND = 1000;
/** After a failure [ms], and failures in a row after which the readings are given up. */
const RETRY_MS = 5000;
const MOST_FAILURES = 3;

interface Waiting {
  first_ms: number;
  last_ms: number;
}

interface Given {
  readonly runner: UnitRunner;
  readonly start: GivenStart;
  done(record: RewindRecord): void;
  failed(thrown: unknown): void;
}

interface Job {
  readonly runner: UnitRunner;
  /** A state from outside is where it begins. */
  readonly given?: Given;
  /** Estimates that a damaged history lost are made again; the live unit stays as it is. */
  readonly isRemake?: true;
  readonly work: Generator<'more' | 'wait', Outcome | Remade | null>;
}

/**
 * Late readings: waits until a delivery is over, then makes the scans since the oldest of them again
 * beside the live unit, in slices, and puts the state that comes out in the live one's place. One unit
 * at a time. What waits and what is done is in the history: a kill amid it begins it again.
 */
export class Rewinder {
  private readonly waiting = new Map<string, Waiting>();
  /** Units whose estimates were lost with a damaged history. */
  private readonly lost = new Set<UnitRunner>();
  private given: Given[] = [];
  private job: Job | null = null;
  private timer: NodeJS.Timeout | null = null;
  private running = false;
  private readonly failures = new Map<string, number>();
  private readonly lastDone = new Map<string, RewindRecord>();

  constructor(private readonly options: RewinderOptions) {}

  /** Once units are restored: what waited before the stop waits on. */
  start(): void {
    this.running = true;
    const { runners, history } = this.options;
    for (const runner of runners) {
      const { id } = runner.unit;
      const last = history.rewinds.latest(id);
      if (last) this.lastDone.set(id, last);
      if (history.late.waiting(id)) this.await(id);
      if (history.lostBefore(id) !== null) this.lost.add(runner);
    }
  }

  /** A damaged history was set aside while units run: what they had told is made again. */
  historyLost(): void {
    if (this.running) for (const runner of this.options.runners) this.lost.add(runner);
  }

  private await(unit: string): void {
    const now = this.options.steady.now();
    this.waiting.set(unit, { first_ms: now, last_ms: now });
  }

  stop(): void {
    this.running = false;
    if (this.timer) clearTimeout(this.timer);
    this.timer = null;
    const undone = [...this.given.splice(0), ...(this.job?.given ? [this.job.given] : [])];
    this.job = null;
    for (const { failed } of undone) failed(new Error('the daemon was stopped meanwhile'));
  }

  /**
   * Puts a unit back to a state from outside and makes the scans since again, beside the live unit, as
   * for late readings. Until it is done nothing but estimates has changed; a kill amid it undoes the rest.
   */
  goOnFrom(start: GivenStart): Promise<RewindRecord> {
    const { id } = start.second.unit;
    const runner = this.options.runners.find(({ unit }) => unit.id === id);
    if (!this.running || runner === undefined)
      throw new RangeError(`unit must be one that runs, got ${id}`);
    return new Promise((done, failed) => {
      this.given.push({ runner, start, done, failed });
      this.poll();
    });
  }

  /** How it stands with a unit's late readings, in words; empty where there never were any. */
  words(unit: string): string {
    if (this.busyWith === unit) {
      if (this.job?.given) return 'is being put back to a backup';
      if (this.job?.isRemake) return 'makes estimates again that a damaged history held';
      return 'makes scans again with late readings';
    }
    if (this.waiting.has(unit)) return 'late readings wait to be taken in';
    if ([...this.lost].some((runner) => runner.unit.id === unit))
      return 'estimates that a damaged history held wait to be made again';
    const last = this.lastDone.get(unit);
    return last ? rewindWords(last) : '';
  }

  /** Unit whose scans are made again at present. */
  get busyWith(): string | null {
    return this.job?.runner.unit.id ?? null;
  }

  /** Whether readings of a unit wait to be taken in. */
  isAwaited(unit: string): boolean {
    return this.waiting.has(unit);
  }

  /** A reading came when its scan was closed. */
  note(runner: UnitRunner, { time_ms, seq }: ReadingEntry, isNew: boolean) {
    const { rules, counters, notices, entering, steady } = this.options;
    const { id } = runner.unit;
    if (time_ms < (runner.newest_ms ?? time_ms) - rules.reach_ms) {
      if (!isNew) return;
      counters.add('too_late');
      const time = new Date(time_ms).toISOString();
      const reach = `${rules.reach_ms / 3_600_000} h`;
      notices.warn(
        `too_late ${id}`,
        `unit ${id}: a reading of ${time} is older than the ${reach} of late.rewind_h: not used`,
      );
      return;
    }
    entering.noteLate(id, { time_ms, seq });
    const now = steady.now();
    const known = this.waiting.get(id);
    if (known) known.last_ms = now;
    else this.waiting.set(id, { first_ms: now, last_ms: now });
  }

  /** To be called by a clock: begins what is due. */
  poll(): void {
    if (!this.running || this.job || this.timer) return;
    const { runners, steady, rules, entering, backlog } = this.options;
    if (backlog() > MOST_BEHIND) return;
    // The state that a rewind saves would be behind it: a restart from there would leave it for ever.
    if (entering.isToTakeBack && !entering.retry()) return;
    const given = this.given.shift();
    if (given) {
      this.job = {
        runner: given.runner,
        given,
        work: restoreWork(given.runner, given.start, this.options),
      };
      this.goOn(0);
      return;
    }
    const now = steady.now();
    // What may be of a clock that is off by hours is no late reading.
    const inDoubt = runners.filter((one) => one.isZoneInDoubt).map(({ unit }) => unit.id);
    const isDue = (unit: string, { first_ms, last_ms }: Waiting) =>
      (now - last_ms >= rules.quiet_ms && !inDoubt.includes(unit)) ||
      now - first_ms >= rules.wait_ms;
    const [due] = [...this.waiting]
      .filter(([unit, waiting]) => isDue(unit, waiting))
      .sort(([, a], [, b]) => a.first_ms - b.first_ms);
    const runner = due && runners.find(({ unit }) => unit.id === due[0]);
    if (runner === undefined) this.beginRemake();
    // A state that is to be taken over first comes to its time within the journal.
    if (!runner?.isSettled || !entering.flushLate(runner.unit.id)) return;
    this.waiting.delete(runner.unit.id);
    // Those that are noted by now: what comes until the work begins is the next one's.
    this.job = { runner, work: rewindWork(runner, runner.seq, this.options) };
    this.goOn(0);
  }

  private beginRemake(): void {
    const runner = [...this.lost].find(({ isSettled }) => isSettled);
    if (runner === undefined || !this.options.entering.flushLate(runner.unit.id)) return;
    this.lost.delete(runner);
    this.job = { runner, isRemake: true, work: remakeWork(runner, this.options) };
    this.goOn(0);
  }

  /** Deletes states and late readings of before what can be gone back to. */
  forgetOld(): void {
    const { history, runners, rules, counters } = this.options;
    for (const { unit, newest_ms, clocks } of runners) {
      if (newest_ms === null || unit.id === this.busyWith) continue;
      // One state from before it, for what is late by nearly as much.
      const reach_ms = rules.reach_ms + rules.point_every_ms;
      // Clocks may be ahead at present: then it goes back to before, and what is of then stays.
      const { aside_ms } = clocks;
      const end_ms = Math.min(newest_ms, aside_ms ?? newest_ms) - reach_ms;
      history.write(() => {
        history.rewindPoints.forget(unit, end_ms);
        if (aside_ms !== null)
          history.rewindPoints.forgetAfter(unit.id, aside_ms, newest_ms - reach_ms);
        counters.add('too_late', history.late.forget(unit.id, end_ms));
      });
    }
  }

  private goOn(wait_ms: number): void {
    this.timer = setTimeout(() => this.slice(), wait_ms);
  }

  private slice(): void {
    this.timer = null;
    const { job } = this;
    if (!job) return;
    if (this.options.backlog() > MOST_BEHIND) {
      this.goOn(PAUSE_MS);
      return;
    }
    try {
      const { waits, outcome } = this.options.history.write(() => this.work(job));
      if (outcome === undefined) {
        this.goOn(waits || this.options.backlog() > 0 ? PAUSE_MS : 0);
        return;
      }
      this.job = null;
      if (outcome && 'rerun' in outcome) {
        this.swap(job.runner, outcome);
        job.given?.done(outcome.record);
      } else if (outcome) this.remade(job.runner, outcome);
    } catch (thrown) {
      if (job.given) this.notRestored(job.given, thrown);
      else if (job.isRemake) this.notRemade(job.runner, thrown);
      else this.failed(job.runner, thrown);
    }
  }

  private notRestored({ failed }: Given, thrown: unknown): void {
    this.job = null;
    this.options.counters.add('restore_failures');
    this.options.counters.failed(thrown);
    failed(thrown);
  }

  private work({ work }: Job): { waits: boolean; outcome?: Outcome | Remade | null } {
    const end = performance.now() + SLICE_MS;
    do {
      const { done, value } = work.next();
      // A damaged history ends it amid, and this is called again on the fresh one.
      if (done && value === undefined) throw new Error('the work was cut off by a damaged history');
      if (done) return { waits: false, outcome: value };
      if (value === 'wait') return { waits: true };
    } while (performance.now() < end);
    return { waits: false };
  }

  private swap(live: UnitRunner, { rerun, second, record, events }: Outcome): void {
    const { history, stepped, event, alarmsMoved } = this.options;
    const { id } = live.unit;
    live.adopt(second);
    // A unit without a reading so far sees its scans close from here on.
    const steady_ms = this.options.steady.now();
    if (live.plantClock.at(steady_ms) === null && second.newest_ms !== null)
      live.plantClock.observe(second.newest_ms, steady_ms);
    this.failures.delete(id);
    this.lastDone.set(id, record);
    tellRewound(record, this.options);
    for (const one of events) event(one);
    const { last } = rerun;
    const { estimate } = live.view;
    if (last === null || estimate === null) return;
    const time_ms = Date.parse(estimate.time);
    const moved = history.write(() => history.alarms.scan(id, estimate.mode, time_ms));
    stepped(live, { ...last, step: { ...last.step, estimate } });
    if (moved) alarmsMoved(id);
  }

  private remade({ unit: { id } }: UnitRunner, { record, events, late }: Remade): void {
    this.failures.delete(id);
    this.lastDone.set(id, record);
    tellRemade(record, this.options);
    for (const one of events) this.options.event(one);
    if (late > 0) this.await(id);
  }

  /** The job of a unit has failed, so many times in a row by now. */
  private countFailure(unit: string, thrown: unknown): number {
    const { counters } = this.options;
    this.job = null;
    counters.add('rewind_failures');
    counters.failed(thrown);
    const times = (this.failures.get(unit) ?? 0) + 1;
    this.failures.set(unit, times);
    return times;
  }

  /**
   * Writes that something is given up. On a full disk that fails too, and an error within a timer ends
   * the process: null then, and it is tried again.
   */
  private givenUp<T>(write: () => T): T | null {
    const { history, counters, notices } = this.options;
    try {
      return history.write(write);
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      notices.warn('history_failures', reasonOf(thrown));
      return null;
    }
  }

  /** It is begun again; what is there by now stays. */
  private notRemade(runner: UnitRunner, thrown: unknown): void {
    const { notices, history } = this.options;
    const { id } = runner.unit;
    const times = this.countFailure(id, thrown);
    const isOver =
      times >= MOST_FAILURES &&
      !isStoreTrouble(thrown) &&
      this.givenUp(() => history.remade(id)) !== null;
    if (isOver) this.failures.delete(id);
    else this.lost.add(runner);
    const next = isOver ? 'gives them up' : 'tries again';
    notices.warn(
      `rewind_failures ${id}`,
      `unit ${id}: estimates of a damaged history could not be made again, ${next}: ${reasonOf(thrown)}`,
    );
    this.goOn(this.options.retry_ms ?? RETRY_MS);
  }

  /** What was written is right as far as it goes; begun again, it comes to the same. */
  private failed(runner: UnitRunner, thrown: unknown): void {
    const { counters, notices, history } = this.options;
    const { id } = runner.unit;
    const times = this.countFailure(id, thrown);
    let next = 'tries again';
    const isNoted = this.options.entering.flushLate(id);
    const isOver = times >= MOST_FAILURES && !isStoreTrouble(thrown) && isNoted;
    const lost = isOver
      ? this.givenUp(() => {
          const count = history.late.waiting(id, runner.seq)?.count ?? 0;
          history.late.take(id, runner.seq);
          return count;
        })
      : null;
    if (lost === null) this.await(id);
    else {
      this.failures.delete(id);
      counters.add('late_lost', lost);
      next = `gives up ${lost} of them`;
    }
    notices.warn(
      `rewind_failures ${id}`,
      `unit ${id}: readings that came late could not be taken in, ${next}: ${reasonOf(thrown)}`,
    );
    this.goOn(this.options.retry_ms ?? RETRY_MS);
  }
}

/** A disk gets well again; a core that fails on a scan fails on it every time. */
function isStoreTrouble(thrown: unknown): boolean {
  return thrown instanceof RockhourError && thrown.code === 'STORE_FAILED';
}
