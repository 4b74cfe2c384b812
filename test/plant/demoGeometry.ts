import type { PlantGeometry, RawUnit, StoreGeometry } from './geometry.js';

/** The plant of config/demo.yaml as a literal; test/plantGeometry.test.ts holds the two together. */

const ZERO_K = 273.15;
const DEG_C: RawUnit = { scale: 1, offset: -ZERO_K };
const MW: RawUnit = { scale: 1e-6, offset: 0 };
const KPA: RawUnit = { scale: 1e-3, offset: 0 };
const BAR: RawUnit = { scale: 1e-5, offset: 0 };

/** Strings at given radii, each standing for the ring between the mid-radii to its neighbours. */
export function stringsOf(
  store: string,
  radius_m: number,
  places: readonly { readonly id: string; readonly radius_m: number; readonly group: string }[],
  positions_m: readonly number[],
): StoreGeometry['strings'] {
  return places.map((place, s) => {
    const below = places[s - 1];
    const above = places[s + 1];
    const inner = below ? (below.radius_m + place.radius_m) / 2 : 0;
    const outer = above ? (above.radius_m + place.radius_m) / 2 : radius_m;
    return {
      id: place.id,
      radius_m: place.radius_m,
      area_share: (outer * outer - inner * inner) / (radius_m * radius_m),
      thermocouples: positions_m.map((position_m, i) => ({
        id: `${store}_${place.id}_${String(i + 1).padStart(2, '0')}`,
        position_m,
        group: place.group,
      })),
    };
  });
}

const hot: StoreGeometry = {
  id: 'hot',
  kind: 'hot',
  length_m: 9.2,
  diameter_m: 6.6,
  particle_diameter_m: 0.02,
  void_fraction: 0.4,
  particle_shape: 'crushed',
  solid: 'granite',
  fluid: 'argon',
  pressure_Pa: 7.9e5,
  reference_hot_K: 460 + ZERO_K,
  reference_cold_K: 25 + ZERO_K,
  wall_loss_W_m2K: 0.3,
  end_loss_W_m2K: [0.35, 0.3],
  end_capacity_J_K: [9e5, 9e5],
  strings: stringsOf(
    'hot',
    3.3,
    [
      { id: 'axis', radius_m: 0.5, group: 'card_h1' },
      { id: 'middle', radius_m: 1.8, group: 'card_h2' },
      { id: 'rim', radius_m: 2.9, group: 'card_h3' },
    ],
    [0.45, 1.09, 1.73, 2.37, 3.01, 3.65, 4.29, 4.93, 5.57, 6.21, 6.85, 7.49, 8.13, 8.77],
  ),
};

const cold: StoreGeometry = {
  id: 'cold',
  kind: 'cold',
  length_m: 9.2,
  diameter_m: 8.2,
  particle_diameter_m: 0.02,
  void_fraction: 0.4,
  particle_shape: 'crushed',
  solid: 'basalt',
  fluid: 'argon',
  pressure_Pa: 1.04e5,
  reference_hot_K: 25 + ZERO_K,
  reference_cold_K: -129 + ZERO_K,
  wall_loss_W_m2K: 0.25,
  end_loss_W_m2K: [0.25, 0.25],
  end_capacity_J_K: [1.2e6, 1.2e6],
  strings: stringsOf(
    'cold',
    4.1,
    [
      { id: 'axis', radius_m: 0.6, group: 'card_c1' },
      { id: 'middle', radius_m: 2.2, group: 'card_c2' },
      { id: 'rim', radius_m: 3.6, group: 'card_c3' },
    ],
    [0.45, 1.09, 1.73, 2.37, 3.01, 3.65, 4.29, 4.93, 5.57, 6.21, 6.85, 7.49, 8.13, 8.77],
  ),
};

export const DEMO_GEOMETRY: PlantGeometry = {
  id: 'vellmoor',
  scan_period_s: 30,
  rated_power_W: 1.8e6,
  /** About the flow at rated power with full stores. */
  rated_flow_kg_s: 22,
  flow_max_kg_s: 36,
  hot_outlet_min_K: 360 + ZERO_K,
  cold_outlet_max_K: -95 + ZERO_K,
  charge_hot_outlet_max_K: 150 + ZERO_K,
  charge_cold_outlet_min_K: -10 + ZERO_K,
  stores: [hot, cold],
  machine: {
    kind: 'gas_cycle',
    high_pressure_Pa: 7.9e5,
    low_pressure_Pa: 1.04e5,
    compressor_polytropic_efficiency: 0.9,
    expander_polytropic_efficiency: 0.91,
    loop_pressure_loss: 0.04,
    cooler_approach_K: 15,
    motor_efficiency: 0.96,
    generator_efficiency: 0.96,
    auxiliary_running_W: 40e3,
    auxiliary_standing_W: 6e3,
  },
  channels: [
    { id: 'flow', measures: 'flow' },
    { id: 'mode', measures: 'mode' },
    { id: 'power', measures: 'power' },
    { id: 'ambient', measures: 'ambient_temperature' },
    { id: 'hot_gas_top', measures: 'gas_temperature', store: 'hot', end: 0 },
    { id: 'hot_gas_bottom', measures: 'gas_temperature', store: 'hot', end: 1 },
    { id: 'cold_gas_bottom', measures: 'gas_temperature', store: 'cold', end: 0 },
    { id: 'cold_gas_top', measures: 'gas_temperature', store: 'cold', end: 1 },
    { id: 'hot_pressure', measures: 'pressure', store: 'hot' },
    { id: 'cold_pressure', measures: 'pressure', store: 'cold' },
    { id: 'hot_drop', measures: 'pressure_drop', store: 'hot' },
    { id: 'cold_drop', measures: 'pressure_drop', store: 'cold' },
  ],
  raw_units: {
    ...Object.fromEntries(
      [hot, cold].flatMap((s) =>
        s.strings.flatMap((t) => t.thermocouples.map((c) => [c.id, DEG_C])),
      ),
    ),
    power: MW,
    ambient: DEG_C,
    hot_gas_top: DEG_C,
    hot_gas_bottom: DEG_C,
    cold_gas_bottom: DEG_C,
    cold_gas_top: DEG_C,
    hot_drop: KPA,
    cold_drop: KPA,
    hot_pressure: BAR,
    cold_pressure: BAR,
  },
};
