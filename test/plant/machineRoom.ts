import { applyChange, weatherOffset_K } from './changes.js';
import { type Cycle, type CyclePoint, cycleOf, flowForPower } from './cycle.js';
import { drawPlant, type PlantDraw } from './draws.js';
import type { PlantChange } from './faults.js';
import { fluidAt } from './fluids.js';
import type { PlantGeometry } from './geometry.js';
import { type Resolution, SimulatedStore } from './simulatedStore.js';
import type { EndedBy, Mode, Segment, TruthOptions } from './truthTypes.js';

/** Outlet rules wait this long after a change of mode, until the plenum is swept [s]. */
const SWEEP_S = 600;
/** Flow follows its set point with this time constant after a change [s]. */
const RAMP_S = 60;

export const DEFAULT_RESOLUTION: Resolution = { cells: 400, shells: 3 };
const DEFAULT_STEP_S = 20;

/** Stores and machine under a command, without instruments. All its state is copied by `clone`. */
export class MachineRoom {
  readonly geometry: PlantGeometry;
  readonly draw: PlantDraw;
  readonly stores: SimulatedStore[];
  readonly step_s: number;
  private readonly cycle: Cycle;
  /** Seconds since the start. */
  elapsed_s = 0;
  mode: Mode = 'stand';
  /** True flow and net power, positive while charging. */
  flow_kg_s = 0;
  power_W = 0;
  /** Why the present command ended, null while it goes on. */
  stoppedBy: EndedBy | 'charge_limit' | null = null;
  private sinceChange_s = 1e9;
  /** Outlets of the step before the last, for looking half a step ahead. */
  private outletsBefore: readonly [hot: number, cold: number] = [Number.NaN, Number.NaN];
  /** Changes that have begun, with the heat-transfer factor of that moment. */
  private readonly begun: Map<PlantChange, number>;

  constructor(
    private readonly options: TruthOptions,
    private readonly start_s: number,
    from?: MachineRoom,
  ) {
    const { geometry, seed } = options;
    this.geometry = geometry;
    this.step_s = options.step_s ?? DEFAULT_STEP_S;
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
      this.outletsBefore = from.outletsBefore;
      this.begun = new Map(from.begun);
      return;
    }
    this.begun = new Map();
    const draw = drawPlant(geometry, seed, {
      physics: options.physics ?? 'random',
      machine: options.machine ?? 'random',
      sensors: options.sensors ?? 'class',
      meter: options.meter ?? 'random',
    });
    this.draw = options.adjust ? options.adjust(draw) : draw;
    // The cycle is that of an ideal gas.
    const fluid = fluidAt(geometry.stores[0]!.fluid, 0);
    this.cycle = cycleOf(geometry, this.draw.machine, fluid.heatCapacity);
    const resolution = { ...DEFAULT_RESOLUTION, ...options.resolution };
    this.stores = geometry.stores.map((store) => new SimulatedStore(store, this.draw, resolution));
    for (const store of this.stores) {
      const { length_m, id } = store.geometry;
      const start = options.initial?.[id] ?? { front_m: 0.15 * length_m, width_m: 0.35 };
      store.start(start.front_m, start.width_m);
    }
    this.power_W = geometry.machine.auxiliary_standing_W;
  }

  clone(options: TruthOptions = this.options): MachineRoom {
    return new MachineRoom(options, this.start_s, this);
  }

  /** Ambient temperature [K], coldest at four in the morning. */
  ambient_K(): number {
    const { mean_K, swing_K } = this.draw.ambient;
    const time_s = this.start_s + this.elapsed_s;
    const day = mean_K - swing_K * Math.cos((2 * Math.PI * (time_s - 4 * 3600)) / 86400);
    return day + weatherOffset_K(this.options.changes ?? [], this.elapsed_s);
  }

  /** One inner step under a command; `stoppedBy` tells when a limit has ended it. */
  step(command: Segment, dt_s: number): void {
    this.applyChanges();
    this.enter(command.mode);
    const ambient = this.ambient_K();
    if (command.mode === 'stand') {
      this.stand(command.leak_kg_s ?? 0, dt_s, ambient);
    } else {
      this.flowStep(command, dt_s, ambient);
    }
    this.elapsed_s += dt_s;
    this.sinceChange_s += dt_s;
  }

  private enter(mode: Mode): void {
    if (mode === this.mode) return;
    this.mode = mode;
    this.sinceChange_s = 0;
    this.flow_kg_s = 0;
  }

  /** Rest, with what leaks through each store beside the flow that the meter sees. */
  private stand(seen_kg_s: number, dt_s: number, ambient: number): void {
    for (const store of this.stores) {
      let share = 0;
      for (const change of this.options.changes ?? []) {
        const here = change.kind === 'leak' && change.store === store.geometry.id;
        if (here && this.elapsed_s >= change.at_s) share += change.share;
      }
      store.stand(dt_s, seen_kg_s, share * this.geometry.rated_flow_kg_s, ambient);
    }
    this.flow_kg_s = seen_kg_s;
    this.power_W = this.geometry.machine.auxiliary_standing_W;
  }

  private flowStep(command: Segment, dt_s: number, ambient: number): void {
    const charging = command.mode === 'charge';
    const target = this.targetFlow(command, ambient);
    if (Number.isNaN(target)) {
      this.stoppedBy = 'empty';
      this.stand(0, dt_s, ambient);
      return;
    }
    const before = Math.abs(this.flow_kg_s);
    const ramping = this.sinceChange_s < 10 * RAMP_S;
    const flow = ramping ? target + (before - target) * Math.exp(-dt_s / RAMP_S) : target;
    this.flow_kg_s = charging ? flow : -flow;
    this.power_W = this.pushFlow(charging, flow, dt_s, ambient).power_W;
    this.stoppedBy = this.limitReached(charging, target);
  }

  /** Sends a flow through machine and stores for one step. */
  private pushFlow(charging: boolean, flow: number, dt_s: number, ambient: number): CyclePoint {
    const [hot, cold] = this.comingOutlets(charging);
    const point = this.cycle.point(charging, flow, hot, cold, ambient);
    this.outletsBefore = this.outlets(charging);
    for (const store of this.stores) {
      const inlet = store.geometry.kind === 'hot' ? point.hotInlet_K : point.coldInlet_K;
      store.step(dt_s, charging ? flow : -flow, inlet, ambient);
    }
    return point;
  }

  /** Whether the gas that stood under the lids has been pushed out. */
  get swept(): boolean {
    return this.sinceChange_s >= SWEEP_S;
  }

  /** Gas that leaves the hot and the cold store in a direction [K]; NaN for a store there is not. */
  outlets(charging: boolean): [hot: number, cold: number] {
    let hot = Number.NaN;
    let cold = Number.NaN;
    for (const store of this.stores) {
      if (store.geometry.kind === 'hot') hot = store.outletFor(charging);
      else cold = store.outletFor(charging);
    }
    return [hot, cold];
  }

  /**
   * Outlets in the middle of the coming step, by a straight line through those of the last two (each is
   * that of the middle of its step), so that machine and stores do not lag each other by a step.
   * While the plenum is being swept, the last one.
   */
  comingOutlets(charging: boolean): [hot: number, cold: number] {
    const now = this.outlets(charging);
    if (!this.swept) return now;
    const on = (a: number, b: number) => (Number.isNaN(b) ? a : 2 * a - b);
    return [on(now[0], this.outletsBefore[0]), on(now[1], this.outletsBefore[1])];
  }

  /** Flow that a command asks for now [kg/s]; NaN where none delivers its power. */
  private targetFlow(command: Segment, ambient: number): number {
    if (command.flow_kg_s !== undefined) return command.flow_kg_s;
    if (command.power_W === undefined) {
      throw new RangeError(`segment ${command.mode} has neither power_W nor flow_kg_s`);
    }
    const charging = command.mode === 'charge';
    const [hot, cold] = this.comingOutlets(charging);
    const guess = Math.abs(this.flow_kg_s) || this.geometry.rated_flow_kg_s;
    const power = charging ? command.power_W : -command.power_W;
    return flowForPower(this.cycle, charging, power, hot, cold, ambient, guess);
  }

  /**
   * One step of a discharge at exactly `power_W`, as a look ahead takes it: no ramp.
   * @returns the flow, and why the discharge ends: `flow` or `empty` before the step, an outlet's
   *   limit behind it
   */
  stepAhead(power_W: number, dt_s: number): { flow_kg_s: number; end: EndedBy | null } {
    this.applyChanges();
    this.enter('discharge');
    const ambient = this.ambient_K();
    const flow = this.targetFlow({ mode: 'discharge', power_W, duration_s: 0 }, ambient);
    if (Number.isNaN(flow)) return { flow_kg_s: flow, end: 'empty' };
    if (flow > this.geometry.flow_max_kg_s) return { flow_kg_s: flow, end: 'flow' };
    this.flow_kg_s = -flow;
    this.pushFlow(false, flow, dt_s, ambient);
    this.elapsed_s += dt_s;
    this.sinceChange_s += dt_s;
    return { flow_kg_s: flow, end: this.limitReached(false, flow) as EndedBy | null };
  }

  private limitReached(charging: boolean, target: number): EndedBy | 'charge_limit' | null {
    const { geometry } = this;
    const [hot, cold] = this.outlets(charging);
    if (!charging && target > geometry.flow_max_kg_s) return 'flow';
    if (!this.swept) return null;
    const over = (limit: number | null, value: number) => limit !== null && value > limit;
    const under = (limit: number | null, value: number) => limit !== null && value < limit;
    if (charging) {
      const full =
        over(geometry.charge_hot_outlet_max_K, hot) ||
        under(geometry.charge_cold_outlet_min_K, cold);
      return full ? 'charge_limit' : null;
    }
    if (under(geometry.hot_outlet_min_K, hot)) return 'hot_outlet';
    return over(geometry.cold_outlet_max_K, cold) ? 'cold_outlet' : null;
  }

  private applyChanges(): void {
    for (const change of this.options.changes ?? []) {
      if (change.kind === 'weather' || this.elapsed_s < change.at_s) continue;
      const store = this.stores.find((s) => s.geometry.id === change.store);
      if (!store) throw new RangeError(`store ${change.store} of a change is not in the plant`);
      const from = this.begun.get(change);
      const begun = from ?? store.bed.heatTransferFactor;
      applyChange(store, change, {
        first: from === undefined,
        from: begun,
        drawn: this.draw.stores[change.store]!.heat_transfer_factor,
        since_s: this.elapsed_s - change.at_s,
      });
      this.begun.set(change, begun);
    }
  }
}
