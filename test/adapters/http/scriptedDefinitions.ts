import type {
  Fluid,
  Solid,
  StoreDefinition,
  ThermocoupleDefinition,
  UnitDefinition,
} from '../../../src/core/definitions.js';

/** Literal definitions, made without the configuration, for tests of HTTP and the page. */

const ZERO_C = 273.15;

const rock: Solid = {
  name: 'test rock',
  source: 'test',
  range_K: [100, 1000],
  density_kg_m3: 2700,
  heatCapacity: () => 900,
  enthalpy: (temperature_K) => 900 * temperature_K,
  conductivity: () => 2.5,
  emissivity: 0.85,
};

const argon: Fluid = {
  name: 'test argon',
  source: 'test',
  phase: 'gas',
  range_K: [100, 1000],
  gasConstant_J_kgK: 208.13,
  heatCapacity: () => 520.333,
  enthalpy: (temperature_K) => 520.333 * temperature_K,
  viscosity_Pa_s: () => 3e-5,
  conductivity: () => 0.02,
  density_kg_m3: (temperature_K, pressure_Pa) => pressure_Pa / (208.13 * temperature_K),
};

interface StoreSketch {
  id: string;
  kind: 'hot' | 'cold';
  inlet: 'top' | 'bottom';
  length_m: number;
  diameter_m: number;
  hot_degC: number;
  cold_degC: number;
}

function thermocouples(store: string, string: string, length_m: number): ThermocoupleDefinition[] {
  return Array.from({ length: 14 }, (_, i) => ({
    id: `${store}.${string}.${String(i + 1).padStart(2, '0')}`,
    position_m: Math.round(((i + 0.5) / 14) * length_m * 100) / 100,
    group: null,
  }));
}

export function storeOf(sketch: StoreSketch): StoreDefinition {
  const { id, kind, length_m, diameter_m } = sketch;
  return {
    id,
    kind,
    charge_inlet_at: sketch.inlet,
    bed: {
      length_m,
      area_m2: (Math.PI / 4) * diameter_m ** 2,
      diameter_m,
      particle_diameter_m: 0.02,
      void_fraction: 0.4,
      solid: rock,
      fluid: argon,
      pressure_Pa: kind === 'hot' ? 1_050_000 : 105_000,
      particle_shape: 'crushed',
      heat_transfer_factor: 1,
      conductivity_factor: 1,
      pressure_drop_factor: 1,
      heat_capacity_factor: 1,
      loss_factor: 1,
      wall_loss_W_m2K: 0.3,
      end_loss_W_m2K: { charge_inlet: 0.3, discharge_inlet: 0.3 },
      end_capacity_J_K: { charge_inlet: 0, discharge_inlet: 0 },
      end_volume_m3: { charge_inlet: 0, discharge_inlet: 0 },
    },
    reference_hot_K: sketch.hot_degC + ZERO_C,
    reference_cold_K: sketch.cold_degC + ZERO_C,
    strings: ['A', 'B', 'C'].map((string, i) => ({
      id: string,
      radius_m: [0.2, 0.55, 0.85][i]! * (diameter_m / 2),
      area_share: [0.15, 0.35, 0.5][i]!,
      thermocouples: thermocouples(id, string, length_m),
    })),
  };
}

const span = { power_min_W: 0.5e6, power_max_W: 3e6, flow_min_kg_s: 3, flow_max_kg_s: 30 };
const delays = { on_delay_s: 60, off_delay_s: 60 };

export function unitOf(id: string, name: string, stores: StoreDefinition[]): UnitDefinition {
  return {
    id,
    name,
    scan_period_s: 30,
    rated_power_W: 2e6,
    rated_hours: 8,
    ambient_K: 288.15,
    stores,
    channels: [],
    machine: {
      kind: 'gas_cycle',
      gas: argon,
      high_pressure_Pa: 1_050_000,
      low_pressure_Pa: 105_000,
      compressor_polytropic_efficiency: 0.9,
      expander_polytropic_efficiency: 0.9,
      loop_pressure_loss: 0.03,
      cooler_approach_K: 10,
      motor_efficiency: 0.97,
      generator_efficiency: 0.97,
      auxiliary_running_W: 20_000,
      auxiliary_standing_W: 5_000,
    },
    limits: {
      charge: span,
      discharge: span,
      hot_outlet_min_K: 430 + ZERO_C,
      cold_outlet_max_K: -110 + ZERO_C,
      charge_hot_outlet_max_K: 120 + ZERO_C,
      charge_cold_outlet_min_K: null,
      pressure_drop_max_Pa: 8000,
    },
    estimator: {
      cells: 100,
      reading_sigma_K: 1,
      offset_sigma_K: 1,
      group_offset_sigma_K: 1,
      offset_time_s: 86_400,
      position_sigma_m: 0.02,
      flow_factor_sigma: 0.1,
      heat_transfer_factor_sigma: 0.3,
      gas_share: 0.3,
      gas_share_sigma: 0.2,
      inlet_sigma_K: 3,
      heat_capacity_sigma: 0.03,
      machine_factor_sigma: 0.02,
      stand_flow_kg_s: 0.5,
    },
    watch: {
      spread_ratio: { limit: 1.5, deadband: 0.1, ...delays },
      outlet_margin_K: { limit: 20, deadband: 5, ...delays },
      data_age_s: { limit: 120, deadband: 30, ...delays },
      sensor_rejected: delays,
      database_down: delays,
    },
    hours_at_W: [1e6, 2e6],
    hours_every_s: 600,
  };
}

export const HOT = storeOf({
  id: 'hot',
  kind: 'hot',
  inlet: 'top',
  length_m: 8,
  diameter_m: 5.6,
  hot_degC: 500,
  cold_degC: 25,
});

export const COLD = storeOf({
  id: 'cold',
  kind: 'cold',
  inlet: 'bottom',
  length_m: 6.5,
  diameter_m: 6.2,
  hot_degC: 20,
  cold_degC: -160,
});
