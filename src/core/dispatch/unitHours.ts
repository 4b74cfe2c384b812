import type { Direction } from '../definitions.js';
import type { DispatchAnswer } from '../estimate.js';
import type { StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import type { Conditions } from '../track/conditions.js';
import { meanFactor } from '../track/storeEstimate.js';
import type { StoreState } from '../track/storeTracker.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { centralHours, computeHours, type HoursInput } from './hours.js';
import { machineFactor, stepMachineFactor } from './machineFactor.js';

/** A rollout for the state of charge at least this often [s]. */
const CHARGE_EVERY_S = 600;
/** A jump of a store's state of charge beyond this asks for a rollout at once. */
const CHARGE_JUMP = 0.05;

export function meanFlowFactor(
  model: UnitModel,
  state: UnitState,
): { factor: number; sigma: number } {
  const all = model.stores.map((store, s) =>
    meanFactor(store, state.stores[s] as StoreState, 'flow'),
  );
  const factor = all.reduce((sum, f) => sum + f.value, 0) / all.length;
  const sigma = Math.sqrt(all.reduce((sum, f) => sum + f.sigma ** 2, 0)) / all.length / factor;
  return { factor, sigma: Math.hypot(sigma, model.unit.estimator.machine_factor_sigma) };
}

export function learnMachine(
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
  if (conditions.mode === 'stand' || !conditions.flowKnown || conditions.flowStandIn) return;
  if (!Number.isFinite(conditions.power_W)) return;
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

export function hoursInput(model: UnitModel, state: UnitState): HoursInput {
  return {
    unit: model.unit,
    machine: model.machine,
    models: model.stores,
    states: state.stores,
    plenum_K: state.plenum_K,
    workFactor: machineFactor(state.factors.discharge, meanFlowFactor(model, state)),
    ambient_K: state.ambient_K,
  };
}

/**
 * Dispatchable over rated energy at rated power. Rolled out every ten minutes and on a change of
 * mode; between, it moves with the store that holds less, by what a
 * full unit delivers.
 *
 * @param least state of charge of the store that holds less
 */
export function stateOfCharge(
  model: UnitModel,
  state: UnitState,
  scan: Scan,
  input: HoursInput,
  least: number,
  modeChanged: boolean,
): number {
  const { unit } = model;
  const last = state.charge;
  const due =
    last === null ||
    modeChanged ||
    scan.time_ms - last.time_ms >= CHARGE_EVERY_S * 1000 ||
    Math.abs(least - last.least) > CHARGE_JUMP;
  if (due) {
    const hours = centralHours(input, unit.rated_power_W).hours;
    state.charge = { value: hours / unit.rated_hours, time_ms: scan.time_ms, least };
    return state.charge.value;
  }
  return Math.max(0, last.value + (model.fullHours / unit.rated_hours) * (least - last.least));
}

/** Hours and energy at given powers [W] from the present state. */
export function hoursOf(
  model: UnitModel,
  state: UnitState,
  powers_W: readonly number[],
): DispatchAnswer[] {
  if (!state.stores.every((store) => store.started)) {
    return powers_W.map((power) => unknownHours(model, power));
  }
  const input = hoursInput(model, state);
  return powers_W.map((power) => computeHours(input, power));
}

/** Before every store has started anything between nothing and all is possible: nothing is firm. */
function unknownHours(model: UnitModel, power_W: number): DispatchAnswer {
  const most = (model.fullHours * model.unit.rated_power_W) / power_W;
  const power_MW = power_W / 1e6;
  return {
    power_MW,
    hours: { p90: 0, p50: 0, p10: most },
    energy_MWh_el: { p90: 0, p50: 0, p10: most * power_MW },
    ends_by: 'empty',
  };
}
