import type { Direction, Mode, UnitDefinition } from './definitions.js';
import { centralHours, computeHours, type HoursInput } from './dispatch/hours.js';
import {
  type MachineFactor,
  machineFactor,
  startMachineFactor,
  stepMachineFactor,
} from './dispatch/machineFactor.js';
import type { DispatchAnswer, Estimate, ProfileView, Quality, StoreEstimate } from './estimate.js';
import type { StoreTemperatures } from './machine/machine.js';
import type { Scan } from './scan/scan.js';
import {
  type Conditions,
  type ConditionsState,
  readConditions,
  startConditions,
} from './track/conditions.js';
import { storeEnergy } from './track/storeEnergy.js';
import { estimateStore, meanFactor, meanTemperatures, profileOf } from './track/storeEstimate.js';
import { type StoreState, type StoreStep, startStore, stepStore } from './track/storeTracker.js';
import type { TubeDrive } from './track/tube.js';
import { type UnitModel, unitModel } from './unitModel.js';
import type { WatchEvent } from './watch/event.js';

/** What one scan yields. */
export interface UnitStep {
  readonly estimate: Estimate;
  /** Only where asked for. */
  readonly profile: ProfileView | null;
  readonly events: readonly WatchEvent[];
}

export interface UnitAsk {
  /** Powers [W] for which hours are wanted with this scan; empty = none. See `hoursDue`. */
  readonly hours_at_W: readonly number[];
  readonly profile: boolean;
}

/** Everything a unit remembers; owned by whoever holds it, changed only by `advance`. */
export interface UnitState {
  /** Source time of the last scan taken in, null before the first. */
  time_ms: number | null;
  readonly conditions: ConditionsState;
  readonly stores: StoreState[];
  readonly factors: Record<Direction, MachineFactor>;
  /** Source time of the last scan with any thermocouple reading. */
  seen_ms: number | null;
  mode: Mode;
  /** Last state of charge by rollout, when, and the least store state of charge then. */
  charge: { value: number; time_ms: number; least: number } | null;
  readonly unknownTravel_m: number[];
}

/** Plain, structured-cloneable image of a UnitState (typed arrays, numbers, strings). */
export interface UnitSnapshot {
  readonly version: number;
  readonly state: UnitState;
}

const SNAPSHOT_VERSION = 1;
/** A rollout for the state of charge at least this often [s]. */
const CHARGE_EVERY_S = 600;
const ASSUMED_INLET_SIGMA_K = 15;
/** Longest run of empty scans that a gap is filled with; a longer gap takes coarser ones. */
const TICKS_MOST = 2000;

export function startUnit(unit: UnitDefinition): UnitState {
  const model = unitModel(unit);
  return {
    time_ms: null,
    conditions: startConditions(),
    stores: model.stores.map(startStore),
    factors: { charge: startMachineFactor(), discharge: startMachineFactor() },
    seen_ms: null,
    mode: 'stand',
    charge: null,
    unknownTravel_m: model.stores.map(() => 0),
  };
}

/**
 * Takes one scan in. Where scans are missing since the last one, time passes in empty scans at the
 * scan period first, exactly as if the daemon had closed them at their deadlines.
 *
 * @throws RangeError for a scan not later than the last, or of the wrong length
 */
export function advance(
  unit: UnitDefinition,
  state: UnitState,
  scan: Scan,
  ask: UnitAsk,
): UnitStep {
  const model = unitModel(unit);
  if (scan.values.length !== unit.channels.length) {
    throw new RangeError(`scan has ${scan.values.length} values, expected ${unit.channels.length}`);
  }
  if (state.time_ms !== null && !(scan.time_ms > state.time_ms)) {
    throw new RangeError(
      `scan at ${scan.time_ms} ms: not later than the last, ${state.time_ms} ms`,
    );
  }
  for (const time_ms of missingTicks(unit, state.time_ms, scan.time_ms)) {
    const values = new Float64Array(unit.channels.length).fill(Number.NaN);
    takeIn(model, state, { time_ms, values, held: new Uint8Array(values.length) });
  }
  const taken = takeIn(model, state, scan);
  return describe(model, state, scan, taken, ask);
}

/** Times of the scans that are missing between two scans. */
function missingTicks(unit: UnitDefinition, last_ms: number | null, now_ms: number): number[] {
  if (last_ms === null) return [];
  const period = unit.scan_period_s * 1000;
  const from = Math.floor(last_ms / period) + 1;
  const to = Math.floor(now_ms / period);
  const stride = Math.max(1, Math.ceil((to - from) / TICKS_MOST));
  const ticks: number[] = [];
  for (let index = from; index < to; index += stride) {
    if (index * period > last_ms) ticks.push(index * period);
  }
  return ticks;
}

interface Taken {
  readonly conditions: Conditions;
  readonly steps: readonly StoreStep[];
  readonly readingsSeen: number;
  readonly modeChanged: boolean;
}

function takeIn(model: UnitModel, state: UnitState, scan: Scan): Taken {
  const { unit } = model;
  const dt_s = state.time_ms === null ? 0 : (scan.time_ms - state.time_ms) / 1000;
  const outlets = storeOutlets(model, state, scan);
  const conditions = readConditions(
    unit,
    model.map,
    model.machine,
    state.conditions,
    scan,
    dt_s,
    outlets,
  );
  const readingsSeen = model.thermocouples.filter((i) => Number.isFinite(scan.values[i])).length;
  if (readingsSeen > 0) state.seen_ms = scan.time_ms;
  const steps = model.stores.map((store, s) => {
    const travel = unknownTravel(model, state, s, dt_s, conditions);
    const drive =
      state.time_ms === null ? null : driveOf(model, s, conditions, scan, dt_s, outlets, travel);
    const step = stepStore(
      store,
      state.stores[s] as StoreState,
      drive,
      scan.values,
      scan.time_ms,
      state.unknownTravel_m[s] as number,
    );
    if (step === 'updated' || step === 'reacquired') state.unknownTravel_m[s] = 0;
    return step;
  });
  const modeChanged = conditions.mode !== state.mode;
  learnMachine(model, state, conditions, dt_s, modeChanged, outlets);
  state.mode = conditions.mode;
  state.time_ms = scan.time_ms;
  return { conditions, steps, readingsSeen, modeChanged };
}

/** Gas leaving each store in either direction: as measured, else as the tubes tell [K]. */
function storeOutlets(
  model: UnitModel,
  state: UnitState,
  scan: Scan | null,
): Record<Direction, StoreTemperatures> {
  const at = (s: number, direction: Direction): number => {
    const store = model.stores[s];
    if (store === undefined) return Number.NaN;
    const end = direction === 'charge' ? 'discharge_inlet' : 'charge_inlet';
    const channel = model.map.gas[store.store.id]?.[end] ?? -1;
    const read = channel >= 0 && scan !== null ? (scan.values[channel] as number) : Number.NaN;
    const running = state.mode === direction;
    if (running && Number.isFinite(read)) return read;
    const mean = meanTemperatures(store, state.stores[s] as StoreState);
    return (direction === 'charge' ? mean[mean.length - 1] : mean[0]) as number;
  };
  const hot = model.stores.findIndex((s) => s.store.kind === 'hot');
  const cold = model.stores.findIndex((s) => s.store.kind === 'cold');
  const pair = (direction: Direction): StoreTemperatures => ({
    hot_K: at(hot, direction),
    cold_K: cold < 0 ? null : at(cold, direction),
  });
  return { charge: pair('charge'), discharge: pair('discharge') };
}

/**
 * One-sigma travel of the front that no reading of flow covers [m]: it adds up in line with time.
 * Returns the part of this scan such that variances add up to the square of the whole.
 */
function unknownTravel(
  model: UnitModel,
  state: UnitState,
  s: number,
  dt_s: number,
  conditions: Conditions,
): number {
  if (conditions.flowKnown) return 0;
  const store = model.stores[s] as UnitModel['stores'][number];
  const { tables } = store;
  const { unit } = model;
  const middle = tables.segments >> 1;
  const most = Math.max(
    Math.abs(state.conditions.lastFlow_kg_s),
    Number.isFinite(unit.limits.discharge.flow_max_kg_s) ? unit.limits.discharge.flow_max_kg_s : 0,
  );
  const speed =
    ((most / store.store.bed.area_m2) * (tables.fluidHeatCapacity[middle] as number)) /
    (tables.heatCapacity[middle] as number);
  const before = state.unknownTravel_m[s] as number;
  const after = before + speed * dt_s;
  state.unknownTravel_m[s] = after;
  return Math.sqrt(after * after - before * before);
}

function driveOf(
  model: UnitModel,
  s: number,
  conditions: Conditions,
  scan: Scan,
  dt_s: number,
  outlets: Record<Direction, StoreTemperatures>,
  travelSigma_m: number,
): TubeDrive {
  const store = (model.stores[s] as UnitModel['stores'][number]).store;
  const direction: Direction = conditions.flow_kg_s >= 0 ? 'charge' : 'discharge';
  const end = direction === 'charge' ? 'charge_inlet' : 'discharge_inlet';
  const channel = model.map.gas[store.id]?.[end] ?? -1;
  const read = channel >= 0 ? (scan.values[channel] as number) : Number.NaN;
  const point = Number.isFinite(read)
    ? null
    : model.machine.operate(direction, outlets[direction], conditions.ambient_K);
  const assumed = store.kind === 'hot' ? point?.inlets.hot_K : point?.inlets.cold_K;
  return {
    massFlux_kg_m2s: conditions.flow_kg_s / store.bed.area_m2,
    inlet_K: Number.isFinite(read) ? read : (assumed ?? store.reference_cold_K),
    inletSigma_K: Number.isFinite(read) ? 0 : ASSUMED_INLET_SIGMA_K,
    ambient_K: conditions.ambient_K,
    dt_s,
    travelSigma_m,
  };
}

function meanFlowFactor(model: UnitModel, state: UnitState): { factor: number; sigma: number } {
  const all = model.stores.map((store, s) =>
    meanFactor(store, state.stores[s] as StoreState, 'flow'),
  );
  const factor = all.reduce((sum, f) => sum + f.value, 0) / all.length;
  const sigma = Math.sqrt(all.reduce((sum, f) => sum + f.sigma ** 2, 0)) / all.length / factor;
  return { factor, sigma: Math.hypot(sigma, model.unit.estimator.machine_factor_sigma) };
}

function learnMachine(
  model: UnitModel,
  state: UnitState,
  conditions: Conditions,
  dt_s: number,
  modeChanged: boolean,
  outlets: Record<Direction, StoreTemperatures>,
): void {
  if (modeChanged) {
    state.factors.charge.steady_s = 0;
    state.factors.discharge.steady_s = 0;
  }
  if (conditions.mode === 'stand' || !conditions.flowKnown || !Number.isFinite(conditions.power_W))
    return;
  const flow = Math.abs(conditions.flow_kg_s);
  if (flow < model.unit.estimator.stand_flow_kg_s || dt_s <= 0) return;
  const direction = conditions.mode;
  const { machine } = model;
  const work = machine.operate(
    direction,
    outlets[direction],
    conditions.ambient_K,
  ).specificWork_J_kg;
  const sign = direction === 'charge' ? -1 : 1;
  const gross = Math.abs(conditions.power_W) + sign * machine.auxiliary_running_W;
  stepMachineFactor(
    state.factors[direction],
    gross / (flow * work),
    dt_s,
    meanFlowFactor(model, state),
  );
}

function hoursInput(
  model: UnitModel,
  state: UnitState,
  scan: Scan | null,
  ambient_K: number,
): HoursInput {
  return {
    unit: model.unit,
    machine: model.machine,
    models: model.stores,
    states: state.stores,
    plenum_K: model.stores.map((store) => {
      const channel = model.map.gas[store.store.id]?.charge_inlet ?? -1;
      const read = channel >= 0 && scan !== null ? (scan.values[channel] as number) : Number.NaN;
      return state.mode === 'discharge' ? read : Number.NaN;
    }),
    workFactor: machineFactor(state.factors.discharge, meanFlowFactor(model, state)),
    ambient_K,
  };
}

function describe(
  model: UnitModel,
  state: UnitState,
  scan: Scan,
  taken: Taken,
  ask: UnitAsk,
): UnitStep {
  const { unit } = model;
  const flowing = taken.conditions.flow_kg_s !== 0;
  const stores: Record<string, StoreEstimate> = {};
  model.stores.forEach((store, s) => {
    stores[store.store.id] = estimateStore(store, state.stores[s] as StoreState, {
      front_views: [],
      spread_ratio: null,
      flowing,
    });
  });
  const input = hoursInput(model, state, scan, taken.conditions.ambient_K);
  const time = new Date(scan.time_ms).toISOString();
  const estimate: Estimate = {
    time,
    unit: unit.id,
    revision: 0,
    mode: taken.conditions.mode,
    quality: qualityOf(model, state, scan, taken),
    state_of_charge: stateOfCharge(model, state, scan, input, taken.modeChanged),
    stores,
  };
  if (ask.hours_at_W.length > 0) {
    estimate.dispatch = ask.hours_at_W.map((power) => computeHours(input, power));
  }
  const profile: ProfileView | null = ask.profile
    ? {
        time,
        unit: unit.id,
        stores: Object.fromEntries(
          model.stores.map((store, s) => [
            store.store.id,
            profileOf(store, state.stores[s] as StoreState, scan.values),
          ]),
        ),
      }
    : null;
  return { estimate, profile, events: [] };
}

/**
 * Dispatchable over rated energy at rated power. Rolled out every ten minutes and on a change of
 * mode; between, it moves with the store that holds less, by what a
 * full unit delivers.
 */
function stateOfCharge(
  model: UnitModel,
  state: UnitState,
  scan: Scan,
  input: HoursInput,
  modeChanged: boolean,
): number {
  const { unit } = model;
  const least = Math.min(
    ...model.stores.map((store, s) => storeEnergy(store, state.stores[s] as StoreState).soc),
  );
  const last = state.charge;
  const due =
    last === null ||
    modeChanged ||
    scan.time_ms - last.time_ms >= CHARGE_EVERY_S * 1000 ||
    Math.abs(least - last.least) > 0.05;
  if (due) {
    const hours = centralHours(input, unit.rated_power_W).hours;
    state.charge = { value: hours / unit.rated_hours, time_ms: scan.time_ms, least };
    return state.charge.value;
  }
  return Math.max(0, last.value + (model.fullHours / unit.rated_hours) * (least - last.least));
}

function qualityOf(model: UnitModel, state: UnitState, scan: Scan, taken: Taken): Quality {
  const age_s = state.seen_ms === null ? Infinity : (scan.time_ms - state.seen_ms) / 1000;
  if (age_s > model.unit.watch.data_age_s.limit) return 'stale';
  if (taken.steps.some((step) => step === 'missed' || step === 'not_started')) return 'blind';
  const used = state.stores.reduce((sum, store) => sum + store.used, 0);
  if (used === 0 && !taken.conditions.flowKnown) return 'blind';
  const settled = state.stores.every((store) => store.settled >= 10);
  if (!taken.conditions.flowKnown || used < 0.6 * model.thermocouples.length || !settled) {
    return 'degraded';
  }
  return 'good';
}

/** True where the unit's own clock for hours (source time) strikes between two scans. */
export function hoursDue(unit: UnitDefinition, last_ms: number | null, now_ms: number): boolean {
  if (last_ms === null) return true;
  const every = unit.hours_every_s * 1000;
  return Math.floor(now_ms / every) !== Math.floor(last_ms / every);
}

export function saveUnit(state: UnitState): UnitSnapshot {
  return { version: SNAPSHOT_VERSION, state: structuredClone(state) };
}

/** @throws RangeError where the snapshot is of another version or another unit's shape */
export function restoreUnit(unit: UnitDefinition, snapshot: UnitSnapshot): UnitState {
  if (snapshot.version !== SNAPSHOT_VERSION) {
    throw new RangeError(`snapshot version ${snapshot.version}: expected ${SNAPSHOT_VERSION}`);
  }
  const model = unitModel(unit);
  model.stores.forEach((store, s) => {
    store.tubes.forEach((tube, k) => {
      const size = snapshot.state.stores[s]?.tubes[k]?.covariance.length;
      if (size !== tube.layout.size ** 2) {
        throw new RangeError(
          `snapshot of string ${tube.string.id}: covariance has ${size} elements, expected ${tube.layout.size ** 2}`,
        );
      }
    });
  });
  return structuredClone(snapshot.state);
}

/** Hours and energy at given powers [W] from the present state. */
export function hoursAt(
  unit: UnitDefinition,
  state: UnitState,
  powers_W: readonly number[],
): DispatchAnswer[] {
  const model = unitModel(unit);
  const input = hoursInput(model, state, null, unit.ambient_K);
  return powers_W.map((power) => computeHours(input, power));
}
