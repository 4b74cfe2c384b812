import type { UnitDefinition } from '../definitions.js';

/** Clocks on earth are set from 12 hours behind UTC to 14 ahead; a day off is yesterday sent once more. */
const MOST_H = 14;
const HOUR_MS = 3_600_000;
/** How far a stamp may be from the whole hour, at least and at most [ms]; else the scan period. */
const NEAR_LEAST_MS = 60_000;
const NEAR_MOST_MS = 300_000;
/** Readings in a row with the same hours that make it a clock, not a delivery of what was stored. */
const ENOUGH = 3;

/** A channel whose clock is off by whole hours. */
export interface ZoneFinding {
  /** Index into unit.channels. */
  readonly channel: number;
  /** Positive: its readings are stamped ahead. */
  readonly hours: number;
}

/** Structured-cloneable; by index of unit.channels. */
export interface ZoneState {
  /** Whole hours by which the last readings were off, 0 = none. */
  readonly hours: Float64Array;
  /** How many in a row. */
  readonly run: Float64Array;
  /** When the last of them that counted came [ms]. */
  readonly arrival_ms: Float64Array;
}

/**
 * Tells a source whose clock is set to another time zone from one that delivers late: its readings
 * come one by one, as those of the others do, and each is off by the same whole number of hours, to
 * this machine's clock or to the newest reading of the unit. A gateway that delivers what it has stored
 * sends it faster than it was measured. What is told is a function of the readings alone.
 */
export class ZoneWatch {
  private readonly near_ms: number;
  private readonly apart_ms: number;
  private state: ZoneState;

  constructor(unit: Pick<UnitDefinition, 'scan_period_s' | 'channels'>) {
    const period_ms = unit.scan_period_s * 1000;
    this.near_ms = Math.min(NEAR_MOST_MS, Math.max(NEAR_LEAST_MS, period_ms));
    this.apart_ms = period_ms / 2;
    const { length } = unit.channels;
    this.state = {
      hours: new Float64Array(length),
      run: new Float64Array(length),
      arrival_ms: new Float64Array(length).fill(Number.NEGATIVE_INFINITY),
    };
  }

  /** A reading of a channel that has its place: the clock is right. */
  clear(channel: number): void {
    this.state.run[channel] = 0;
    this.state.hours[channel] = 0;
  }

  /**
   * A reading that came late or is stamped ahead.
   *
   * @param newest_ms source time of the unit's newest reading; null: there is none
   * @returns whether its channel's clock is found to be off by whole hours, this one included
   */
  look(channel: number, time_ms: number, arrival_ms: number, newest_ms: number | null): boolean {
    const { hours, run, arrival_ms: arrivals } = this.state;
    const off = this.hoursOff(time_ms, arrival_ms, newest_ms);
    if (off === 0) {
      this.clear(channel);
      return false;
    }
    if (off !== hours[channel]) {
      hours[channel] = off;
      run[channel] = 1;
      arrivals[channel] = arrival_ms;
    } else if (arrival_ms - arrivals[channel]! >= this.apart_ms) {
      run[channel] = run[channel]! + 1;
      arrivals[channel] = arrival_ms;
    }
    return run[channel]! >= ENOUGH;
  }

  /** Whether a reading is off by the hours that its channel's clock was found to be off by. */
  isOff(channel: number, time_ms: number, arrival_ms: number, newest_ms: number | null): boolean {
    const { hours, run } = this.state;
    if (run[channel]! < ENOUGH) return false;
    return this.hoursOff(time_ms, arrival_ms, newest_ms) === hours[channel];
  }

  /** A channel may turn out to be off with its next readings. */
  get isInDoubt(): boolean {
    return this.state.run.some((run) => run > 0 && run < ENOUGH);
  }

  get findings(): ZoneFinding[] {
    const { hours, run } = this.state;
    return [...run].flatMap((count, channel) =>
      count >= ENOUGH ? [{ channel, hours: hours[channel]! }] : [],
    );
  }

  save(): ZoneState {
    return structuredClone(this.state);
  }

  /** Puts back what `save` gave; that of other channels is misuse. */
  restore(state: ZoneState): void {
    const { length } = this.state.run;
    if (state.run.length !== length) {
      throw new RangeError(`state must be of ${length} channels, got ${state.run.length}`);
    }
    this.state = structuredClone(state);
  }

  /** Whole hours by which a stamp is off; 0 where it is not off by any, or by no whole number. */
  private hoursOff(time_ms: number, arrival_ms: number, newest_ms: number | null): number {
    for (const now_ms of newest_ms === null ? [arrival_ms] : [arrival_ms, newest_ms]) {
      const hours = Math.round((time_ms - now_ms) / HOUR_MS);
      if (hours === 0 || Math.abs(hours) > MOST_H) continue;
      if (Math.abs(time_ms - now_ms - hours * HOUR_MS) <= this.near_ms) return hours;
    }
    return 0;
  }
}
