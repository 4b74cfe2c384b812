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
/** A rollout that many units may want at one moment is made within this long, see `wait`. */
const CHARGE_WAIT_S = 60;
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
  /** A rollout is wanted at the unit's next turn. */
  wanted?: boolean;
}

/**
 * Dispatchable over rated energy at rated power. Rolled out every ten minutes, on a change of mode
 * and on a jump of a store. Between, a discharge takes from it what it delivers, with the auxiliaries,
 * over what rated power takes; otherwise it moves with the store that holds less, by what a full unit
 * delivers. What a rollout of the ten minutes says otherwise comes in over the next ten.
 *
 * Where many units may want a rollout at one moment, all being new or changing over together, a unit's
 * own comes in its turn, at most a minute later; until its first, `least` stands for it.
 *
 * @param least state of charge of the store that holds less
 * @param before_ms time of the scan before; null: none was
 * @param turn the unit's place in that minute, in [0, 1); 0: it is alone, and never waits
 */
export function stateOfCharge(
  model: UnitModel,
  state: UnitState,
  { time_ms: now_ms }: Scan,
  least: number,
  conditions: Conditions,
  modeChanged: boolean,
  before_ms: number | null = null,
  turn = 0,
): number {
  const { unit } = model;
  const last = state.charge;
  const mayRoll =
    turn === 0 || (before_ms !== null && strikes(turn, CHARGE_WAIT_S, before_ms, now_ms));
  if (last === null && !mayRoll) return least;
  const shown = last === null ? 0 : shownCharge(model, last, now_ms, least, conditions);
  const jump =
    last === null ||
    modeChanged ||
    last.wanted === true ||
    Math.abs(least - last.least) > CHARGE_JUMP;
  if (last !== null && jump && !mayRoll) last.wanted = true;
  const isDue = last === null || strikes(shareOf(unit.id), CHARGE_EVERY_S, last.time_ms, now_ms);
  if (!(jump && mayRoll) && !isDue) return shown;
  const input = hoursInput(model, state, unit.rated_power_W);
  const value = centralHours(input, unit.rated_power_W).hours / unit.rated_hours;
  const step = jump ? 0 : shown - value;
  state.charge = { value, time_ms: now_ms, least, step, given: 0, seen_ms: now_ms };
  return value + step;
}

/**
 * Whether a span of time is over that begins at a share of it which is the unit's own: many units that
 * started or changed over together do not roll out in the same scan ever after.
 */
function strikes(share: number, every_s: number, last_ms: number, now_ms: number): boolean {
  const every_ms = every_s * 1000;
  const stroke = (time_ms: number) => Math.floor((time_ms - share * every_ms) / every_ms);
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
