import type { TruthSolid } from './solids.js';

/** A plant as a plain literal, so that nothing here reads a configuration. SI units, kelvin. */
export interface StoreGeometry {
  readonly id: string;
  readonly kind: 'hot' | 'cold';
  readonly length_m: number;
  readonly diameter_m: number;
  readonly particle_diameter_m: number;
  readonly void_fraction: number;
  readonly particle_shape: 'crushed' | 'sphere';
  /** Name in solids.ts, or a solid of the caller's own. */
  readonly solid: string | TruthSolid;
  readonly fluid: 'argon' | 'air' | 'salt';
  readonly pressure_Pa: number;
  readonly reference_hot_K: number;
  readonly reference_cold_K: number;
  readonly wall_loss_W_m2K: number;
  readonly end_loss_W_m2K: readonly [number, number];
  readonly end_capacity_J_K: readonly [number, number];
  readonly strings: readonly {
    readonly id: string;
    readonly radius_m: number;
    readonly area_share: number;
    readonly thermocouples: readonly {
      readonly id: string;
      readonly position_m: number;
      readonly group: string | null;
    }[];
  }[];
}

/** End of a bed that is its top: layers are stable with the warm end up. */
export function topEnd(store: StoreGeometry): 0 | 1 {
  return store.kind === 'hot' ? 0 : 1;
}

export interface GasCycleGeometry {
  readonly kind: 'gas_cycle';
  readonly high_pressure_Pa: number;
  readonly low_pressure_Pa: number;
  readonly compressor_polytropic_efficiency: number;
  readonly expander_polytropic_efficiency: number;
  readonly loop_pressure_loss: number;
  readonly cooler_approach_K: number;
  readonly motor_efficiency: number;
  readonly generator_efficiency: number;
  readonly auxiliary_running_W: number;
  readonly auxiliary_standing_W: number;
}

/** A heater and an engine at a single hot store. */
export interface HeaterGeometry {
  readonly kind: 'heater';
  readonly outlet_K: readonly number[];
  readonly efficiency: readonly number[];
  readonly return_K: number;
  readonly charge_inlet_K: number;
  readonly charge_efficiency: number;
  readonly auxiliary_running_W: number;
  readonly auxiliary_standing_W: number;
}

/** What a channel other than a thermocouple in the bed measures. */
export type ChannelMeasure =
  | { readonly measures: 'flow'; readonly sense?: 'signed' | 'unsigned' | 'charge' | 'discharge' }
  | { readonly measures: 'valve'; readonly opens: 'charge' | 'discharge' }
  | { readonly measures: 'power' }
  | { readonly measures: 'mode' }
  | { readonly measures: 'ambient_temperature' }
  | { readonly measures: 'auxiliary_power' }
  | { readonly measures: 'cold_junction' }
  | { readonly measures: 'gas_temperature'; readonly store: string; readonly end: 0 | 1 }
  | { readonly measures: 'pressure'; readonly store: string }
  | { readonly measures: 'pressure_drop'; readonly store: string };

/**
 * Raw unit of a channel in a recording: raw = SI * scale + offset, or a function of the value and of
 * all readings of its scan in SI units (a voltage needs its cold junction).
 */
export type RawUnit =
  | { readonly scale: number; readonly offset: number }
  | ((si: number, readings: Readonly<Record<string, number>>) => number);

export interface PlantGeometry {
  readonly id: string;
  readonly scan_period_s: number;
  readonly rated_power_W: number;
  readonly rated_flow_kg_s: number;
  readonly flow_max_kg_s: number;
  readonly hot_outlet_min_K: number | null;
  readonly cold_outlet_max_K: number | null;
  readonly charge_hot_outlet_max_K: number | null;
  readonly charge_cold_outlet_min_K: number | null;
  readonly stores: readonly StoreGeometry[];
  readonly machine: GasCycleGeometry | HeaterGeometry;
  readonly channels: readonly ({ readonly id: string } & ChannelMeasure)[];
  /** Raw units by channel id; a channel without one is recorded in SI units and kelvin. */
  readonly raw_units: Readonly<Record<string, RawUnit>>;
}

/**
 * The same plant with one more string in a store that stands for no area: its thermocouples are
 * read like the others, and the rings stay as they are. So one truth serves several layouts.
 */
export function withReadOnlyString(
  geometry: PlantGeometry,
  storeId: string,
  string: Omit<StoreGeometry['strings'][number], 'area_share'>,
): PlantGeometry {
  return {
    ...geometry,
    stores: geometry.stores.map((store) =>
      store.id === storeId
        ? { ...store, strings: [...store.strings, { ...string, area_share: 0 }] }
        : store,
    ),
  };
}

/**
 * The same plant with one more thermocouple on every string, `depth_m` below the top of the bed. Its
 * number is 00 where the top is the charge inlet, else one beyond the last.
 */
export function withTopThermocouples(geometry: PlantGeometry, depth_m: number): PlantGeometry {
  const stores = geometry.stores.map((store) => {
    const atInlet = topEnd(store) === 0;
    const strings = store.strings.map((string) => {
      const { group } = string.thermocouples[0]!;
      const number = atInlet ? '00' : String(string.thermocouples.length + 1).padStart(2, '0');
      const position_m = atInlet ? depth_m : store.length_m - depth_m;
      const top = { id: `${store.id}_${string.id}_${number}`, position_m, group };
      const { thermocouples: known } = string;
      return { ...string, thermocouples: atInlet ? [top, ...known] : [...known, top] };
    });
    return { ...store, strings };
  });
  return { ...geometry, stores };
}
