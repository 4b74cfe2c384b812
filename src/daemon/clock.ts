/** The daemon's idea of time. Nothing of it reaches the core: scans carry source times. */
export interface DaemonClock {
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** How much faster than the machine's own clock it runs; 1 but in the demonstration. */
  readonly speed: number;
}

export const wallClock: DaemonClock = { now: () => Date.now(), speed: 1 };

/** A clock that starts at `start_ms` and runs `speed` times as fast as the machine's. */
export function fastClock(start_ms: number, speed: number): DaemonClock {
  const started = performance.now();
  return { now: () => start_ms + (performance.now() - started) * speed, speed };
}

/**
 * Counts time for deadlines in steps of a tick, none longer than `longest_step_ms`: while the
 * process was stopped or busy, messages waited in the socket, and a scan must not be closed before
 * they have been read.
 */
export class SteadyClock {
  private last = performance.now();
  private count_ms = 0;

  constructor(
    private readonly speed: number,
    private readonly longest_step_ms: number,
  ) {}

  /** Time counted so far [ms]. */
  now(): number {
    const now = performance.now();
    this.count_ms += Math.min(now - this.last, this.longest_step_ms) * this.speed;
    this.last = now;
    return this.count_ms;
  }
}
