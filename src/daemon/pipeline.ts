import type { History } from '../adapters/history/history.js';
import type { Journal, JournalEntry } from '../adapters/history/journal.js';
import type { WatchEvent } from '../core/watch/event.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock, SteadyClock } from './clock.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';
import { restoreRunner } from './restore.js';
import type { RunnerStep, UnitRunner } from './unitRunner.js';

/** Work in one go, after which messages and questions have their turn [ms]. */
const SLICE_MS = 25;
/** Journal entries read at a time. */
const PAGE = 512;
/** Events kept while the history cannot be written; what is beyond is counted as lost. */
const MOST_UNSTORED = 10_000;
/** After a failure to read the journal [ms]. */
const RETRY_MS = 1000;

export interface PipelineOptions {
  readonly journal: Journal;
  readonly history: History;
  readonly runners: readonly UnitRunner[];
  readonly clock: DaemonClock;
  readonly steady: SteadyClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly log: Log;
  readonly checkpoint_every_ms: number;
  /** A step of a unit whose estimate is new. */
  stepped(runner: UnitRunner, step: RunnerStep): void;
  /** An event that is new. */
  event(event: WatchEvent): void;
  /** Alarms of a unit have changed without an event: a rule, or the time. */
  alarmsMoved(unit: string): void;
}

/**
 * From journal to history: reads what was committed, in order, runs it through the units and
 * enters what comes out. It works in slices; how far it is behind the journal is its backlog.
 */
export class Pipeline {
  private seq = 0;
  private page: readonly JournalEntry[] = [];
  private onPage = 0;
  /** Units that may have closed scans to be worked off before the next entry. */
  private busy: UnitRunner[] = [];
  private scheduled: NodeJS.Immediate | null = null;
  private retry: NodeJS.Timeout | null = null;
  private running = false;
  private liveFrom = Number.POSITIVE_INFINITY;
  private idle: (() => void)[] = [];
  private readonly nextCheckpoint = new Map<string, number>();
  private readonly failing = new Map<string, string>();
  private storeTrouble: string | null = null;
  /** Events told while the history could not be written, in their order. */
  private unstored: WatchEvent[] = [];

  constructor(private readonly options: PipelineOptions) {}

  /** Restores every unit and replays the journal since. */
  start(): void {
    if (this.running) return;
    this.running = true;
    const { runners, journal } = this.options;
    this.liveFrom = journal.lastSeq + 1;
    for (const runner of runners) restoreRunner(runner, this.options);
    this.seq = Math.min(journal.lastSeq, ...runners.map((runner) => runner.seq));
    this.page = [];
    this.onPage = 0;
    // A stop may have come amid the scans of a long gap.
    this.busy = [...runners];
    this.kick();
  }

  /** Ends after the scan at hand and saves every unit. */
  stop(): void {
    if (!this.running) return;
    this.running = false;
    if (this.scheduled) clearImmediate(this.scheduled);
    this.scheduled = null;
    if (this.retry) clearTimeout(this.retry);
    this.retry = null;
    for (const runner of this.options.runners) this.save(runner, true);
    for (const resolve of this.idle.splice(0)) resolve();
  }

  /** To be called when the journal has grown. */
  kick(): void {
    if (!this.running || this.scheduled) return;
    this.scheduled = setImmediate(() => this.slice());
  }

  /** Closes what is past its deadline, unless there are readings still to be considered. */
  closeDue(): void {
    if (!this.running || this.backlog > 0) return;
    const { journal, runners, steady, clock } = this.options;
    const steady_ms = steady.now();
    for (const runner of runners) {
      const index = runner.due(steady_ms);
      if (index === null) continue;
      try {
        journal.appendClose(runner.unit.id, index, Math.floor(clock.now()));
      } catch (thrown) {
        this.storeFailed('journal_failures', thrown);
        return;
      }
    }
    this.kick();
  }

  /** Entries that are in the journal but not in the estimates. */
  get backlog(): number {
    return this.options.journal.lastSeq - this.seq + this.busy.length;
  }

  /** Why a unit's last scan could not be taken in, by unit. */
  get failures(): ReadonlyMap<string, string> {
    return this.failing;
  }

  /** Why the journal or the history could not be read or written the last time, null if they could. */
  get trouble(): string | null {
    return this.storeTrouble;
  }

  /** Resolves when everything in the journal is in the estimates. */
  caughtUp(): Promise<void> {
    if (this.backlog === 0) return Promise.resolve();
    return new Promise((resolve) => this.idle.push(resolve));
  }

  private slice(): void {
    this.scheduled = null;
    const end = performance.now() + SLICE_MS;
    while (this.running && performance.now() < end) {
      if (this.busy.length > 0) this.stepBusy();
      else if (!this.takeNext()) {
        this.rest();
        return;
      }
    }
    this.kick();
  }

  /** Nothing to do now, or, with a backlog, a journal that cannot be read. */
  private rest(): void {
    if (this.backlog > 0) this.retry ??= setTimeout(() => this.tryAgain(), RETRY_MS);
    else for (const resolve of this.idle.splice(0)) resolve();
  }

  private tryAgain(): void {
    this.retry = null;
    this.kick();
  }

  /** Takes the next entry in; false where there is none. */
  private takeNext(): boolean {
    if (this.onPage >= this.page.length) {
      this.page = this.readPage();
      this.onPage = 0;
    }
    const entry = this.page[this.onPage++];
    if (!entry) return false;
    const { runners, counters, notices, steady } = this.options;
    this.seq = entry.seq;
    const runner = runners.find(({ unit }) => unit.id === entry.unit);
    const isLive = entry.seq >= this.liveFrom;
    const fate = runner ? runner.take(entry, steady.now()) : 'unconfigured';
    if (fate !== null && isLive) {
      counters.add(fate);
      if (fate === 'late' || fate === 'future' || fate === 'unconfigured') {
        notices.warn(fate, describe(entry, fate));
      }
    }
    if (runner) this.busy.push(runner);
    return true;
  }

  private readPage(): JournalEntry[] {
    try {
      return this.options.journal.read(this.seq, PAGE);
    } catch (thrown) {
      this.storeFailed('journal_failures', thrown);
      return [];
    }
  }

  /** One scan of a unit that has closed ones, or the end of them. */
  private stepBusy(): void {
    const runner = this.busy.at(-1)!;
    const { counters } = this.options;
    const skipped = runner.skippedScans;
    try {
      const step = runner.step();
      if (!step) {
        this.busy.pop();
        return;
      }
      counters.add('scans');
      counters.add(step.closed.cause === 'complete' ? 'scans_complete' : 'scans_deadline');
      if (step.closed.reported === 0) counters.add('scans_empty');
      counters.add('scans_skipped', runner.skippedScans - skipped);
      if (step.step.counts) counters.addScan(step.step.counts);
      this.failing.delete(runner.unit.id);
      this.enter(runner, step);
    } catch (thrown) {
      this.failed(runner, thrown);
    }
  }

  private enter(runner: UnitRunner, step: RunnerStep): void {
    const { history, counters, stepped, event, alarmsMoved } = this.options;
    const { estimate, profile, events, cycle, watch } = step.step;
    const time_ms = Date.parse(estimate.time);
    try {
      const news = history.write(() => {
        const isNew = history.estimates.add(runner.unit, estimate, step.measured);
        if (profile) history.profiles.add(profile);
        if (cycle) history.cycles.add(cycle);
        if (watch) history.watch.add(watch);
        // A scan that is known, as in a replay after a restart, has moved its alarms already.
        const moved = isNew && history.alarms.scan(runner.unit.id, estimate.mode, time_ms);
        const late = this.unstored.filter((one) => history.events.add(one));
        return { isNew, moved, late, events: events.filter((one) => history.events.add(one)) };
      });
      this.storeTrouble = null;
      this.unstored = [];
      for (const unit of new Set(news.late.map((one) => one.unit))) alarmsMoved(unit);
      if (news.isNew) stepped(runner, step);
      for (const one of news.events) event(one);
      if (news.moved) alarmsMoved(runner.unit.id);
    } catch (thrown) {
      // What cannot be stored is said all the same, and stored with the next scan that can be.
      this.storeFailed('history_failures', thrown);
      this.unstored.push(...events);
      counters.add('events_lost', this.unstored.splice(MOST_UNSTORED).length);
      stepped(runner, step);
      for (const one of events) event(one);
    }
    this.checkpointIfDue(runner, time_ms);
  }

  private checkpointIfDue(runner: UnitRunner, time_ms: number): void {
    const due = this.nextCheckpoint.get(runner.unit.id);
    if (due !== undefined && time_ms < due && !runner.unsaved) return;
    this.nextCheckpoint.set(runner.unit.id, time_ms + this.options.checkpoint_every_ms);
    // The first of this process would only repeat the one that it was restored from.
    if (due !== undefined || runner.unsaved) this.save(runner);
  }

  /** @param last with the newest profile, which is shown until the next start has its own */
  private save(runner: UnitRunner, last = false): void {
    const { history } = this.options;
    const checkpoint = runner.checkpoint();
    if (!checkpoint) return;
    try {
      history.write(() => {
        history.checkpoints.add(runner.unit, checkpoint);
        runner.unsaved = false;
        if (last && runner.view.profile) history.profiles.add(runner.view.profile, true);
      });
    } catch (thrown) {
      this.storeFailed('history_failures', thrown);
    }
  }

  /** `KIND/SUBJECT` of what the unit's estimator has raised. */
  private standingOf(unit: string): ReadonlySet<string> {
    try {
      const events = this.options.history.alarms.active(unit);
      const own = events.filter(({ kind }) => kind !== 'database_unreachable');
      return new Set(own.map(({ kind, subject }) => `${kind}/${subject}`));
    } catch (thrown) {
      this.storeFailed('history_failures', thrown);
      return new Set();
    }
  }

  private storeFailed(kind: 'journal_failures' | 'history_failures', thrown: unknown): void {
    this.storeTrouble = reasonOf(thrown);
    this.options.counters.add(kind);
    this.options.notices.warn(kind, this.storeTrouble);
  }

  private failed(runner: UnitRunner, thrown: unknown): void {
    const { counters, notices, history } = this.options;
    counters.add('scan_failures');
    this.failing.set(runner.unit.id, reasonOf(thrown));
    notices.warn(
      `scan_failures ${runner.unit.id}`,
      `unit ${runner.unit.id}: a scan could not be taken in: ${reasonOf(thrown)}`,
    );
    const standing = this.standingOf(runner.unit.id);
    try {
      runner.recover(history.checkpoints.list(runner.unit)[0], standing);
    } catch {
      runner.recover(undefined, standing);
    }
  }
}

function describe(entry: JournalEntry, fate: string): string {
  if (entry.kind === 'close') return `close mark of unit ${entry.unit}`;
  const time = new Date(entry.time_ms).toISOString();
  const behind_s = (entry.arrival_ms - entry.time_ms) / 1000;
  const why = {
    late: `came ${behind_s.toFixed(1)} s after its source time, when its scan was closed`,
    future: `is stamped ${(-behind_s).toFixed(1)} s ahead of this machine's clock`,
  }[fate];
  return `${entry.unit}, ${entry.channel}: the reading of ${time} ${why ?? 'has no such channel now'}`;
}
