import type {
  ChannelDefinition,
  StoreDefinition,
  UnitDefinition,
} from '../src/core/definitions.js';
import { millivoltFromCelsius } from '../src/core/thermocouple/its90.js';
import { fromSi } from '../src/core/units.js';
import type { ChannelMeasure, PlantGeometry, RawUnit, StoreGeometry } from './plant/geometry.js';
import { SOLIDS } from './plant/solids.js';

/**
 * The finer plant's literal of a configured unit. It lies outside test/plant, which imports nothing
 * from src.
 * @param rated_flow_kg_s flow to which the finer plant's meter slope and loop loss refer
 * @param solids `own`: the finer plant's data where it has a rock of that name; `configured`: the unit's
 */
export function geometryOf(
  unit: UnitDefinition,
  rated_flow_kg_s: number,
  solids: 'own' | 'configured' = 'own',
): PlantGeometry {
  const { limits, machine } = unit;
  return {
    id: unit.id,
    scan_period_s: unit.scan_period_s,
    rated_power_W: unit.rated_power_W,
    rated_flow_kg_s,
    flow_max_kg_s: limits.discharge.flow_max_kg_s,
    hot_outlet_min_K: limits.hot_outlet_min_K,
    cold_outlet_max_K: limits.cold_outlet_max_K,
    charge_hot_outlet_max_K: limits.charge_hot_outlet_max_K,
    charge_cold_outlet_min_K: limits.charge_cold_outlet_min_K,
    stores: unit.stores.map((store) => storeOf(store, solids)),
    machine: machineOf(machine),
    channels: unit.channels.flatMap((channel) => {
      const measure = measureOf(channel);
      return measure === null ? [] : [{ id: channel.id, ...measure }];
    }),
    raw_units: Object.fromEntries(
      unit.channels.flatMap((channel): [string, RawUnit][] => {
        const raw = rawUnitOf(channel);
        return raw === null ? [] : [[channel.id, raw]];
      }),
    ),
  };
}

/** Null where the recording holds SI units anyway. */
function rawUnitOf(channel: ChannelDefinition): RawUnit | null {
  if (channel.role.kind === 'mode' || channel.role.kind === 'valve') return null;
  const { raw_unit, thermocouple_type: type, cold_junction } = channel;
  if (raw_unit === 'mV') {
    if (type === null || cold_junction === null) {
      throw new RangeError(`channel ${channel.id} is in mV without a type or a cold junction`);
    }
    return (si, readings) => {
      const junction_K =
        typeof cold_junction === 'number' ? cold_junction : readings[cold_junction]!;
      const voltage = (T: number) => millivoltFromCelsius(type, T - 273.15);
      return voltage(si) - voltage(junction_K);
    };
  }
  const offset = fromSi(raw_unit, 0);
  const scale = fromSi(raw_unit, 1) - offset;
  return scale === 1 && offset === 0 ? null : { scale, offset };
}

function storeOf(store: StoreDefinition, solids: 'own' | 'configured'): StoreGeometry {
  const { bed } = store;
  const fluid = bed.fluid.phase === 'liquid' ? 'salt' : bed.fluid.name;
  if (fluid !== 'argon' && fluid !== 'air' && fluid !== 'salt') {
    throw new RangeError(`store ${store.id}: the finer plant has no fluid ${fluid}`);
  }
  return {
    id: store.id,
    kind: store.kind,
    length_m: bed.length_m,
    diameter_m: bed.diameter_m,
    particle_diameter_m: bed.particle_diameter_m,
    void_fraction: bed.void_fraction,
    particle_shape: bed.particle_shape,
    solid: solids === 'own' && bed.solid.name in SOLIDS ? bed.solid.name : bed.solid,
    fluid,
    pressure_Pa: bed.pressure_Pa,
    reference_hot_K: store.reference_hot_K,
    reference_cold_K: store.reference_cold_K,
    wall_loss_W_m2K: bed.wall_loss_W_m2K,
    end_loss_W_m2K: [bed.end_loss_W_m2K.charge_inlet, bed.end_loss_W_m2K.discharge_inlet],
    end_capacity_J_K: [bed.end_capacity_J_K.charge_inlet, bed.end_capacity_J_K.discharge_inlet],
    strings: store.strings,
  };
}

function machineOf(machine: UnitDefinition['machine']): PlantGeometry['machine'] {
  if (machine.kind === 'gas_cycle') {
    // What a factor of the machine's work tells is drawn in the finer plant.
    const { gas, work_factor: _factor, ...rest } = machine;
    if (gas.name !== 'argon')
      throw new RangeError(`the finer plant's cycle runs on argon, not ${gas.name}`);
    return rest;
  }
  const { fluid: _fluid, kind: _kind, work_factor: _factor, ...rest } = machine;
  return { kind: 'heater', ...rest };
}

/** Null for a channel that the finer plant does not have. */
function measureOf(channel: ChannelDefinition): ChannelMeasure | null {
  const { role } = channel;
  switch (role.kind) {
    case 'flow':
      return role.sense === 'signed'
        ? { measures: 'flow' }
        : { measures: 'flow', sense: role.sense };
    case 'valve':
      return { measures: 'valve', opens: role.opens };
    case 'power':
    case 'mode':
    case 'ambient_temperature':
    case 'auxiliary_power':
    case 'cold_junction':
      return { measures: role.kind };
    case 'gas_temperature':
      return { measures: role.kind, store: role.store, end: role.end === 'charge_inlet' ? 0 : 1 };
    case 'pressure':
    case 'pressure_drop':
      return { measures: role.kind, store: role.store };
    default:
      return null;
  }
}
