import type { History } from '../adapters/history/history.js';
import type { Journal } from '../adapters/history/journal.js';
import type { SiteConfig } from '../config/site.js';
import { reasonOf } from '../errors.js';
import type { DaemonClock } from './clock.js';
import type { ClockSteps } from './clockSteps.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';
import type { Pipeline } from './pipeline.js';
import type { Rewinder } from './rewind/rewinder.js';

export interface HousekeepingOptions {
  readonly site: SiteConfig;
  readonly journal: Journal;
  readonly history: History;
  readonly pipeline: Pipeline;
  readonly rewinder: Rewinder;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly poll_ms: number;
  /** null: the clock is not the machine's own. */
  readonly steps: ClockSteps | null;
  /** Cursor of the forwarder; Infinity where there is none. */
  forwarded(): number;
  /** Newest source time of all units, as far as it is trusted [ms]; -Infinity before the first. */
  newest_ms(): number;
}

const RETENTION_EVERY_MS = 3_600_000;
/** Between two days of an older history that are rolled up [ms]. */
const ROLL_UP_EVERY_MS = 1000;
const DAY_MS = 86_400_000;
/** Entries of the journal deleted at a time. */
const FORGET_ENTRIES = 20_000;
/** Between two pieces of what is thinned and deleted, while there are more [ms]. */
const PIECE_EVERY_MS = 1000;

/** What the clock does: scans closed at their deadline, old rows rolled up and deleted. */
export class Housekeeping {
  private timers: NodeJS.Timeout[] = [];
  private rolling: NodeJS.Timeout | null = null;
  private working: NodeJS.Timeout | null = null;
  private mayClose = false;

  constructor(private readonly options: HousekeepingOptions) {}

  start(): void {
    const { site, clock, poll_ms } = this.options;
    const patience_s = Math.max(...site.units.map((unit) => unit.watch.data_age_s.limit));
    const patience_ms = (patience_s * 1000) / Math.max(1, clock.speed);
    this.timers = [
      setInterval(() => this.closeDue(), poll_ms),
      setInterval(() => this.retain(), RETENTION_EVERY_MS),
      setTimeout(() => this.allowClosing(), patience_ms),
    ];
    this.rolling = setTimeout(() => this.rollUp(), ROLL_UP_EVERY_MS);
  }

  stop(): void {
    for (const timer of this.timers) clearTimeout(timer);
    this.timers = [];
    if (this.rolling) clearTimeout(this.rolling);
    this.rolling = null;
    if (this.working) clearTimeout(this.working);
    this.working = null;
  }

  /**
   * From here on scans are closed by the clock: once the broker can bring what it kept while
   * rockhour was away, or has not been there for as long as data may be old.
   */
  allowClosing(): void {
    this.mayClose = true;
  }

  private closeDue(): void {
    this.options.steps?.look();
    if (!this.mayClose) return;
    this.options.pipeline.closeDue();
    this.options.rewinder.poll();
  }

  /** What an older version stored is rolled up beside the scans; then there is nothing for an hour. */
  private rollUp(): void {
    const { history, counters, notices } = this.options;
    let goesOn = false;
    try {
      goesOn = history.rollUp();
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      notices.warn('history_failures', reasonOf(thrown));
    }
    const wait_ms = goesOn ? ROLL_UP_EVERY_MS : RETENTION_EVERY_MS;
    this.rolling = setTimeout(() => this.rollUp(), wait_ms);
  }

  private retain(): void {
    const { history, counters, notices, forwarded } = this.options;
    const { now_ms } = this;
    if (now_ms === Number.NEGATIVE_INFINITY) return;
    try {
      const { estimates, offers, not_forwarded } = history.retain(now_ms, forwarded());
      counters.add('estimates_thinned', estimates);
      counters.add('offers_removed', offers);
      counters.add('estimates_not_forwarded', not_forwarded);
      this.options.rewinder.forgetOld();
      this.working ??= setTimeout(() => this.workOff(), PIECE_EVERY_MS);
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      notices.warn('history_failures', reasonOf(thrown));
    }
  }

  /**
   * Ages are held against the newest reading where this machine's clock is ahead of it: one that was set
   * years ahead would have all that is kept deleted.
   */
  private get now_ms(): number {
    const { clock, newest_ms } = this.options;
    return Math.floor(Math.min(clock.now(), newest_ms()));
  }

  /** In pieces, as many as there are: two hundred units bring millions of readings an hour. */
  private workOff(): void {
    this.working = null;
    const [isMoreToThin, isMoreToForget] = [this.thin(), this.forgetReadings()];
    if (isMoreToThin || isMoreToForget)
      this.working = setTimeout(() => this.workOff(), PIECE_EVERY_MS);
  }

  private thin(): boolean {
    const { history, counters, notices, forwarded } = this.options;
    try {
      const { rows, more } = history.thin(this.now_ms, forwarded());
      counters.add('estimates_thinned', rows);
      return more;
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      notices.warn('history_failures', reasonOf(thrown));
      return false;
    }
  }

  private forgetReadings(): boolean {
    const { site, history, journal, counters, notices } = this.options;
    try {
      const old = journal.seqBefore(this.now_ms - site.store.keep_readings_days * DAY_MS);
      const covered = history.checkpoints.coveredSeq(site.units.map((unit) => unit.id));
      return journal.forget(Math.min(old, covered), FORGET_ENTRIES) === FORGET_ENTRIES;
    } catch (thrown) {
      counters.add('journal_failures');
      counters.failed(thrown);
      notices.warn('journal_failures', reasonOf(thrown));
      return false;
    }
  }
}
