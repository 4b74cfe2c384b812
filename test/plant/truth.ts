import { type Cycle, type CyclePoint, cycleOf, flowForPower } from './cycle.js';
import { type DrawOptions, drawPlant, type PlantDraw } from './draws.js';
import { applyFaults, type PlantChange, type SensorFault } from './faults.js';
import { fluidAt } from './fluids.js';
import type { PlantGeometry } from './geometry.js';
import { RandomStream } from './random.js';
import { NOISE } from './sensors.js';
import { type Resolution, SimulatedStore, type StoreTruth } from './simulatedStore.js';

export type Mode = 'charge' | 'stand' | 'discharge';

/** Part of a schedule. Net power is given as a positive number in either direction. */
export interface Segment {
  readonly mode: Mode;
  readonly duration_s: number;
  /** Net electrical power [W] or flow [kg/s]; neither while standing. */
  readonly power_W?: number;
  readonly flow_kg_s?: number;
  /** While standing: flow through a valve that does not close, positive as while charging [kg/s]. */
  readonly leak_kg_s?: number;
}

export interface TruthOptions extends Partial<DrawOptions> {
  readonly seed: number;
  readonly geometry: PlantGeometry;
  readonly resolution?: Partial<Resolution>;
  /** Longest inner step [s]. */
  readonly step_s?: number;
  /** Time of the start [s since 1970]; 2025-01-01T00:00:00Z if absent. */
  readonly start_s?: number;
  /** Front position and width of each store at the start; 15 % of the length and 0.35 m if absent. */
  readonly initial?: Readonly<
    Record<string, { readonly front_m: number; readonly width_m: number }>
  >;
  readonly faults?: readonly SensorFault[];
  readonly changes?: readonly PlantChange[];
  /** Adjusts the draw before the plant is built. */
  readonly adjust?: (draw: PlantDraw) => PlantDraw;
}

/** Readings of one scan in SI units and kelvin; NaN = missing. `time_s` counts from 1970. */
export interface ScanReadings {
  readonly time_s: number;
  readonly readings: Readonly<Record<string, number>>;
}

export interface PlantTruth {
  readonly time_s: number;
  readonly mode: Mode;
  /** True flow, positive while charging [kg/s]. */
  readonly flow_kg_s: number;
  /** Net power, positive while charging [W]. */
  readonly power_W: number;
  readonly ambient_K: number;
  /** Mean reading of the flow meter over true flow. */
  readonly meter_factor: number;
  readonly stores: Readonly<Record<string, StoreTruth>>;
}

export type EndedBy = 'hot_outlet' | 'cold_outlet' | 'flow' | 'empty';

export interface TrueHours {
  readonly hours: number;
  readonly energy_MWh_el: number;
  readonly ends_by: EndedBy;
}

/** Outlet rules wait this long after a change to discharging, until the plenum is swept [s]. */
const SWEEP_S = 600;
/** Flow follows its set point with this time constant after a change [s]. */
const RAMP_S = 60;

export const DEFAULT_RESOLUTION: Resolution = { cells: 400, shells: 3 };
const DEFAULT_START_S = 1735689600;

/** The plant that knows the truth. All its state is copied by `clone`. */
export class Truth {
  readonly geometry: PlantGeometry;
  readonly draw: PlantDraw;
  readonly stores: SimulatedStore[];
  private readonly cycle: Cycle;
  private readonly step_s: number;
  private readonly start_s: number;
  /** Seconds since the start. */
  elapsed_s = 0;
  mode: Mode = 'stand';
  flow_kg_s = 0;
  power_W = 0;
  /** Why the last run segment ended early, null if it did not. */
  stoppedBy: EndedBy | 'charge_limit' | null = null;
  private sinceChange_s = 1e9;
  private noise: RandomStream;
  private gasJunction: Record<string, number> = {};
  private stuck = new Map<string, number>();
  private readonly groupOf = new Map<string, string | null>();
  private readonly flowChannels: string[];
  private started = new Map<PlantChange, number>();

  constructor(
    private readonly options: TruthOptions,
    from?: Truth,
  ) {
    const { geometry, seed } = options;
    this.geometry = geometry;
    this.step_s = options.step_s ?? 20;
    this.start_s = options.start_s ?? DEFAULT_START_S;
    const resolution = { ...DEFAULT_RESOLUTION, ...options.resolution };
    this.flowChannels = geometry.channels.filter((c) => c.measures === 'flow').map((c) => c.id);
    for (const store of geometry.stores) {
      for (const string of store.strings) {
        for (const t of string.thermocouples) this.groupOf.set(t.id, t.group);
      }
    }
    if (from) {
      this.draw = from.draw;
      this.cycle = from.cycle;
      this.stores = from.stores.map((store) => store.clone());
      this.elapsed_s = from.elapsed_s;
      this.mode = from.mode;
      this.flow_kg_s = from.flow_kg_s;
      this.power_W = from.power_W;
      this.stoppedBy = from.stoppedBy;
      this.sinceChange_s = from.sinceChange_s;
      this.noise = from.noise.clone();
      this.gasJunction = { ...from.gasJunction };
      this.stuck = new Map(from.stuck);
      this.started = new Map(from.started);
      return;
    }
    const draw = drawPlant(geometry, seed, {
      physics: options.physics ?? 'random',
      machine: options.machine ?? 'random',
      sensors: options.sensors ?? 'class',
      meter: options.meter ?? 'random',
    });
    this.draw = options.adjust ? options.adjust(draw) : draw;
    const fluid = fluidAt(geometry.stores[0]!.fluid, 0);
    this.cycle = cycleOf(geometry, this.draw.machine, fluid.heatCapacity);
    this.stores = geometry.stores.map((store) => new SimulatedStore(store, this.draw, resolution));
    for (const store of this.stores) {
      const { length_m, id } = store.geometry;
      const { front_m, width_m } = options.initial?.[id] ?? {
        front_m: 0.15 * length_m,
        width_m: 0.35,
      };
      store.start(front_m, width_m);
    }
    this.noise = new RandomStream(seed, 'noise');
    this.power_W = geometry.machine.auxiliary_standing_W;
  }

  /** A copy that runs on by itself, with other sensor faults or changes to come if given. */
  clone(also: Pick<TruthOptions, 'faults' | 'changes'> = {}): Truth {
    return new Truth({ ...this.options, ...also }, this);
  }

  get time_s(): number {
    return this.start_s + this.elapsed_s;
  }

  ambient_K(): number {
    const { mean_K, swing_K } = this.draw.ambient;
    // Coldest at four in the morning.
    return mean_K - swing_K * Math.cos((2 * Math.PI * (this.time_s - 4 * 3600)) / 86400);
  }

  /**
   * Runs a schedule. One scan and one truth at the end of each scan period, the start included in
   * neither; a segment is cut to whole scan periods. When a limit of the machine stops a segment
   * the rest of it stands and `stoppedBy` says why.
   */
  run(
    segments: readonly Segment[],
    each?: (scan: ScanReadings, truth: PlantTruth, plant: Truth) => void,
  ): { scans: ScanReadings[]; truths: PlantTruth[] } {
    const scans: ScanReadings[] = [];
    const truths: PlantTruth[] = [];
    const period = this.geometry.scan_period_s;
    for (const segment of segments) {
      let now = segment;
      this.stoppedBy = null;
      const count = Math.round(segment.duration_s / period);
      for (let i = 0; i < count; i++) {
        this.advance(now, period);
        if (this.stoppedBy !== null) now = { mode: 'stand', duration_s: 0 };
        const scan = this.scan();
        const truth = this.truth();
        if (each) each(scan, truth, this);
        else {
          scans.push(scan);
          truths.push(truth);
        }
      }
    }
    return { scans, truths };
  }

  /** Advances by `duration_s` under one command. */
  advance(command: Segment, duration_s: number): void {
    const parts = Math.max(1, Math.ceil(duration_s / this.step_s - 1e-9));
    for (let i = 0; i < parts; i++) {
      if (this.stoppedBy === null) this.step(command, duration_s / parts);
      else this.step({ mode: 'stand', duration_s: 0 }, duration_s / parts);
    }
  }

  private step(command: Segment, dt_s: number): void {
    this.applyChanges();
    if (command.mode !== this.mode) {
      this.mode = command.mode;
      this.sinceChange_s = 0;
      this.flow_kg_s = 0;
    }
    const ambient = this.ambient_K();
    if (command.mode === 'stand') {
      const leak = command.leak_kg_s ?? 0;
      for (const store of this.stores) store.step(dt_s, leak, ambient, ambient);
      this.flow_kg_s = leak;
      this.power_W = this.geometry.machine.auxiliary_standing_W;
    } else {
      this.flowStep(command, dt_s, ambient);
    }
    this.elapsed_s += dt_s;
    this.sinceChange_s += dt_s;
    this.followGasSensors(dt_s);
  }

  private flowStep(command: Segment, dt_s: number, ambient: number): void {
    const charging = command.mode === 'charge';
    const target = this.targetFlow(command, charging, ambient);
    if (Number.isNaN(target)) {
      this.stoppedBy = 'empty';
      return;
    }
    const before = Math.abs(this.flow_kg_s);
    const ramping = this.sinceChange_s < 10 * RAMP_S;
    const flow = ramping ? target + (before - target) * Math.exp(-dt_s / RAMP_S) : target;
    const point = this.point(charging, flow, ambient);
    this.flow_kg_s = charging ? flow : -flow;
    this.power_W = point.power_W;
    for (const store of this.stores) {
      const inlet = store.geometry.kind === 'hot' ? point.hotInlet_K : point.coldInlet_K;
      store.step(dt_s, this.flow_kg_s, inlet, ambient);
    }
    this.stoppedBy = this.limitReached(charging, target);
  }

  private point(charging: boolean, flow: number, ambient: number): CyclePoint {
    const [hot, cold] = this.outlets(charging);
    return this.cycle.point(charging, flow, hot, cold, ambient);
  }

  private outlets(charging: boolean): [number, number] {
    let hot = Number.NaN;
    let cold = Number.NaN;
    for (const store of this.stores) {
      if (store.geometry.kind === 'hot') hot = store.outletFor(charging);
      else cold = store.outletFor(charging);
    }
    return [hot, cold];
  }

  private targetFlow(command: Segment, charging: boolean, ambient: number): number {
    if (command.flow_kg_s !== undefined) return command.flow_kg_s;
    if (command.power_W === undefined)
      throw new RangeError(`segment ${command.mode} has neither power_W nor flow_kg_s`);
    const [hot, cold] = this.outlets(charging);
    const guess = Math.abs(this.flow_kg_s) || this.geometry.rated_flow_kg_s;
    const power = charging ? command.power_W : -command.power_W;
    return flowForPower(this.cycle, charging, power, hot, cold, ambient, guess);
  }

  private limitReached(charging: boolean, target: number): EndedBy | 'charge_limit' | null {
    const { geometry } = this;
    const [hot, cold] = this.outlets(charging);
    if (charging) {
      const hotMax = geometry.charge_hot_outlet_max_K;
      const coldMin = geometry.charge_cold_outlet_min_K;
      if (this.sinceChange_s < SWEEP_S) return null;
      return (hotMax !== null && hot > hotMax) || (coldMin !== null && cold < coldMin)
        ? 'charge_limit'
        : null;
    }
    if (target > geometry.flow_max_kg_s) return 'flow';
    if (this.sinceChange_s < SWEEP_S) return null;
    if (geometry.hot_outlet_min_K !== null && hot < geometry.hot_outlet_min_K) return 'hot_outlet';
    if (geometry.cold_outlet_max_K !== null && cold > geometry.cold_outlet_max_K)
      return 'cold_outlet';
    return null;
  }

  private applyChanges(): void {
    for (const change of this.options.changes ?? []) {
      if (this.elapsed_s < change.at_s) continue;
      const store = this.stores.find((s) => s.geometry.id === change.store);
      if (!store) throw new RangeError(`store ${change.store} of a change is not in the plant`);
      if (change.kind === 'channelling') {
        if (!this.started.has(change)) store.channel(change.string, change.factor);
        this.started.set(change, 1);
        continue;
      }
      const from = this.started.get(change) ?? store.bed.heatTransferFactor;
      this.started.set(change, from);
      const to = change.factor * this.draw.stores[change.store]!.heat_transfer_factor;
      const share = Math.min(
        1,
        (this.elapsed_s - change.at_s) / Math.max(change.ramp_s ?? 0, 1e-9),
      );
      store.bed.heatTransferFactor = from * (to / from) ** share;
    }
  }

  private followGasSensors(dt_s: number): void {
    for (const channel of this.geometry.channels) {
      if (channel.measures !== 'gas_temperature') continue;
      const store = this.stores.find((s) => s.geometry.id === channel.store)!;
      const T = store.pipe_K[channel.end];
      const was = this.gasJunction[channel.id];
      const { lag_s } = this.draw.gasSensors[channel.id]!;
      this.gasJunction[channel.id] =
        was === undefined ? T : T + (was - T) * Math.exp(-dt_s / lag_s);
    }
  }

  meterFactor(): number {
    const { bias, slope } = this.draw.meter;
    return 1 + bias + slope * (Math.abs(this.flow_kg_s) / this.geometry.rated_flow_kg_s);
  }

  /** Reads all sensors now: noise advances, so one call per scan. */
  scan(): ScanReadings {
    const readings: Record<string, number> = {};
    const { noise } = this;
    for (const store of this.stores) store.thermocouples.read(this.elapsed_s, noise, readings);
    const storeOf = (id: string) => this.stores.find((s) => s.geometry.id === id)!;
    for (const channel of this.geometry.channels) {
      const z = noise.normal();
      readings[channel.id] = (() => {
        switch (channel.measures) {
          case 'flow':
            return this.flow_kg_s * this.meterFactor() * (1 + NOISE.flow * z);
          case 'power':
            return (
              this.power_W +
              NOISE.power * z * Math.max(Math.abs(this.power_W), 0.02 * this.geometry.rated_power_W)
            );
          case 'auxiliary_power':
            return (
              (this.mode === 'stand'
                ? this.geometry.machine.auxiliary_standing_W
                : this.geometry.machine.auxiliary_running_W) *
              (1 + NOISE.power * z)
            );
          case 'mode':
            return this.mode === 'charge' ? 1 : this.mode === 'stand' ? 0 : -1;
          case 'ambient_temperature':
            return this.ambient_K() + NOISE.ambient_K * z;
          case 'gas_temperature':
            return (
              this.gasJunction[channel.id]! +
              this.draw.gasSensors[channel.id]!.offset_K +
              NOISE.gas_K * z
            );
          case 'pressure':
            return storeOf(channel.store).geometry.pressure_Pa * (1 + NOISE.pressure * z);
          case 'pressure_drop':
            return (
              storeOf(channel.store).pressureDrop_Pa(this.flow_kg_s) * (1 + NOISE.pressure_drop * z)
            );
        }
      })();
    }
    applyFaults(
      readings,
      this.options.faults ?? [],
      this.elapsed_s,
      this.stuck,
      this.groupOf,
      this.flowChannels,
    );
    return { time_s: this.time_s, readings };
  }

  truth(): PlantTruth {
    return {
      time_s: this.time_s,
      mode: this.mode,
      flow_kg_s: this.flow_kg_s,
      power_W: this.power_W,
      ambient_K: this.ambient_K(),
      meter_factor: this.meterFactor(),
      stores: Object.fromEntries(this.stores.map((s) => [s.geometry.id, s.truth()])),
    };
  }

  /**
   * True hours at constant net power from now on: a copy is run until a stop rule ends it. The
   * moment at which an outlet or the flow passes its limit is found within the last step by a straight line.
   * @param power_W net electrical power at the connection point, positive
   */
  hoursAt(power_W: number, horizon_h = 100): TrueHours {
    if (!(power_W > 0)) throw new RangeError(`power_W must be positive, got ${power_W}`);
    const ahead = this.clone();
    const command: Segment = { mode: 'discharge', power_W, duration_s: 0 };
    ahead.stoppedBy = null;
    if (ahead.mode !== 'discharge') {
      ahead.mode = 'discharge';
      ahead.sinceChange_s = 0;
    }
    const dt = this.step_s;
    let seconds = 0;
    let before = ahead.outlets(false);
    let flowBefore = Number.NaN;
    while (seconds < horizon_h * 3600) {
      const ambient = ahead.ambient_K();
      const flow = ahead.targetFlow(command, false, ambient);
      if (!(flow <= ahead.geometry.flow_max_kg_s)) {
        const flowMax = ahead.geometry.flow_max_kg_s;
        const late = (flow - flowMax) / (flow - flowBefore);
        const since = Number.isFinite(late) ? seconds - dt * late : seconds;
        return hoursOf(since, power_W, Number.isNaN(flow) ? 'empty' : 'flow');
      }
      flowBefore = flow;
      const point = ahead.point(false, flow, ambient);
      ahead.flow_kg_s = -flow;
      ahead.applyChanges();
      for (const store of ahead.stores) {
        const inlet = store.geometry.kind === 'hot' ? point.hotInlet_K : point.coldInlet_K;
        store.step(dt, -flow, inlet, ambient);
      }
      ahead.elapsed_s += dt;
      ahead.sinceChange_s += dt;
      const end = ahead.limitReached(false, flow);
      const now = ahead.outlets(false);
      if (end !== null)
        return hoursOf(seconds + dt * ahead.shareOfStep(end, before, now), power_W, end as EndedBy);
      before = now;
      seconds += dt;
    }
    return hoursOf(seconds, power_W, 'empty');
  }

  private shareOfStep(end: string, before: readonly number[], now: readonly number[]): number {
    const j = end === 'hot_outlet' ? 0 : end === 'cold_outlet' ? 1 : -1;
    if (j < 0) return 1;
    const limit = (j === 0 ? this.geometry.hot_outlet_min_K : this.geometry.cold_outlet_max_K)!;
    const share = (limit - before[j]!) / (now[j]! - before[j]!);
    return Number.isFinite(share) ? Math.min(Math.max(share, 0), 1) : 1;
  }
}

function hoursOf(seconds: number, power_W: number, ends_by: EndedBy): TrueHours {
  const hours = seconds / 3600;
  return { hours, energy_MWh_el: (hours * power_W) / 1e6, ends_by };
}

/** A plant drawn from a seed; see TruthOptions. */
export function createTruth(options: TruthOptions): Truth {
  return new Truth(options);
}
