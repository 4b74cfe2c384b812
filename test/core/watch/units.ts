import { fluidByName } from '../../../src/core/bed/fluids.js';
import type { StoreDefinition, UnitDefinition } from '../../../src/core/definitions.js';
import type { Estimate, StoreEstimate } from '../../../src/core/estimate.js';
import { bedOf } from '../../support/beds.js';

const IN_PAIR = { on_delay_s: 60, off_delay_s: 60 };

export function storeOf(id: string, kind: 'hot' | 'cold'): StoreDefinition {
  return {
    id,
    kind,
    charge_inlet_at: 'top',
    bed: bedOf(),
    reference_hot_K: kind === 'hot' ? 773.15 : 298.15,
    reference_cold_K: kind === 'hot' ? 298.15 : 113.15,
    strings: [
      {
        id: 'a',
        radius_m: 0,
        area_share: 1,
        thermocouples: [0.2, 0.6, 1].map((position_m, k) => ({
          id: `${id}_a_${k + 1}`,
          position_m,
          group: null,
        })),
      },
    ],
  };
}

export function unitOf(change: Partial<UnitDefinition> = {}): UnitDefinition {
  const direction = { power_min_W: 0, power_max_W: 1e6, flow_min_kg_s: 0, flow_max_kg_s: 10 };
  return {
    id: 'one',
    name: 'Unit one',
    scan_period_s: 30,
    rated_power_W: 1e6,
    rated_hours: 10,
    ambient_K: 293.15,
    stores: [storeOf('hot', 'hot'), storeOf('cold', 'cold')],
    channels: [],
    machine: {
      kind: 'efficiency_table',
      fluid: fluidByName('air'),
      outlet_K: [500, 800],
      efficiency: [0.2, 0.4],
      return_K: 300,
      charge_inlet_K: 773.15,
      charge_efficiency: 0.98,
      auxiliary_running_W: 0,
      auxiliary_standing_W: 0,
    },
    limits: {
      charge: direction,
      discharge: direction,
      hot_outlet_min_K: 673.15,
      cold_outlet_max_K: 203.15,
      charge_hot_outlet_max_K: null,
      charge_cold_outlet_min_K: null,
      pressure_drop_max_Pa: null,
    },
    estimator: {
      cells: 100,
      reading_sigma_K: 0.5,
      offset_sigma_K: 1,
      group_offset_sigma_K: 0.5,
      offset_time_s: 1e6,
      position_sigma_m: 0.005,
      flow_factor_sigma: 0.05,
      heat_transfer_factor_sigma: 0.3,
      gas_share: 0,
      gas_share_sigma: 0.2,
      inlet_sigma_K: 2,
      heat_capacity_sigma: 0.03,
      machine_factor_sigma: 0.03,
      stand_flow_kg_s: 0.01,
    },
    watch: {
      spread_ratio: { limit: 1.3, deadband: 0.1, ...IN_PAIR },
      outlet_margin_K: { limit: 15, deadband: 5, ...IN_PAIR },
      data_age_s: { limit: 150, deadband: 0, on_delay_s: 0, off_delay_s: 0 },
      sensor_rejected: IN_PAIR,
      database_down: IN_PAIR,
    },
    hours_at_W: [],
    hours_every_s: 600,
    ...change,
  };
}

export function storeEstimate(change: Partial<StoreEstimate> = {}): StoreEstimate {
  return {
    soc: 0.5,
    soc_sigma: 0.01,
    stored_MWh_th: 1,
    stored_sigma_MWh_th: 0.01,
    fronts: [],
    fronts_reason: null,
    energy_position_m: 0.6,
    spread_ratio: null,
    heat_transfer_factor: 1,
    heat_transfer_factor_sigma: 0.1,
    strings: [],
    front_views: [],
    sensors: { used: 3, rejected: [] },
    outlet_K: null,
    ...change,
  };
}

export function estimateOf(
  time_ms: number,
  hot: Partial<StoreEstimate> = {},
  cold: Partial<StoreEstimate> = {},
): Estimate {
  return {
    time: new Date(time_ms).toISOString(),
    unit: 'one',
    revision: 0,
    mode: 'discharge',
    quality: 'good',
    state_of_charge: 0.5,
    stores: { hot: storeEstimate(hot), cold: storeEstimate(cold) },
  };
}
