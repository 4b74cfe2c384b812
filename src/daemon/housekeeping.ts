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
}

const RETENTION_EVERY_MS = 3_600_000;
/** Between two days of an older history that are rolled up [ms]. */
const ROLL_UP_EVERY_MS = 1000;
const DAY_MS = 86_400_000;

/** What the clock does: scans closed at their deadline, old rows rolled up and deleted. */
export class Housekeeping {
  private timers: NodeJS.Timeout[] = [];
  private rolling: NodeJS.Timeout | null = null;
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
    const { site, history, journal, clock, counters, notices, forwarded } = this.options;
    const now_ms = Math.floor(clock.now());
    try {
      const { estimates, offers, not_forwarded } = history.retain(now_ms, forwarded());
      counters.add('estimates_thinned', estimates);
      counters.add('offers_removed', offers);
      counters.add('estimates_not_forwarded', not_forwarded);
      const old = journal.seqBefore(now_ms - site.store.keep_readings_days * DAY_MS);
      const covered = history.checkpoints.coveredSeq(site.units.map((unit) => unit.id));
      journal.forget(Math.min(old, covered));
      this.options.rewinder.forgetOld();
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      notices.warn('history_failures', reasonOf(thrown));
    }
  }
}
