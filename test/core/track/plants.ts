import { fluidByName } from '../../../src/core/bed/fluids.js';
import { solidByName } from '../../../src/core/bed/solids.js';
import type {
  BedDefinition,
  ChannelDefinition,
  ChannelRole,
  EstimatorDefinition,
  Fluid,
  GasCycleDefinition,
  StoreDefinition,
  StringDefinition,
  UnitDefinition,
} from '../../../src/core/definitions.js';
import { type StoreModel, storeModel } from '../../../src/core/track/storeTracker.js';
import { simpleBed } from '../bed/simpleBed.js';

/** A small plant for tests of the estimator: few cells, few thermocouples, real rock and argon. */

export const ESTIMATOR: EstimatorDefinition = {
  cells: 30,
  reading_sigma_K: 0.5,
  offset_sigma_K: 1,
  group_offset_sigma_K: 0.5,
  offset_time_s: 30 * 86400,
  position_sigma_m: 0.01,
  flow_factor_sigma: 0.05,
  heat_transfer_factor_sigma: 0.3,
  gas_share: 0.3,
  gas_share_sigma: 0.3,
  inlet_sigma_K: 2,
  heat_capacity_sigma: 0.03,
  machine_factor_sigma: 0.03,
  stand_flow_kg_s: 0.05,
};

/** Evenly placed thermocouples; `groups[i % groups.length]` is the group of the i-th. */
export function stringOf(
  id: string,
  sensors: number,
  length_m: number,
  over: Partial<StringDefinition> & { groups?: readonly (string | null)[] } = {},
): StringDefinition {
  const { groups = [null], ...rest } = over;
  return {
    id,
    radius_m: 0,
    area_share: 1,
    thermocouples: Array.from({ length: sensors }, (_, i) => ({
      id: `${id}_${i + 1}`,
      position_m: ((i + 0.5) / sensors) * length_m,
      group: groups[i % groups.length] ?? null,
    })),
    ...rest,
  };
}

export function hotBed(over: Partial<BedDefinition> = {}): BedDefinition {
  return simpleBed({
    length_m: 4,
    area_m2: 2,
    diameter_m: Math.sqrt(8 / Math.PI),
    solid: solidByName('granite'),
    fluid: fluidByName('argon'),
    pressure_Pa: 7.9e5,
    wall_loss_W_m2K: 0.3,
    end_loss_W_m2K: { charge_inlet: 0.3, discharge_inlet: 0.3 },
    ...over,
  });
}

export function hotStore(over: Partial<StoreDefinition> = {}): StoreDefinition {
  const bed = over.bed ?? hotBed();
  return {
    id: 'hot',
    kind: 'hot',
    charge_inlet_at: 'top',
    bed,
    reference_hot_K: 733.15,
    reference_cold_K: 298.15,
    strings: [stringOf('h', 8, bed.length_m)],
    ...over,
  };
}

export function coldStore(over: Partial<StoreDefinition> = {}): StoreDefinition {
  const bed = over.bed ?? hotBed({ solid: solidByName('basalt'), pressure_Pa: 1.04e5, area_m2: 3 });
  return {
    id: 'cold',
    kind: 'cold',
    charge_inlet_at: 'bottom',
    bed,
    reference_hot_K: 298.15,
    reference_cold_K: 144.15,
    strings: [stringOf('c', 8, bed.length_m)],
    ...over,
  };
}

/** Channels of a store's thermocouples from index `from` on, and the store's model. */
export function modelOf(
  store: StoreDefinition,
  over: Partial<EstimatorDefinition> = {},
  deadband_K = 0,
): StoreModel {
  let next = 0;
  const channels = store.strings.map((s) => s.thermocouples.map(() => next++));
  const deadbands = channels.map((row) => row.map(() => deadband_K));
  return storeModel(store, { ...ESTIMATOR, ...over }, channels, deadbands);
}

export function channelOf(
  id: string,
  role: ChannelRole,
  over: Partial<ChannelDefinition> = {},
): ChannelDefinition {
  return {
    id,
    role,
    reporting: { kind: 'periodic' },
    raw_unit: 'K',
    thermocouple_type: null,
    cold_junction: null,
    ...over,
  };
}

export const CYCLE: GasCycleDefinition = {
  kind: 'gas_cycle',
  gas: fluidByName('argon') as Fluid,
  high_pressure_Pa: 7.9e5,
  low_pressure_Pa: 1.04e5,
  compressor_polytropic_efficiency: 0.9,
  expander_polytropic_efficiency: 0.91,
  loop_pressure_loss: 0.04,
  cooler_approach_K: 15,
  motor_efficiency: 0.96,
  generator_efficiency: 0.96,
  auxiliary_running_W: 2000,
  auxiliary_standing_W: 300,
};

/** Channels other than thermocouples, of a plant that measures all that the estimator can use. */
export const FULL_ROLES: Readonly<Record<string, ChannelRole>> = {
  flow: { kind: 'flow', sense: 'signed' },
  mode: { kind: 'mode' },
  power: { kind: 'power' },
  ambient: { kind: 'ambient_temperature' },
  hot_top: { kind: 'gas_temperature', store: 'hot', end: 'charge_inlet' },
  hot_bottom: { kind: 'gas_temperature', store: 'hot', end: 'discharge_inlet' },
  cold_bottom: { kind: 'gas_temperature', store: 'cold', end: 'charge_inlet' },
  cold_top: { kind: 'gas_temperature', store: 'cold', end: 'discharge_inlet' },
};

/** A unit of about 0.1 MW for 6 h with a hot and a cold store and the gas cycle between them. */
export function unitOf(
  over: Omit<Partial<UnitDefinition>, 'estimator'> & {
    roles?: Readonly<Record<string, ChannelRole>>;
    estimator?: Partial<EstimatorDefinition>;
  } = {},
): UnitDefinition {
  const { roles = FULL_ROLES, estimator, ...rest } = over;
  const stores = rest.stores ?? [hotStore(), coldStore()];
  const thermocouples = stores.flatMap((store) =>
    store.strings.flatMap((string) =>
      string.thermocouples.map((t) =>
        channelOf(t.id, { kind: 'thermocouple', store: store.id, string: string.id }),
      ),
    ),
  );
  const others = Object.entries(roles).map(([id, role]) => channelOf(id, role));
  const slow = { on_delay_s: 300, off_delay_s: 900 };
  return {
    id: 'u',
    name: 'Unit u',
    scan_period_s: 60,
    rated_power_W: 60e3,
    rated_hours: 6,
    ambient_K: 283.15,
    channels: [...thermocouples, ...others],
    machine: CYCLE,
    limits: {
      charge: { power_min_W: 20e3, power_max_W: 200e3, flow_min_kg_s: 0.2, flow_max_kg_s: 2 },
      discharge: { power_min_W: 15e3, power_max_W: 90e3, flow_min_kg_s: 0.2, flow_max_kg_s: 2.2 },
      hot_outlet_min_K: 633.15,
      cold_outlet_max_K: 178.15,
      charge_hot_outlet_max_K: 423.15,
      charge_cold_outlet_min_K: 263.15,
      pressure_drop_max_Pa: null,
    },
    watch: {
      spread_ratio: { limit: 1.3, deadband: 0.1, on_delay_s: 900, off_delay_s: 1800 },
      outlet_margin_K: { limit: 15, deadband: 5, on_delay_s: 60, off_delay_s: 120 },
      data_age_s: { limit: 300, deadband: 0, on_delay_s: 0, off_delay_s: 0 },
      sensor_rejected: slow,
      database_down: slow,
    },
    hours_at_W: [60e3],
    hours_every_s: 600,
    ...rest,
    stores,
    estimator: { ...ESTIMATOR, ...estimator },
  };
}
