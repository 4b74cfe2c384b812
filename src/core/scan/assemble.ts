import type { UnitDefinition } from '../definitions.js';
import { requireNotNegative, requirePositive } from '../misuse.js';
import { type HoldState, hold, startHold } from './hold.js';
import type { Scan } from './scan.js';

/** One reading as it stands in the journal; `value` in SI units, NaN = bad or missing. */
export interface Reading {
  /** Index into `unit.channels`. */
  readonly channel: number;
  readonly time_ms: number;
  readonly arrival_ms: number;
  readonly value: number;
}

export interface AssemblerOptions {
  /** How long after its nominal end a scan waits for missing readings [ms]. */
  readonly deadline_ms: number;
  /** A source time further ahead of its arrival than this is not believed [ms]. */
  readonly future_tolerance_ms: number;
  /** A longer gap is bridged by one scan at its end instead of one per period [scans]. */
  readonly longest_gap_scans: number;
}

/**
 * What became of a reading. `taken`: it stands in its scan. `repeated`: same channel and source
 * time as before in this scan, the later one stands. `out_of_order`: older than one of its channel
 * that came before; it stands only where its scan has no newer one. `surplus`: its scan was closed
 * and had one of this channel already. `late`: its scan was closed without it. `carried`: its scan
 * was closed just before, but the channel reports by exception and this is the newest of it: it holds
 * from the next scan on. `future`: its source time lies beyond the tolerance. `dateless`: its source
 * has lost its date. `wrong_zone`: the clock of its source is off by whole hours, see ZoneWatch.
 * `clock_back`: it is live by the machine's clock, and the unit stands further ahead: it waits until it is
 * sure that the clocks were wrong before; the daemon alone says so.
 */
export const READING_FATES = [
  'taken',
  'repeated',
  'out_of_order',
  'surplus',
  'late',
  'carried',
  'future',
  'dateless',
  'wrong_zone',
  'clock_back',
] as const;
export type ReadingFate = (typeof READING_FATES)[number];

/**
 * No clock stands before this but one that has lost its date and counts from 1970, 1980 or 2000 [ms];
 * it is older than this program.
 */
export const LEAST_DATE_MS = Date.UTC(2020, 0, 1);

type Stamps = Pick<Reading, 'time_ms' | 'arrival_ms'>;

/** Whether this machine's clock had lost its date when a dated reading came: its word is then no measure. */
export function isMachineDateless({ time_ms, arrival_ms }: Stamps): boolean {
  return arrival_ms < LEAST_DATE_MS && time_ms >= LEAST_DATE_MS;
}

/** Whether a reading is stamped further ahead of its arrival than is believed. */
export function isFuture(stamps: Stamps, tolerance_ms: number): boolean {
  return stamps.time_ms > stamps.arrival_ms + tolerance_ms && !isMachineDateless(stamps);
}

/** What a reading tells of the plant's time: its source time, but never more than its arrival [ms]. */
export function believedTime(stamps: Stamps): number {
  return isMachineDateless(stamps) ? stamps.time_ms : Math.min(stamps.time_ms, stamps.arrival_ms);
}

/** Why a scan was closed: all periodic channels had spoken, or its time was over. */
export type CloseCause = 'complete' | 'deadline';

export interface ClosedScan {
  readonly scan: Scan;
  readonly index: number;
  readonly cause: CloseCause;
  /** Channels that brought a reading, bad ones included. */
  readonly reported: number;
}

/** Last step of each scan before it is handed out, in place: what needs several channels at once. */
export type FinishScan = (values: Float64Array) => void;

interface Slot {
  values: Float64Array;
  times: Float64Array;
  reported: number;
  periodic: number;
  newest_ms: number;
}

/** Structured-cloneable image of an Assembler. */
export interface AssemblerSnapshot {
  readonly version: 1;
  readonly channels: readonly string[];
  readonly period_ms: number;
  readonly next: number | null;
  readonly close_to: number;
  readonly newest_ms: number;
  readonly newest_by_channel: Float64Array;
  readonly last_index: Float64Array;
  readonly slots: ReadonlyArray<readonly [number, Slot]>;
  readonly skipped: number;
  readonly hold: HoldState;
}

/**
 * Makes the scans of one unit from its readings. Scan i holds the source times
 * [i*period, (i+1)*period), its time is the newest source time among its readings, or i*period
 * where it has none. Scans close in order: when every periodic channel has spoken, when a reading
 * at or past (i+1)*period + deadline has come, or when the caller, who alone has a clock, closes
 * them by `closeThrough`. What comes out is a function of the sequence of calls alone.
 *
 * A reading stamped ahead of its arrival waits in its scan and closes none before its arrival would:
 * one gateway whose clock is fast must not shut out the readings of the others.
 *
 * Memory is bounded: an open scan is never older than deadline + period before the newest reading, nor
 * further ahead of it than the tolerance.
 */
export class Assembler {
  private readonly period_ms: number;
  private readonly isPeriodic: readonly boolean[];
  private readonly periodicCount: number;
  private next: number | null = null;
  private closeTo = Number.NEGATIVE_INFINITY;
  private newest_ms = Number.NEGATIVE_INFINITY;
  private newestByChannel: Float64Array;
  /** Index of the newest scan in which a channel stands. */
  private lastIndex: Float64Array;
  private slots = new Map<number, Slot>();
  private skipped = 0;
  private holdState: HoldState;

  /** @param finish last step on the values of each scan, such as millivolts to kelvin */
  constructor(
    private readonly unit: UnitDefinition,
    private readonly options: AssemblerOptions,
    private readonly finish: FinishScan | null = null,
  ) {
    this.period_ms = requirePositive('unit.scan_period_s', unit.scan_period_s) * 1000;
    requireNotNegative('options.deadline_ms', options.deadline_ms);
    requireNotNegative('options.future_tolerance_ms', options.future_tolerance_ms);
    requirePositive('options.longest_gap_scans', options.longest_gap_scans);
    this.isPeriodic = unit.channels.map((channel) => channel.reporting.kind === 'periodic');
    this.periodicCount = this.isPeriodic.filter(Boolean).length;
    this.newestByChannel = new Float64Array(unit.channels.length).fill(Number.NEGATIVE_INFINITY);
    this.lastIndex = new Float64Array(unit.channels.length).fill(Number.NEGATIVE_INFINITY);
    this.holdState = startHold(unit);
  }

  /** Newest source time so far, none later than its arrival [ms]; null before the first. */
  get newest(): number | null {
    return Number.isFinite(this.newest_ms) ? this.newest_ms : null;
  }

  /** Index of the oldest scan that is not handed out; null before the first reading. */
  get openFrom(): number | null {
    return this.next;
  }

  /** Index from which on no scan has a reading yet; null before the first reading. */
  get untouchedFrom(): number | null {
    return this.next === null
      ? null
      : Math.max(this.next, ...[...this.slots.keys()].map((i) => i + 1));
  }

  /** Scans left out because a gap was longer than `longest_gap_scans`. */
  get skippedScans(): number {
    return this.skipped;
  }

  /** Takes one reading in and says what became of it. */
  add(reading: Reading): ReadingFate {
    const { channel, time_ms } = reading;
    if (!Number.isInteger(channel) || channel < 0 || channel >= this.unit.channels.length) {
      throw new RangeError(`reading.channel must be an index into unit.channels, got ${channel}`);
    }
    if (!Number.isSafeInteger(time_ms)) {
      throw new RangeError(`reading.time_ms must be whole milliseconds, got ${time_ms}`);
    }
    if (isFuture(reading, this.options.future_tolerance_ms)) return 'future';
    if (time_ms < LEAST_DATE_MS && reading.arrival_ms >= LEAST_DATE_MS) return 'dateless';
    const index = Math.floor(time_ms / this.period_ms);
    const believed_ms = believedTime(reading);
    const isFast = time_ms - believed_ms > this.period_ms;
    this.next ??= isFast ? Math.floor(believed_ms / this.period_ms) : index;
    if (index < this.next) return this.takeBehind(reading, index);
    const slot = this.slot(index);
    const before = slot.times[channel]!;
    if (time_ms < before) return 'out_of_order';
    const older = time_ms < this.newestByChannel[channel]!;
    if (Number.isNaN(before)) {
      slot.reported++;
      if (this.isPeriodic[channel]) slot.periodic++;
    }
    slot.values[channel] = reading.value;
    slot.times[channel] = time_ms;
    slot.newest_ms = Math.max(slot.newest_ms, time_ms);
    this.lastIndex[channel] = Math.max(this.lastIndex[channel]!, index);
    this.newestByChannel[channel] = Math.max(this.newestByChannel[channel]!, time_ms);
    if (believed_ms > this.newest_ms) {
      this.newest_ms = believed_ms;
      this.closeTo = Math.max(this.closeTo, this.overAt(believed_ms));
    }
    if (time_ms === before) return 'repeated';
    return older ? 'out_of_order' : 'taken';
  }

  /** Index of the last scan that is past its deadline at the plant's time, null if none is open. */
  due(plant_ms: number): number | null {
    if (this.next === null) return null;
    const over = this.overAt(plant_ms);
    return over >= this.next && over > this.closeTo ? over : null;
  }

  /** Closes all scans up to and including this index; `take` hands them out. */
  closeThrough(index: number): void {
    if (!Number.isSafeInteger(index)) {
      throw new RangeError(`index must be a whole number, got ${index}`);
    }
    if (this.next !== null) this.closeTo = Math.max(this.closeTo, index);
  }

  /** The next scan that is closed, null where the next one is still open. */
  take(): ClosedScan | null {
    if (this.next === null) return null;
    const complete = this.isComplete(this.slots.get(this.next));
    if (!complete && this.next > this.closeTo) return null;
    this.skipGap();
    const index = this.next;
    const slot = this.slots.get(index);
    this.slots.delete(index);
    this.next = index + 1;
    const { length } = this.unit.channels;
    const time_ms = slot ? slot.newest_ms : Math.round(index * this.period_ms);
    const values = slot ? slot.values : new Float64Array(length).fill(Number.NaN);
    const heard = Uint8Array.from({ length }, (_, i) =>
      slot === undefined || Number.isNaN(slot.times[i]!) ? 0 : 1,
    );
    const held = hold(this.unit, this.holdState, time_ms, values, heard);
    this.finish?.(values);
    const cause = complete ? 'complete' : 'deadline';
    return { scan: { time_ms, values, held }, index, cause, reported: slot?.reported ?? 0 };
  }

  save(): AssemblerSnapshot {
    return structuredClone({
      version: 1,
      channels: this.unit.channels.map((channel) => channel.id),
      period_ms: this.period_ms,
      next: this.next,
      close_to: this.closeTo,
      newest_ms: this.newest_ms,
      newest_by_channel: this.newestByChannel,
      last_index: this.lastIndex,
      slots: [...this.slots],
      skipped: this.skipped,
      hold: this.holdState,
    } satisfies AssemblerSnapshot);
  }

  /** Puts back what `save` gave; a snapshot of other channels or another period is misuse. */
  restore(snapshot: AssemblerSnapshot): void {
    const channels = this.unit.channels.map((channel) => channel.id).join(' ');
    if (snapshot.version !== 1 || snapshot.channels.join(' ') !== channels) {
      throw new RangeError(
        `snapshot must be of version 1 with the channels of unit ${this.unit.id}, got version ` +
          `${snapshot.version} with ${snapshot.channels.length} channels`,
      );
    }
    if (snapshot.period_ms !== this.period_ms) {
      throw new RangeError(
        `snapshot.period_ms must be ${this.period_ms}, got ${snapshot.period_ms}`,
      );
    }
    const copy = structuredClone(snapshot);
    this.next = copy.next;
    this.closeTo = copy.close_to;
    this.newest_ms = copy.newest_ms;
    this.newestByChannel = copy.newest_by_channel;
    this.lastIndex = copy.last_index;
    this.slots = new Map(copy.slots);
    this.skipped = copy.skipped;
    this.holdState = copy.hold;
  }

  /**
   * A reading whose scan is closed. A change that a channel told by exception is not lost with its
   * scan: complete scans close before their time is over, and silence after it means that it holds.
   */
  private takeBehind({ channel, time_ms, value }: Reading, index: number): ReadingFate {
    const isExceptional = this.unit.channels[channel]!.reporting.kind === 'by_exception';
    const isNewest = time_ms > this.newestByChannel[channel]!;
    if (isExceptional && isNewest) {
      this.newestByChannel[channel] = time_ms;
      this.holdState.value[channel] = value;
      this.holdState.heard_ms[channel] = time_ms;
      const isJustNow = time_ms >= this.newest_ms - this.options.deadline_ms;
      if (isJustNow && index === this.next! - 1) return 'carried';
    }
    // Each change counts, whatever its scan has.
    return this.lastIndex[channel] === index && !isExceptional ? 'surplus' : 'late';
  }

  private isComplete(slot: Slot | undefined): boolean {
    return slot !== undefined && this.periodicCount > 0 && slot.periodic === this.periodicCount;
  }

  /** Last scan whose nominal end lies a deadline or more before `time_ms`. */
  private overAt(time_ms: number): number {
    return Math.floor((time_ms - this.options.deadline_ms) / this.period_ms) - 1;
  }

  /** Jumps to the last scan of a gap too long to tick through. */
  private skipGap(): void {
    if (this.slots.has(this.next!)) return;
    let end = this.closeTo;
    for (const index of this.slots.keys()) end = Math.min(end, index - 1);
    const from = this.next!;
    if (end - from + 1 <= this.options.longest_gap_scans) return;
    this.skipped += end - from;
    this.next = end;
  }

  private slot(index: number): Slot {
    const known = this.slots.get(index);
    if (known) return known;
    const slot: Slot = {
      values: new Float64Array(this.unit.channels.length).fill(Number.NaN),
      times: new Float64Array(this.unit.channels.length).fill(Number.NaN),
      reported: 0,
      periodic: 0,
      newest_ms: Number.NEGATIVE_INFINITY,
    };
    this.slots.set(index, slot);
    return slot;
  }
}
