import { cyclePower_W, type SettledCycle, settledCycle } from '../../core/cycle/settledCycle.js';
import type { Direction, StoreDefinition, UnitDefinition } from '../../core/definitions.js';
import { createMachine, type Machine } from '../../core/machine/machine.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import { type InControl, inControlOf } from '../../core/watch/inControl.js';
import { type LimitFacts, limitFacts } from './limitFacts.js';
import { type MissingChannel, missingChannels } from './missing.js';
import { type MissingLimit, missingLimits } from './missingLimits.js';
import { notesOf } from './notes.js';
import { referenceOutlets } from './referenceOutlets.js';
import { type StoreFacts, storeFacts } from './storeFacts.js';

/** One direction of the machine at its power in the cycle, the stores at their references. */
export interface DirectionFacts {
  readonly power_MW_el: number;
  readonly specific_work_kJ_kg: number;
  /** Null where no flow gives that power. */
  readonly flow_kg_s: number | null;
  /** What the machine sends into the stores. */
  readonly hot_inlet_degC: number;
  readonly cold_inlet_degC: number | null;
}

export interface UnitFacts {
  readonly id: string;
  readonly name: string;
  readonly channels: number;
  readonly rated_power_MW_el: number;
  readonly rated_hours_h: number;
  readonly charge: DirectionFacts;
  readonly discharge: DirectionFacts;
  /** Hours at rated power until each store is empty if its front had no width. */
  readonly plug_flow_hours: Readonly<Record<string, number>>;
  readonly cycle: SettledCycle;
  readonly round_trip: number;
  readonly stores: readonly StoreFacts[];
  /** What ramps, start-ups and connection make of the powers. */
  readonly limits: LimitFacts;
  /** How seldom the indicators call a healthy unit degraded. */
  readonly watch: InControl;
  readonly missing: readonly MissingChannel[];
  readonly missing_limits: readonly MissingLimit[];
  /** What a person should look at; not faults. */
  readonly notes: readonly string[];
}

export function unitFacts(unit: UnitDefinition): UnitFacts {
  const machine = createMachine(unit.machine);
  const charge = directionFacts(unit, machine, 'charge');
  const discharge = directionFacts(unit, machine, 'discharge');
  const flow_kg_s = discharge.flow_kg_s ?? unit.limits.discharge.flow_max_kg_s;
  const stores = unit.stores.map((store) =>
    storeFacts(store, flow_kg_s, unit.ambient_K, coldest_K(store, charge)),
  );
  const cycle = settledCycle(unit, machine);
  const facts = {
    id: unit.id,
    name: unit.name,
    channels: unit.channels.length,
    rated_power_MW_el: unit.rated_power_W / 1e6,
    rated_hours_h: unit.rated_hours,
    charge,
    discharge,
    plug_flow_hours: Object.fromEntries(stores.map((s) => [s.id, s.full_charge_h])),
    cycle,
    round_trip: cycle.discharge.energy_MWh_el / cycle.charge.energy_MWh_el,
    stores,
    limits: limitFacts(unit),
    watch: inControlOf(unit),
  };
  return {
    ...facts,
    missing: missingChannels(unit, machine),
    missing_limits: missingLimits(unit),
    notes: notesOf(unit, machine, facts),
  };
}

function directionFacts(
  unit: UnitDefinition,
  machine: Machine,
  direction: Direction,
): DirectionFacts {
  const outlets = referenceOutlets(unit, direction);
  const power_W = cyclePower_W(unit, direction);
  const point = machine.operate(direction, outlets, unit.ambient_K);
  const answer = machine.flowForPower(direction, power_W, outlets, unit.ambient_K);
  const { hot_K, cold_K } = point.inlets;
  return {
    power_MW_el: power_W / 1e6,
    specific_work_kJ_kg: point.specificWork_J_kg / 1e3,
    flow_kg_s: 'reason' in answer ? null : answer.flow_kg_s,
    hot_inlet_degC: hot_K - ZERO_CELSIUS_K,
    cold_inlet_degC: cold_K === null ? null : cold_K - ZERO_CELSIUS_K,
  };
}

/** The lowest of what the references say and what the machine sends into the store. */
function coldest_K(store: StoreDefinition, charge: DirectionFacts): number {
  const sent = store.kind === 'cold' ? charge.cold_inlet_degC : null;
  const reference = store.reference_cold_K;
  return sent === null ? reference : Math.min(reference, sent + ZERO_CELSIUS_K);
}
