import type { Checkpoint, StoredCheckpoint } from '../adapters/history/checkpoints.js';
import type { JournalEntry, ReadingEntry } from '../adapters/history/journal.js';
import type { Measured } from '../adapters/history/series.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { DispatchAnswer, Estimate, ProfileView } from '../core/estimate.js';
import type { Headroom } from '../core/plan/headroom.js';
import {
  Assembler,
  type AssemblerOptions,
  believedTime,
  type ClosedScan,
  type ReadingFate,
} from '../core/scan/assemble.js';
import { voltageFinish } from '../core/scan/convert.js';
import { PlantClock } from '../core/scan/plantClock.js';
import { ZoneWatch } from '../core/scan/zones.js';
import type { ScanCounts } from '../core/scanCounts.js';
import type { UnitSnapshot, UnitState, UnitStep } from '../core/unit.js';
import type { UnitCarry } from '../core/unitCarry.js';
import { shapeOf } from '../core/unitShape.js';
import { alignWatch } from '../core/watch/align.js';
import { lostToVersion } from '../core/watch/carry.js';
import type { WatchView } from '../core/watch/causes.js';
import type { WatchEvent } from '../core/watch/event.js';
import { ClockReturn, type Numbered, type WentBack } from './clockReturn.js';
import type { Core } from './core.js';
import { measuredIn } from './measured.js';
import { type Awaited, describedImage, type RunnerImage } from './runnerImage.js';

export interface RunnerStep {
  readonly closed: ClosedScan;
  readonly step: UnitStep;
  readonly measured: Measured;
  /** The unit's clock strikes for hours, and they are to be given with `giveHours`. */
  readonly hoursDue: boolean;
}

/** When a unit does what many would do in the same scan. */
export interface RunnerPhases {
  /** Its clock strikes for hours so much later than the even times [ms]; 0: at these. */
  readonly hours_ms: number;
  /** Its turn for a rollout of the state of charge, in [0, 1); 0: whenever it wants one. */
  readonly rollout: number;
}

/** Newest of everything that a unit tells. */
export interface RunnerView {
  estimate: Estimate | null;
  profile: ProfileView | null;
  dispatch: { time: string; answers: readonly DispatchAnswer[] } | null;
  /** Of this process; null before the first. */
  headroom: { time: string; answers: readonly Headroom[] } | null;
  measured: Measured;
  /** Of the newest scan; null before the first of this process. */
  counts: ScanCounts | null;
  /** What the indicators show, and what is probably behind it. */
  watch: WatchView | null;
}

/**
 * One unit between journal and estimate: entries in, scans through the core, steps out. What comes
 * out is a function of the entries alone, so that live, after a restart and in a replay of the
 * journal it is the same.
 */
export class UnitRunner {
  readonly plantClock = new PlantClock();
  readonly view: RunnerView = {
    estimate: null,
    profile: null,
    dispatch: null,
    headroom: null,
    measured: { flow_kg_s: null, power_MW_el: null },
    counts: null,
    watch: null,
  };
  private assembler: Assembler;
  private state: UnitState;
  private readonly channelIndex: ReadonlyMap<string, number>;
  private readonly finish;
  /** When the newest entry came [ms]; null before the first of this process. */
  heard_ms: number | null = null;
  /** Entries up to this number are in the state. */
  private taken_seq = 0;
  private awaited: Awaited | null = null;
  /** A saved state was taken over, and is in no checkpoint of this definition yet. */
  unsaved = false;
  /** `INDICATOR/SUBJECT` of what was learned as healthy and lost at this start. */
  lost: readonly string[] = [];
  /** What the state has raised and not returned, by id, as it was raised. */
  private raised = new Map<string, WatchEvent>();
  private readonly zones: ZoneWatch;
  /** Knows where clocks of plant and machine were ahead together. */
  readonly clocks: ClockReturn;
  /** It has gone back, and nobody was told yet. */
  private wentBack: WentBack | null = null;
  /** The steady clock at the last entry [ms]. */
  private steady_ms = 0;

  constructor(
    readonly unit: UnitDefinition,
    private readonly core: Core,
    private readonly options: AssemblerOptions,
    private readonly phases: RunnerPhases = { hours_ms: 0, rollout: 0 },
  ) {
    this.channelIndex = new Map(unit.channels.map((channel, i) => [channel.id, i]));
    this.finish = voltageFinish(unit);
    this.assembler = new Assembler(unit, options, this.finish);
    this.state = core.startUnit(unit);
    this.zones = new ZoneWatch(unit);
    this.clocks = new ClockReturn(unit, options.future_tolerance_ms);
  }

  /** Last journal entry that is in the state. */
  get seq(): number {
    return this.taken_seq;
  }

  /** Newest source time believed [ms], null before the first. */
  get newest_ms(): number | null {
    return this.assembler.newest;
  }

  /** The same without what it has come ahead at once of late: that may be of clocks that are wrong. */
  get sure_ms(): number | null {
    const { newest_ms } = this;
    return newest_ms === null ? null : newest_ms - this.clocks.ahead_ms;
  }

  get skippedScans(): number {
    return this.assembler.skippedScans;
  }

  /** Has taken a scan in, and waits for no saved state to be taken over. */
  get isSettled(): boolean {
    return this.state.time_ms !== null && this.awaited === null;
  }

  /** Waits for the journal to come to the time of a saved state. */
  get isAwaiting(): boolean {
    return this.awaited !== null;
  }

  /** What the state has raised and not returned, as it was raised; of one that is awaited, its own. */
  get standing(): readonly WatchEvent[] {
    return this.awaited?.standing ?? [...this.raised.values()];
  }

  /** Index of the oldest scan that readings can still go into; null before the first reading. */
  get openFrom(): number | null {
    return this.assembler.openFrom;
  }

  /**
   * Index from which on no scan has a reading yet; null before the first reading. What a late reading
   * goes into has to be made from here on: an open scan only knows the newest of each channel.
   */
  get untouchedFrom(): number | null {
    return this.assembler.untouchedFrom;
  }

  /** Index of a channel in the unit's; undefined for another's. */
  channelOf(id: string): number | undefined {
    return this.channelIndex.get(id);
  }

  /** Starts without a past, behind this journal entry. */
  startAt(seq: number): void {
    this.taken_seq = seq;
  }

  /**
   * Throws where the checkpoint is damaged or does not fit this unit or this build.
   * @param standing what is told as raised, where the checkpoint does not say it
   * @returns the indicators that this build begins anew
   */
  restore(
    checkpoint: StoredCheckpoint,
    steady_ms: number,
    standing: readonly WatchEvent[] = [],
  ): string[] {
    const image = checkpoint.load() as RunnerImage;
    const assembler = new Assembler(this.unit, this.options, this.finish);
    assembler.restore(image.assembler);
    this.state = this.core.restoreUnit(this.unit, image.unit);
    this.assembler = assembler;
    this.taken_seq = checkpoint.journal_seq;
    this.raised = byId(image.standing ?? standing);
    if (image.zones) this.zones.restore(image.zones);
    this.clocks.restore(image.clocks);
    this.steady_ms = steady_ms;
    // A plant that stays silent from here on still sees its scans close.
    if (assembler.newest !== null) this.plantClock.observe(assembler.newest, steady_ms);
    // A core of a test may watch nothing.
    const { watch } = image.unit.state as Partial<UnitState>;
    return watch ? lostToVersion(watch) : [];
  }

  /**
   * What a checkpoint of another definition holds good for. Throws where it is damaged, of another
   * build, or does not tell its definition.
   */
  weigh(checkpoint: StoredCheckpoint): UnitCarry {
    const { unit, shape } = describedImage(checkpoint);
    return this.core.carryUnit(this.unit, this.core.startUnit(this.unit), unit, shape);
  }

  /**
   * Starts behind an entry of the journal, and takes over what `weigh` told of once it has come to the
   * checkpoint's time. Until then nothing is told of the scans, which were told when they came.
   */
  takeOverLater(
    checkpoint: StoredCheckpoint,
    from_seq: number,
    standing: readonly WatchEvent[],
  ): void {
    const image = describedImage(checkpoint);
    this.awaited = { image, time_ms: checkpoint.time_ms, standing };
    this.startAt(from_seq);
  }

  /**
   * Takes a scan without readings in, on a copy: of a state that was damaged, but not so that it cannot
   * be put back, that fails. @throws what the core throws, and RangeError for an estimate that is none
   */
  prove(state = this.state): void {
    const copy = this.core.restoreUnit(this.unit, this.core.saveUnit(state));
    const values = new Float64Array(this.unit.channels.length).fill(Number.NaN);
    const time_ms = (state.time_ms ?? 0) + this.unit.scan_period_s * 1000;
    const scan = { time_ms, values, held: new Uint8Array(values.length) };
    const ask = { hours_at_W: [], profile: false };
    const { state_of_charge } = this.core.advance(this.unit, copy, scan, ask).estimate;
    if (Number.isFinite(state_of_charge) || state_of_charge === null) return;
    throw new RangeError(`state must yield a finite state of charge, got ${state_of_charge}`);
  }

  /**
   * The whole state; null before the first scan, and before a saved one is taken over.
   * @param whole false: without the state of before that waits while clocks may be ahead
   */
  checkpoint(whole = true): Checkpoint | null {
    if (this.state.time_ms === null || this.awaited !== null) return null;
    const image: RunnerImage = { ...this.image(), clocks: this.clocks.save(whole) };
    return { time_ms: this.state.time_ms, journal_seq: this.taken_seq, image };
  }

  private image(): RunnerImage {
    return {
      unit: this.core.saveUnit(this.state),
      assembler: this.assembler.save(),
      shape: shapeOf(this.unit),
      standing: this.standing,
      zones: this.zones.save(),
    };
  }

  snapshot(): UnitSnapshot {
    return this.core.saveUnit(this.state);
  }

  /**
   * Takes an entry in, after which `step` is to be called until it has nothing more.
   * @returns what became of a reading, null for a close mark, `unconfigured` for another's channel
   */
  take(entry: JournalEntry, steady_ms: number): ReadingFate | 'unconfigured' | null {
    if (entry.seq <= this.taken_seq) return null;
    this.taken_seq = entry.seq;
    this.heard_ms = entry.arrival_ms;
    this.steady_ms = steady_ms;
    this.clocks.hear(entry.arrival_ms);
    if (entry.kind === 'close') {
      this.assembler.closeThrough(entry.scan_index);
      return null;
    }
    const channel = this.channelIndex.get(entry.channel);
    if (channel === undefined) return 'unconfigured';
    const { seq, time_ms, arrival_ms, value } = entry;
    const reading = { seq, channel, time_ms, arrival_ms, value };
    const { newest_ms } = this;
    const look = this.clocks.look(reading, newest_ms);
    if (look !== 'own') {
      if (look !== 'kept') this.goBack(look);
      return 'clock_back';
    }
    if (newest_ms !== null && this.isSettled && this.clocks.isJump(reading, newest_ms))
      this.clocks.put(this.image(), Math.max(newest_ms, this.state.time_ms ?? newest_ms), reading);
    return this.add(reading);
  }

  /** Takes a reading in where the unit stands. */
  private add(reading: Numbered): ReadingFate {
    const { channel, time_ms, arrival_ms } = reading;
    const fate = this.assembler.add(reading);
    if (fate !== 'future' && fate !== 'dateless')
      this.plantClock.observe(believedTime(reading), this.steady_ms);
    if (fate === 'late' || fate === 'future') {
      const isOff = this.zones.look(channel, time_ms, arrival_ms, this.newest_ms);
      return isOff ? 'wrong_zone' : fate;
    }
    if (fate !== 'dateless') this.zones.clear(channel);
    return fate;
  }

  /**
   * Back to the state of before clocks were ahead, or to none; readings that are live by the clocks of
   * now, and have waited, are taken in with the steps that follow.
   */
  private goBack(back: WentBack): void {
    const { image, stretch } = back;
    this.assembler = new Assembler(this.unit, this.options, this.finish);
    if (image) this.assembler.restore(image.assembler);
    this.state = image
      ? this.core.restoreUnit(this.unit, image.unit)
      : this.core.startUnit(this.unit);
    this.raised = byId(image?.standing ?? []);
    if (image?.zones) this.zones.restore(image.zones);
    this.plantClock.restart();
    const { newest } = this.assembler;
    if (newest !== null) this.plantClock.observe(newest, this.steady_ms);
    // A saved state of clocks that were ahead would be awaited for ever.
    if (this.awaited !== null && this.awaited.time_ms > stretch.found_ms) this.awaited = null;
    Object.assign(this.view, { dispatch: null, headroom: null });
    this.unsaved = true;
    this.wentBack = back;
  }

  /** Where the unit has gone back since this was asked last; null where it has not. */
  takeWentBack(): WentBack | null {
    const { wentBack } = this;
    this.wentBack = null;
    return wentBack;
  }

  /** The next closed scan, of readings that had to wait as well. */
  private nextClosed(): ClosedScan | null {
    for (;;) {
      const closed = this.assembler.take();
      if (closed) return closed;
      const reading = this.clocks.next();
      if (!reading) return null;
      this.add(reading);
    }
  }

  /** Whether a reading is off by the whole hours by which its channel's clock was found to be off. */
  isWrongZone({ channel: id, time_ms, arrival_ms }: ReadingEntry): boolean {
    const channel = this.channelIndex.get(id);
    return channel !== undefined && this.zones.isOff(channel, time_ms, arrival_ms, this.newest_ms);
  }

  /** The next readings may show that a channel's clock is off by whole hours. */
  get isZoneInDoubt(): boolean {
    return this.zones.isInDoubt;
  }

  /** Channels whose clock is off by whole hours, and by how many; positive: ahead. */
  get wrongZones(): readonly { readonly channel: string; readonly hours: number }[] {
    return this.zones.findings.map(({ channel, hours }) => {
      return { channel: this.unit.channels[channel]!.id, hours };
    });
  }

  /** Takes a reading in that came late, in its place by source time; its number is behind those taken. */
  takeLate(entry: ReadingEntry): void {
    const channel = this.channelIndex.get(entry.channel);
    if (channel === undefined) return;
    const { time_ms, arrival_ms, value } = entry;
    this.assembler.add({ channel, time_ms, arrival_ms, value });
  }

  /** Index up to which scans are past their deadline, null where none is. */
  due(steady_ms: number): number | null {
    const plant_ms = this.plantClock.at(steady_ms);
    return plant_ms === null ? null : this.assembler.due(plant_ms);
  }

  /**
   * The next closed scan through the core; null where none is closed. Throws what the core throws.
   *
   * @param hours where the unit's clock strikes: computed now, only told to be due, or not at all; they
   *   are no part of the state
   */
  step(hours: 'now' | 'later' | 'none' = 'now'): RunnerStep | null {
    const closed = this.nextClosed();
    if (!closed) return null;
    this.clocks.step(closed.reported);
    const { scan } = closed;
    if (this.awaited !== null && scan.time_ms > this.awaited.time_ms) this.takeOver(this.awaited);
    const isDue = hours !== 'none' && this.isHoursDue(scan.time_ms);
    const ask = {
      ...{ hours_at_W: isDue && hours === 'now' ? this.unit.hours_at_W : [], profile: true },
      turn: this.phases.rollout,
    };
    const step = this.core.advance(this.unit, this.state, scan, ask);
    const { estimate, profile } = step;
    if (this.awaited !== null) {
      const measured = measuredIn(this.unit, scan, estimate);
      return { closed, step: { estimate, profile, events: [] }, measured, hoursDue: false };
    }
    for (const event of step.events) {
      if (event.transition === 'raised') this.raised.set(event.id, event);
      else this.raised.delete(event.id);
    }
    const measured = measuredIn(this.unit, scan, estimate);
    Object.assign(this.view, { estimate, profile, measured, counts: step.counts ?? null });
    if (step.watch) this.view.watch = step.watch;
    if (estimate.dispatch) this.view.dispatch = { time: estimate.time, answers: estimate.dispatch };
    const hoursDue = isDue && hours === 'later' && this.unit.hours_at_W.length > 0;
    return { closed, step, measured, hoursDue };
  }

  /** Hours from the state as it is. Throws what the core throws. */
  hoursNow(): DispatchAnswer[] {
    return this.core.hoursAt(this.unit, this.state, this.unit.hours_at_W);
  }

  /** Puts hours into the estimate of the newest step, before it is told. */
  giveHours({ step: { estimate } }: RunnerStep, answers: DispatchAnswer[]): void {
    estimate.dispatch = answers;
    this.view.dispatch = { time: estimate.time, answers };
  }

  /** One that comes later than the first has its first hours from the worker, not amid the scans. */
  private isHoursDue(time_ms: number): boolean {
    const { unit, state } = this;
    const { hours_ms } = this.phases;
    if (state.time_ms === null && hours_ms > 0) return false;
    const last_ms = state.time_ms === null ? null : state.time_ms - hours_ms;
    return this.core.hoursDue(unit, last_ms, time_ms - hours_ms);
  }

  private takeOver({ image, standing }: Awaited): void {
    this.awaited = null;
    const { state } = this.core.carryUnit(this.unit, this.state, image.unit, image.shape);
    alignWatch(state.watch, new Set(standing.map(({ kind, subject }) => `${kind}/${subject}`)));
    this.state = state;
    this.raised = byId(standing);
    this.clocks.takeOver(image.clocks);
    this.unsaved = true;
  }

  /**
   * Goes on from the state of another runner of this unit, which has the same entries and those that
   * came late. What was last told of hours and headroom stays.
   */
  adopt(other: UnitRunner): void {
    if (other.taken_seq !== this.taken_seq || this.isAwaiting) {
      throw new RangeError(
        `other must have entries up to ${this.taken_seq}, got ${other.taken_seq}`,
      );
    }
    this.assembler = other.assembler;
    this.state = other.state;
    this.raised = other.raised;
    this.awaited = other.awaited;
    this.clocks.restore(other.clocks.save(true));
    const { estimate, profile, measured, counts, watch } = other.view;
    Object.assign(this.view, { estimate, profile, measured, counts, watch });
  }

  /** After a failure of the core: back to a sound state, or to none; time passes on from there. */
  recover(checkpoint: StoredCheckpoint | undefined, standing: ReadonlySet<string>): void {
    const image = checkpoint?.load() as RunnerImage | undefined;
    this.state = image
      ? this.core.restoreUnit(this.unit, image.unit)
      : this.core.startUnit(this.unit);
    // A core of a test may watch nothing.
    const { watch } = this.state as Partial<UnitState>;
    if (watch) alignWatch(watch, standing);
  }
}

function byId(events: readonly WatchEvent[]): Map<string, WatchEvent> {
  return new Map(events.map((event) => [event.id, event]));
}
