import type { Mode, UnitDefinition } from '../core/definitions.js';
import type { Machine, StoreTemperatures } from '../core/machine/machine.js';
import { advanceStore, copyStore, type PlantStore, socOf } from './plantStore.js';

/** What the demonstration plant is at one moment. */
export interface PlantState {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  /** Work of this plant's own machine over that of the definition. */
  readonly workFactor: number;
  readonly stores: readonly PlantStore[];
  time_s: number;
  mode: Mode;
  /** Time since the mode changed [s]. */
  since_s: number;
  /** Positive while charging [kg/s]. */
  flow_kg_s: number;
  /** Net at the connection point, positive while charging [W]. */
  power_W: number;
}

export type PlantStop = 'hot_outlet' | 'cold_outlet' | 'flow' | 'empty' | 'full';

/** Longest inner step [s]: a tenth of the time in which rock follows gas; looking ahead twice that. */
const STEP_S = 15;
const AHEAD_STEP_S = 30;
/** Outlet rules wait for the gas that stood under the lid to be swept out [s]. */
const SWEEP_S = 600;

export function copyState(state: PlantState): PlantState {
  return { ...state, stores: state.stores.map(copyStore) };
}

/** Ambient temperature [K]: a daily wave about the definition's, coldest at four in the morning. */
export function ambientOf(unit: UnitDefinition, time_s: number): number {
  return unit.ambient_K - 4 * Math.cos((2 * Math.PI * (time_s - 4 * 3600)) / 86400);
}

function outletsOf(state: PlantState, charging: boolean): StoreTemperatures {
  const end = charging ? 1 : 0;
  const cold = state.stores.find((s) => s.definition.kind === 'cold');
  const hot = state.stores.find((s) => s.definition.kind === 'hot');
  if (!hot)
    throw new RangeError(
      `unit ${state.unit.id} has no hot store, which the demonstration plant needs`,
    );
  return { hot_K: hot.pipes_K[end], cold_K: cold ? cold.pipes_K[end] : null };
}

/**
 * Advances the plant at a net power [W], positive both ways, 0 while standing.
 * @returns why it cannot go on in this mode, null if it can
 */
export function advancePlant(
  state: PlantState,
  mode: Mode,
  power_W: number,
  duration_s: number,
  each?: (dt_s: number) => void,
  longestStep_s = STEP_S,
): PlantStop | null {
  const parts = Math.max(1, Math.ceil(duration_s / longestStep_s - 1e-9));
  const dt = duration_s / parts;
  let stop: PlantStop | null = null;
  for (let i = 0; i < parts && stop === null; i++) {
    if (mode !== state.mode) {
      state.mode = mode;
      state.since_s = 0;
    }
    const before_s = state.time_s;
    stop = mode === 'stand' ? stand(state, dt) : run(state, mode === 'charge', power_W, dt);
    if (stop === null || state.time_s > before_s) each?.(dt);
  }
  return stop;
}

function stand(state: PlantState, dt: number): null {
  const ambient = ambientOf(state.unit, state.time_s);
  state.flow_kg_s = 0;
  state.power_W = state.machine.auxiliary_standing_W;
  for (const store of state.stores) advanceStore(store, dt, 0, ambient, ambient);
  state.time_s += dt;
  state.since_s += dt;
  return null;
}

function run(state: PlantState, charging: boolean, power_W: number, dt: number): PlantStop | null {
  const { unit, machine, workFactor } = state;
  const direction = charging ? 'charge' : 'discharge';
  const ambient = ambientOf(unit, state.time_s);
  const outlets = outletsOf(state, charging);
  const answer = machine.flowForPower(direction, power_W, outlets, ambient, workFactor);
  const flowMax = unit.limits[direction].flow_max_kg_s;
  if ('reason' in answer) return 'empty';
  if (!charging && answer.flow_kg_s > flowMax) return 'flow';
  const flow = Math.min(answer.flow_kg_s, flowMax);
  if (!(flow > 0)) return 'empty';
  const { inlets } = machine.operate(direction, outlets, ambient);
  state.flow_kg_s = charging ? flow : -flow;
  const net = machine.powerForFlow(direction, flow, outlets, ambient, workFactor);
  state.power_W = charging ? net : -net;
  for (const store of state.stores) {
    const inlet = store.definition.kind === 'hot' ? inlets.hot_K : inlets.cold_K;
    if (inlet === null)
      throw new RangeError(
        `the machine of unit ${unit.id} has no gas for store ${store.definition.id}`,
      );
    advanceStore(store, dt, state.flow_kg_s, inlet, ambient);
  }
  state.time_s += dt;
  state.since_s += dt;
  return state.since_s < SWEEP_S ? null : outletRule(state, charging);
}

function outletRule(state: PlantState, charging: boolean): PlantStop | null {
  const { limits } = state.unit;
  const { hot_K, cold_K } = outletsOf(state, charging);
  if (charging) {
    const hotFull =
      limits.charge_hot_outlet_max_K !== null && hot_K > limits.charge_hot_outlet_max_K;
    const coldMin = limits.charge_cold_outlet_min_K;
    return hotFull || (coldMin !== null && cold_K !== null && cold_K < coldMin) ? 'full' : null;
  }
  if (limits.hot_outlet_min_K !== null && hot_K < limits.hot_outlet_min_K) return 'hot_outlet';
  if (limits.cold_outlet_max_K !== null && cold_K !== null && cold_K > limits.cold_outlet_max_K)
    return 'cold_outlet';
  return null;
}

/** True hours at a constant net power [W] from a state, by running a copy on; resolution half a minute. */
export function hoursFrom(state: PlantState, power_W: number): number {
  if (!(power_W > 0)) throw new RangeError(`power_W must be positive, got ${power_W}`);
  const ahead = copyState(state);
  const start = ahead.time_s;
  const horizon_s = 200 * 3600;
  while (ahead.time_s - start < horizon_s) {
    if (advancePlant(ahead, 'discharge', power_W, AHEAD_STEP_S, undefined, AHEAD_STEP_S) !== null)
      break;
  }
  return (ahead.time_s - start) / 3600;
}

/** State of charge of the fuller and of the emptier store. */
export function socRange(state: PlantState): [least: number, most: number] {
  const all = state.stores.map(socOf);
  return [Math.min(...all), Math.max(...all)];
}
