import { fluidByName } from '../../../src/core/bed/fluids.js';
import type { EfficiencyTableDefinition, UnitDefinition } from '../../../src/core/definitions.js';
import { type PlanContext, planContext } from '../../../src/core/plan/context.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import type { Fronts } from '../track/fronted.js';
import { hotBed, hotStore, unitOf } from '../track/plants.js';

/** An engine on the small plant's hot store: air at ambient pressure, 25 to 460 degC. */
export const ENGINE: EfficiencyTableDefinition = {
  kind: 'efficiency_table',
  fluid: fluidByName('air'),
  outlet_K: [573.15, 633.15, 733.15],
  efficiency: [0.2, 0.23, 0.27],
  return_K: 298.15,
  charge_inlet_K: 733.15,
  charge_efficiency: 0.97,
  auxiliary_running_W: 1000,
  auxiliary_standing_W: 300,
};

/** The small plant with one hot store and an engine: about 40 kW for 5 h. */
export function engineUnit(over: Partial<UnitDefinition> = {}): UnitDefinition {
  const bed = hotBed({ fluid: fluidByName('air'), pressure_Pa: 1.02e5 });
  const unit = unitOf({
    stores: [hotStore({ bed })],
    rated_power_W: 40e3,
    rated_hours: 5,
    machine: ENGINE,
    hours_at_W: [40e3],
    roles: {
      flow: { kind: 'flow', sense: 'signed' },
      mode: { kind: 'mode' },
      power: { kind: 'power' },
      hot_top: { kind: 'gas_temperature', store: 'hot', end: 'charge_inlet' },
      hot_bottom: { kind: 'gas_temperature', store: 'hot', end: 'discharge_inlet' },
    },
    ...over,
  });
  return {
    ...unit,
    limits: {
      ...unit.limits,
      charge: { power_min_W: 20e3, power_max_W: 300e3, flow_min_kg_s: 0.05, flow_max_kg_s: 0.6 },
      discharge: { power_min_W: 10e3, power_max_W: 60e3, flow_min_kg_s: 0.05, flow_max_kg_s: 0.7 },
      cold_outlet_max_K: null,
      charge_cold_outlet_min_K: null,
      ...over.limits,
    },
  };
}

/** A unit that has watched these fronts at rest. */
export function contextOf(unit: UnitDefinition, fronts: Fronts): PlanContext {
  return planContext(unitModel(unit), watchedUnit(unit, fronts));
}
