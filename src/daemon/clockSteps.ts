import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';

/** A clock that is kept in time is moved by less than this at once [ms]. */
const LEAST_STEP_MS = 2000;

export interface ClockStep {
  /** Positive: forward [ms]. */
  readonly by_ms: number;
  /** Where the clock stood after it [ms since 1970]. */
  readonly at_ms: number;
}

/**
 * Sees this machine's clock being set, against one that only counts. Nothing hangs on it: scans go by
 * source times and by steady time. But a clock that is set back makes sound readings look ahead of
 * it, one that is set forward makes them look old, and whoever wonders should read why.
 */
export class ClockSteps {
  /** The newest step of this process; null: none yet. */
  last: ClockStep | null = null;
  private before: { readonly wall_ms: number; readonly counted_ms: number };

  /** @param counted a time that only counts on [ms] */
  constructor(
    private readonly clock: DaemonClock,
    private readonly counted: () => number,
    private readonly parts: { readonly counters: Counters; readonly notices: Notices },
  ) {
    this.before = { wall_ms: clock.now(), counted_ms: counted() };
  }

  /** To be called every second or so. */
  look(): void {
    const now = { wall_ms: this.clock.now(), counted_ms: this.counted() };
    const by_ms = now.wall_ms - this.before.wall_ms - (now.counted_ms - this.before.counted_ms);
    this.before = now;
    if (Math.abs(by_ms) < LEAST_STEP_MS) return;
    this.last = { by_ms, at_ms: now.wall_ms };
    this.parts.counters.add(by_ms > 0 ? 'clock_set_forward' : 'clock_set_back');
    this.parts.notices.warn('clock_set', `this machine's clock ${stepWords(this.last)}`);
  }
}

export function stepWords({ by_ms, at_ms }: ClockStep): string {
  const by_s = (Math.abs(by_ms) / 1000).toFixed(0);
  const at = new Date(at_ms).toISOString();
  return by_ms > 0
    ? `was set forward by ${by_s} s, or the machine slept so long, until ${at}`
    : `was set back by ${by_s} s to ${at}`;
}
