import type { Direction } from '../definitions.js';
import type { DispatchAnswer } from '../estimate.js';
import type { StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import type { Conditions } from '../track/conditions.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { calibrate } from './calibration.js';
import { startHeatBalance } from './heatBalance.js';
import { centralHours, computeHours, type HoursInput } from './hours.js';
import { ageMachineFactor, stepMachineFactor } from './machineFactor.js';
import { machineSpread, partLoadFactor } from './machineSpread.js';

/** A rollout for the state of charge this often [s], at times of the unit's own: see `chargeDue`. */
const CHARGE_EVERY_S = 600;
/** A jump of a store's state of charge beyond this asks for a rollout at once. */
const CHARGE_JUMP = 0.05;

/**
 * One scan's news for the machine factors of both directions (changed in place): measured over
 * modelled power per metered kilogram while the unit runs with flow and power read.
 *
 * @param dt_s time since the scan before [s]
 * @param outlets gas leaving the stores in either direction [K]
 */
export function learnMachine(
  model: UnitModel,
  state: UnitState,
  conditions: Conditions,
  dt_s: number,
  modeChanged: boolean,
  outlets: Record<Direction, StoreTemperatures>,
): void {
  for (const factor of [state.factors.charge, state.factors.discharge]) {
    ageMachineFactor(factor, dt_s);
    if (modeChanged) factor.steady_s = 0;
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
  const model_J_kg = work * partLoadFactor(machineSpread(model.unit), direction, flow);
  const ratio = gross / (flow * model_J_kg);
  const change = stepMachineFactor(state.factors[direction], ratio, dt_s, flow);
  if (change === 0) return;
  // A meter that steps is in all that was metered so far.
  const other = state.factors[direction === 'charge' ? 'discharge' : 'charge'];
  if (other.variance !== null) other.variance += change;
  state.balances.forEach((_, s) => {
    state.balances[s] = startHeatBalance();
  });
}

/** What hours at a power are computed from, in the unit's present state. */
export function hoursInput(model: UnitModel, state: UnitState, power_W: number): HoursInput {
  return {
    unit: model.unit,
    machine: model.machine,
    models: model.stores,
    states: state.stores,
    plenum_K: state.plenum_K,
    calibration: calibrate(model, state, power_W / model.unit.rated_power_W).joint,
    ambient_K: state.ambient_K,
  };
}

/** State of charge by the last rollout, and what has changed since. */
export interface ChargeState {
  /** By rollout, when, and the least state of charge of a store then. */
  readonly value: number;
  readonly time_ms: number;
  readonly least: number;
  /** What was shown just before less that value: it fades, so that no rollout makes a step. */
  readonly step: number;
  /** Delivered since, as a share of the rated energy; time of the last scan. */
  given: number;
  seen_ms: number;
}

/**
 * Dispatchable over rated energy at rated power. Rolled out every ten minutes, on a change of mode
 * and on a jump of a store. Between, a discharge takes from it what it delivers, with the auxiliaries,
 * over what rated power takes; otherwise it moves with the store that holds less, by what a full unit
 * delivers. What a rollout of the ten minutes says otherwise comes in over the next ten.
 *
 * @param least state of charge of the store that holds less
 */
export function stateOfCharge(
  model: UnitModel,
  state: UnitState,
  scan: Scan,
  least: number,
  conditions: Conditions,
  modeChanged: boolean,
): number {
  const { unit } = model;
  const last = state.charge;
  const shown = last === null ? 0 : shownCharge(model, last, scan.time_ms, least, conditions);
  const jump = last === null || modeChanged || Math.abs(least - last.least) > CHARGE_JUMP;
  if (!jump && !chargeDue(unit.id, last.time_ms, scan.time_ms)) return shown;
  const input = hoursInput(model, state, unit.rated_power_W);
  const value = centralHours(input, unit.rated_power_W).hours / unit.rated_hours;
  const time_ms = scan.time_ms;
  const step = jump ? 0 : shown - value;
  state.charge = { value, time_ms, least, step, given: 0, seen_ms: time_ms };
  return value + step;
}

/**
 * Whether the ten minutes of a unit are over. They begin at a time of its own, which follows from its
 * id: many units that started or changed over together do not roll out in the same scan ever after.
 */
function chargeDue(id: string, last_ms: number, now_ms: number): boolean {
  const every_ms = CHARGE_EVERY_S * 1000;
  const phase_ms = shareOf(id) * every_ms;
  const stroke = (time_ms: number) => Math.floor((time_ms - phase_ms) / every_ms);
  return stroke(now_ms) !== stroke(last_ms);
}

/** A number in [0, 1) that is another for each text, spread evenly (FNV-1a, 32 bit, folded). */
function shareOf(text: string): number {
  let hash = 0x811c9dc5;
  for (let i = 0; i < text.length; i++) {
    hash = Math.imul(hash ^ text.charCodeAt(i), 0x01000193);
  }
  hash ^= hash >>> 15;
  hash = Math.imul(hash, 0x2c1b3c6d);
  hash ^= hash >>> 12;
  return (hash >>> 0) / 2 ** 32;
}

/** What is shown between rollouts; counts what was delivered. */
function shownCharge(
  model: UnitModel,
  charge: ChargeState,
  time_ms: number,
  least: number,
  conditions: Conditions,
): number {
  const { unit, machine } = model;
  const left = Math.max(0, 1 - (time_ms - charge.time_ms) / (CHARGE_EVERY_S * 1000));
  const start = charge.value + charge.step * left;
  const delivered = Math.abs(conditions.power_W) + machine.auxiliary_running_W;
  if (conditions.mode === 'discharge' && Number.isFinite(delivered)) {
    const share = delivered / (unit.rated_power_W + machine.auxiliary_running_W);
    const hours = (time_ms - charge.seen_ms) / 3.6e6;
    charge.given += (share * hours) / unit.rated_hours;
    charge.seen_ms = time_ms;
    return Math.max(0, start - charge.given);
  }
  charge.seen_ms = time_ms;
  const perCharge = model.fullHours() / unit.rated_hours;
  return Math.max(0, start + perCharge * (least - charge.least));
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
  return powers_W.map((power) => computeHours(hoursInput(model, state, power), power));
}

/** Before every store has started anything between nothing and all is possible: nothing is firm. */
function unknownHours(model: UnitModel, power_W: number): DispatchAnswer {
  const most = (model.fullHours() * model.unit.rated_power_W) / power_W;
  const power_MW = power_W / 1e6;
  return {
    power_MW,
    hours: { p90: 0, p50: 0, p10: most },
    energy_MWh_el: { p90: 0, p50: 0, p10: most * power_MW },
    ends_by: 'empty',
  };
}
