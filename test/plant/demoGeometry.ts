import type { PlantGeometry, RawUnit, StoreGeometry } from './geometry.js';

/** The plant of config/demo.yaml as a literal; test/plantGeometry.test.ts holds the two together. */

const ZERO_K = 273.15;
const DEG_C: RawUnit = { scale: 1, offset: -ZERO_K };
const MW: RawUnit = { scale: 1e-6, offset: 0 };
const KPA: RawUnit = { scale: 1e-3, offset: 0 };
const BAR: RawUnit = { scale: 1e-5, offset: 0 };

const STRINGS = ['inner', 'middle', 'outer'];
const COUNT = 14;

function strings(store: string, length_m: number, radius_m: number): StoreGeometry['strings'] {
  return STRINGS.map((id, s) => ({
    id,
    // Centroid radii of three tubes of equal area.
    radius_m: radius_m * Math.sqrt((s + 0.5) / STRINGS.length),
    area_share: 1 / STRINGS.length,
    thermocouples: Array.from({ length: COUNT }, (_, i) => ({
      id: `${store}_${id}_${String(i + 1).padStart(2, '0')}`,
      position_m: ((i + 0.5) * length_m) / COUNT,
      group: `${store}/${id}`,
    })),
  }));
}

const hot: StoreGeometry = {
  id: 'hot',
  kind: 'hot',
  length_m: 8,
  diameter_m: 6,
  particle_diameter_m: 0.02,
  void_fraction: 0.42,
  solid: 'granite',
  fluid: 'argon',
  pressure_Pa: 7.9e5,
  reference_hot_K: 480 + ZERO_K,
  reference_cold_K: 30 + ZERO_K,
  wall_loss_W_m2K: 0.35,
  end_loss_W_m2K: [0.5, 0.5],
  end_capacity_J_K: [3e6, 3e6],
  strings: strings('hot', 8, 3),
};

const cold: StoreGeometry = {
  ...hot,
  id: 'cold',
  kind: 'cold',
  solid: 'basalt',
  pressure_Pa: 1.04e5,
  length_m: 9,
  diameter_m: 6.5,
  reference_hot_K: 30 + ZERO_K,
  reference_cold_K: -125 + ZERO_K,
  strings: strings('cold', 9, 3.25),
};

export const DEMO_GEOMETRY: PlantGeometry = {
  id: 'demo',
  scan_period_s: 60,
  rated_power_W: 1.6e6,
  rated_flow_kg_s: 20,
  flow_max_kg_s: 25,
  hot_outlet_min_K: 420 + ZERO_K,
  cold_outlet_max_K: -80 + ZERO_K,
  charge_hot_outlet_max_K: 80 + ZERO_K,
  charge_cold_outlet_min_K: 0 + ZERO_K,
  stores: [hot, cold],
  machine: {
    kind: 'gas_cycle',
    high_pressure_Pa: 7.9e5,
    low_pressure_Pa: 1.04e5,
    compressor_polytropic_efficiency: 0.9,
    expander_polytropic_efficiency: 0.91,
    loop_pressure_loss: 0.03,
    cooler_approach_K: 15,
    motor_efficiency: 0.97,
    generator_efficiency: 0.97,
    auxiliary_running_W: 40e3,
    auxiliary_standing_W: 8e3,
  },
  channels: [
    { id: 'flow', measures: 'flow' },
    { id: 'mode', measures: 'mode' },
    { id: 'power', measures: 'power' },
    { id: 'ambient', measures: 'ambient_temperature' },
    { id: 'hot_gas_in', measures: 'gas_temperature', store: 'hot', end: 0 },
    { id: 'hot_gas_out', measures: 'gas_temperature', store: 'hot', end: 1 },
    { id: 'cold_gas_in', measures: 'gas_temperature', store: 'cold', end: 0 },
    { id: 'cold_gas_out', measures: 'gas_temperature', store: 'cold', end: 1 },
    { id: 'hot_dp', measures: 'pressure_drop', store: 'hot' },
    { id: 'cold_dp', measures: 'pressure_drop', store: 'cold' },
    { id: 'hot_pressure', measures: 'pressure', store: 'hot' },
    { id: 'cold_pressure', measures: 'pressure', store: 'cold' },
  ],
  raw_units: {
    ...Object.fromEntries(
      [hot, cold].flatMap((s) =>
        s.strings.flatMap((t) => t.thermocouples.map((c) => [c.id, DEG_C])),
      ),
    ),
    power: MW,
    ambient: DEG_C,
    hot_gas_in: DEG_C,
    hot_gas_out: DEG_C,
    cold_gas_in: DEG_C,
    cold_gas_out: DEG_C,
    hot_dp: KPA,
    cold_dp: KPA,
    hot_pressure: BAR,
    cold_pressure: BAR,
  },
};
