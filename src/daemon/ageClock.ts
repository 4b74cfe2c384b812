import type { History } from '../adapters/history/history.js';
import type { DaemonClock } from './clock.js';

export interface AgeClockOptions {
  readonly history: Pick<History, 'kept' | 'keep'>;
  readonly clock: DaemonClock;
  /** Newest source time of all units [ms]; -Infinity before the first. */
  newest_ms(): number;
  /** Counts time in this process, and is never set [ms]. */
  counted(): number;
  /** It could not be read or kept. */
  failed(thrown: unknown): void;
}

/** So much faster than time passes may it go. */
const FASTEST = 2;
/** Kept over restarts each time that it has come so far [ms]. */
const KEEP_EVERY_MS = 600_000;
const NAME = 'ages are held against';

/**
 * The time that ages of what is kept are held against: the newest reading's, never ahead of this machine's
 * clock. Where both come ahead at once, be it of one unit among many, it follows no faster than twice as
 * fast as time passes, over restarts too: clocks that are years ahead for an hour cost what is an hour
 * younger than all that may go, not all there is. After an outage, in which nothing came, it is behind and
 * catches up: what is kept meanwhile is no more than before.
 */
export class AgeClock {
  private at: { readonly time_ms: number; readonly counted_ms: number } | null = null;
  private kept_ms: number | null = null;

  constructor(private readonly options: AgeClockOptions) {}

  /** [ms]; -Infinity where it is not known, and nothing is old. Never throws. */
  now(): number {
    const { clock, newest_ms, failed } = this.options;
    const told_ms = Math.floor(Math.min(clock.now(), newest_ms()));
    if (!Number.isFinite(told_ms) || clock.isWall !== true) return told_ms;
    try {
      this.at ??= this.begin(told_ms);
    } catch (thrown) {
      failed(thrown);
      return Number.NEGATIVE_INFINITY;
    }
    const counted_ms = this.options.counted();
    const most_ms = this.at.time_ms + FASTEST * (counted_ms - this.at.counted_ms);
    const time_ms = Math.min(told_ms, Math.floor(most_ms));
    this.at = { time_ms, counted_ms };
    this.keep(time_ms);
    return time_ms;
  }

  private begin(told_ms: number) {
    const { history, counted } = this.options;
    this.kept_ms = history.kept(NAME);
    return { time_ms: this.kept_ms ?? told_ms, counted_ms: counted() };
  }

  private keep(time_ms: number): void {
    const { history, failed } = this.options;
    if (this.kept_ms !== null && Math.abs(time_ms - this.kept_ms) < KEEP_EVERY_MS) return;
    try {
      history.keep(NAME, time_ms);
      this.kept_ms = time_ms;
    } catch (thrown) {
      failed(thrown);
    }
  }
}
