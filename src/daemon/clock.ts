/** The daemon's idea of time. Nothing of it reaches the core: scans carry source times. */
export interface DaemonClock {
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** About how much faster than the machine's own clock it runs; 0 where only readings move it. */
  readonly speed: number;
  /** It is the machine's own, which somebody may set. */
  readonly isWall?: boolean;
}

export const wallClock: DaemonClock = { now: () => Date.now(), speed: 1, isWall: true };

/** A clock that starts at `start_ms` and runs `speed` times as fast as the machine's. */
export function fastClock(start_ms: number, speed: number): DaemonClock {
  const started = performance.now();
  return { now: () => start_ms + (performance.now() - started) * speed, speed };
}

/**
 * The clock of a simulated plant: at each of its steps it shows the step's time, and between them
 * it runs `speed` times as fast as the machine's, but no further than one step ahead. A machine
 * too slow for the speed asked for slows the plant's clock down instead of running away from it.
 */
export class PacedClock implements DaemonClock {
  private stepped_at = performance.now();

  constructor(
    private time_ms: number,
    private readonly step_ms: number,
    readonly speed: number,
  ) {}

  now(): number {
    const ahead_ms = (performance.now() - this.stepped_at) * this.speed;
    return this.time_ms + Math.min(ahead_ms, this.step_ms);
  }

  /** The plant has come to this time. */
  step(time_ms: number): void {
    this.time_ms = time_ms;
    this.stepped_at = performance.now();
  }

  /** Until the next step is due [ms of the machine's clock]. */
  get wait_ms(): number {
    if (this.speed === 0) return 0;
    return Math.max(0, this.step_ms / this.speed - (performance.now() - this.stepped_at));
  }
}

/**
 * Counts time for deadlines in steps, none longer than `longest_step_ms`: while the process was
 * stopped or busy, messages waited in the socket, and a scan must not be closed before they have
 * been read. A clock that is set back or far ahead moves it by no more than that either.
 */
export class SteadyClock {
  private last_ms: number;
  private count_ms = 0;

  /** @param longest_step_ms in the time of `clock` */
  constructor(
    private readonly clock: DaemonClock,
    private readonly longest_step_ms: number,
  ) {
    this.last_ms = clock.now();
  }

  /** Time counted so far [ms]. */
  now(): number {
    const now_ms = this.clock.now();
    this.count_ms += Math.min(Math.max(0, now_ms - this.last_ms), this.longest_step_ms);
    this.last_ms = now_ms;
    return this.count_ms;
  }
}
