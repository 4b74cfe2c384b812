import type { IndicatorsDefinition } from './watch/indicator.js';

/**
 * What the core knows of a plant: plain values, SI units and kelvin, made once from the
 * configuration and frozen. Positions x run from the charge inlet (x = 0) along the flow.
 */

/** Heat-storing solid. All functions take kelvin and hold for any finite temperature > 0. */
export interface Solid {
  readonly name: string;
  readonly source: string;
  /** Range the property data cover [K]. Above it the end value of c_s continues, below it that value or a lattice shape (solids.ts). */
  readonly range_K: readonly [number, number];
  readonly density_kg_m3: number;
  /** Specific heat capacity c_s(T) [J/kgK]. */
  heatCapacity(temperature_K: number): number;
  /** Specific enthalpy [J/kg] above an arbitrary fixed zero; the integral of heatCapacity. */
  enthalpy(temperature_K: number): number;
  /** Thermal conductivity of the piece of rock [W/mK]. */
  conductivity(temperature_K: number): number;
  /** Emissivity of the surface [-]. */
  readonly emissivity: number;
}

/** Heat-carrying gas or constant-property liquid. */
export interface Fluid {
  readonly name: string;
  readonly source: string;
  readonly phase: 'gas' | 'liquid';
  readonly range_K: readonly [number, number];
  /** Specific gas constant R/M [J/kgK]; 0 for a liquid. */
  readonly gasConstant_J_kgK: number;
  heatCapacity(temperature_K: number): number;
  enthalpy(temperature_K: number): number;
  /** Of a gas: the integral of cp/T [J/kgK] above a fixed zero, which a gas cycle needs. */
  entropy?(temperature_K: number): number;
  viscosity_Pa_s(temperature_K: number): number;
  conductivity(temperature_K: number): number;
  density_kg_m3(temperature_K: number, pressure_Pa: number): number;
}

export type StoreKind = 'hot' | 'cold';
export type Direction = 'charge' | 'discharge';
export type Mode = Direction | 'stand';
/** End of a store: `charge_inlet` is x = 0, `discharge_inlet` is x = length. */
export type StoreEnd = 'charge_inlet' | 'discharge_inlet';

export interface ThermocoupleDefinition {
  readonly id: string;
  /** Distance from the charge inlet [m]. */
  readonly position_m: number;
  /** Sensors that share a card, cable or cold junction carry the same group name. */
  readonly group: string | null;
}

export interface StringDefinition {
  readonly id: string;
  readonly radius_m: number;
  /** Share of the bed's cross-section for which the string stands; the shares of a store add up to 1. */
  readonly area_share: number;
  readonly thermocouples: readonly ThermocoupleDefinition[];
}

export interface BedDefinition {
  /** Length along the flow [m]. */
  readonly length_m: number;
  /** Cross-section [m2]. */
  readonly area_m2: number;
  readonly diameter_m: number;
  readonly particle_diameter_m: number;
  readonly void_fraction: number;
  readonly solid: Solid;
  readonly fluid: Fluid;
  /** Pressure of the gas in this store [Pa]. */
  readonly pressure_Pa: number;
  /** Shape of the pieces for the bed conductivity. */
  readonly particle_shape: 'crushed' | 'sphere';
  /** Tuned factors on the published correlations [-]: heat transfer, axial conductivity, pressure drop, heat capacity, losses. */
  readonly heat_transfer_factor: number;
  readonly conductivity_factor: number;
  readonly pressure_drop_factor: number;
  readonly heat_capacity_factor: number;
  readonly loss_factor: number;
  /** Heat loss coefficients [W/m2K]: mantle (referred to the bed's surface), and the two ends. */
  readonly wall_loss_W_m2K: number;
  /** Heat capacity of the vessel's wall inside its insulation [J/m2K], 0 or absent = none. */
  readonly wall_capacity_J_m2K?: number;
  readonly end_loss_W_m2K: Readonly<Record<StoreEnd, number>>;
  /** Heat capacity of plenum and lid steel at each end [J/K], 0 = none. */
  readonly end_capacity_J_K: Readonly<Record<StoreEnd, number>>;
  /** Free gas volume at each end [m3]. */
  readonly end_volume_m3: Readonly<Record<StoreEnd, number>>;
}

export interface StoreDefinition {
  readonly id: string;
  readonly kind: StoreKind;
  readonly charge_inlet_at: 'top' | 'bottom';
  readonly bed: BedDefinition;
  /** Reference temperatures of theta = (T - Tc)/(Th - Tc), fixed by the configuration [K]. */
  readonly reference_hot_K: number;
  readonly reference_cold_K: number;
  readonly strings: readonly StringDefinition[];
  /** Share of the gas that this store's junctions see, net of their lag; else the estimator's. */
  readonly gas_share?: number;
}

/** Who measures what. `store` and `string` are config ids. */
export type ChannelRole =
  | { readonly kind: 'thermocouple'; readonly store: string; readonly string: string }
  | { readonly kind: 'flow'; readonly sense: 'signed' | 'unsigned' | Direction }
  | { readonly kind: 'gas_temperature'; readonly store: string; readonly end: StoreEnd }
  | { readonly kind: 'mode' }
  | { readonly kind: 'valve'; readonly opens: Direction }
  | { readonly kind: 'power' }
  | { readonly kind: 'auxiliary_power' }
  | { readonly kind: 'ambient_temperature' }
  | { readonly kind: 'pressure'; readonly store: string }
  | { readonly kind: 'pressure_drop'; readonly store: string }
  | { readonly kind: 'shell_temperature'; readonly store: string; readonly position_m: number }
  | { readonly kind: 'cold_junction'; readonly group: string };

export type Reporting =
  | { readonly kind: 'periodic' }
  /** A silent channel keeps its last value for `longest_silence_s`; deadband in SI units. */
  | {
      readonly kind: 'by_exception';
      readonly deadband: number;
      readonly longest_silence_s: number;
    };

export interface ChannelDefinition {
  readonly id: string;
  readonly role: ChannelRole;
  readonly reporting: Reporting;
  /** Unit of the raw value at the edge, a key of core/units.ts; `mV` needs `thermocouple_type`. */
  readonly raw_unit: string;
  readonly thermocouple_type: 'K' | 'N' | 'T' | 'J' | null;
  /** For mV: id of the cold-junction channel, or a fixed junction temperature [K]. */
  readonly cold_junction: string | number | null;
}

/** The plant's electricity per kilogram over the machine model's, tuned [-]; absent = 1. */
export type WorkFactors = Readonly<Record<Direction, number>>;

export interface GasCycleDefinition {
  readonly work_factor?: WorkFactors;
  readonly kind: 'gas_cycle';
  readonly gas: Fluid;
  readonly high_pressure_Pa: number;
  readonly low_pressure_Pa: number;
  readonly compressor_polytropic_efficiency: number;
  readonly expander_polytropic_efficiency: number;
  /** Total pressure loss of the loop as a share of each pressure level, split evenly over both. */
  readonly loop_pressure_loss: number;
  /**
   * Share of that loss that follows the square of the flow, the loss as given being that at rated
   * flow; the rest is constant. Absent: not known.
   */
  readonly loss_follows_flow?: number;
  /** Difference between a cooler's outlet and ambient [K]. */
  readonly cooler_approach_K: number;
  readonly motor_efficiency: number;
  readonly generator_efficiency: number;
  readonly auxiliary_running_W: number;
  readonly auxiliary_standing_W: number;
}

export interface EfficiencyTableDefinition {
  readonly work_factor?: WorkFactors;
  readonly kind: 'efficiency_table';
  readonly fluid: Fluid;
  /** Net electrical over thermal power when discharging, against the store's outlet temperature, ascending [K]. */
  readonly outlet_K: readonly number[];
  readonly efficiency: readonly number[];
  /** Temperature at which the fluid returns to the store when discharging [K]. */
  readonly return_K: number;
  /** Temperature at which the heater delivers when charging [K], and heat over electricity there. */
  readonly charge_inlet_K: number;
  readonly charge_efficiency: number;
  readonly auxiliary_running_W: number;
  readonly auxiliary_standing_W: number;
}

export type MachineDefinition = GasCycleDefinition | EfficiencyTableDefinition;

export interface DirectionLimits {
  readonly power_min_W: number;
  readonly power_max_W: number;
  readonly flow_min_kg_s: number;
  readonly flow_max_kg_s: number;
}

/** What a start-up takes: time from standing until the first power, and electricity meanwhile. */
export interface StartUpDefinition {
  readonly time_s: number;
  readonly energy_J: number;
}

/** How fast the machine follows a command; see core/plan/command. */
export interface OperationDefinition {
  /** Greatest change of net power [W/s]; null = at once. */
  readonly ramp_W_s: Readonly<Record<Direction, number | null>>;
  readonly start: {
    readonly warm: StartUpDefinition;
    readonly cold: StartUpDefinition;
    /** A machine that stood longer than this starts cold [s]. */
    readonly cold_after_s: number;
  };
  /** From the end of one direction to the start-up of the other [s]. */
  readonly change_over_s: number;
}

/** What the grid connection lets through at some time of day. */
export interface ConnectionWindow {
  /** Minutes after local midnight; a window may run over midnight. */
  readonly from_min: number;
  readonly to_min: number;
  readonly export_max_W: number;
  readonly import_max_W: number;
}

export interface ConnectionDefinition {
  /** IANA name of the zone in which the windows are meant, and blocks are written. */
  readonly time_zone: string;
  readonly export_max_W: number;
  readonly import_max_W: number;
  readonly windows: readonly ConnectionWindow[];
}

/** Time in which the unit can give or take less, or nothing. */
export interface OutageDefinition {
  readonly from_ms: number;
  readonly to_ms: number;
  readonly discharge_max_W: number;
  readonly charge_max_W: number;
  readonly reason: string;
}

export interface LimitsDefinition {
  readonly charge: DirectionLimits;
  readonly discharge: DirectionLimits;
  /** Absent: at once, without start-up. */
  readonly operation?: OperationDefinition;
  /** Absent: no limit of the connection. */
  readonly connection?: ConnectionDefinition;
  readonly outages?: readonly OutageDefinition[];
  /** Share of the time, outages aside, in which the machine runs when called; told, never reckoned in. */
  readonly availability?: number;
  /** A discharge ends when the hot outlet falls below / the cold outlet rises above these [K]. */
  readonly hot_outlet_min_K: number | null;
  readonly cold_outlet_max_K: number | null;
  /** A charge ends when the store breaks through: hot outlet above / cold outlet below these [K]. */
  readonly charge_hot_outlet_max_K: number | null;
  readonly charge_cold_outlet_min_K: number | null;
  /** Greatest pressure drop over a store [Pa]. */
  readonly pressure_drop_max_Pa: number | null;
}

/** Prior standard deviations and time constants of the estimator. */
export interface EstimatorDefinition {
  readonly cells: number;
  /** White noise of one reading [K]. */
  readonly reading_sigma_K: number;
  /** Offset of one thermocouple, and of a group that shares a card or cold junction [K]. */
  readonly offset_sigma_K: number;
  readonly group_offset_sigma_K: number;
  readonly offset_time_s: number;
  /** Uncertainty of a thermocouple's position [m]. */
  readonly position_sigma_m: number;
  readonly flow_factor_sigma: number;
  readonly heat_transfer_factor_sigma: number;
  readonly gas_share: number;
  readonly gas_share_sigma: number;
  /** Uncertainty of the gas temperature at an inlet [K]. */
  readonly inlet_sigma_K: number;
  /** Flow that may leak through a store while the unit stands; absent or 0 = none [kg/s]. */
  readonly leak_sigma_kg_s?: number;
  /** Relative uncertainty of the bed's heat capacity, and of the machine's specific work. */
  readonly heat_capacity_sigma: number;
  readonly machine_factor_sigma: number;
  /** Below this flow for two scans the unit stands [kg/s]. */
  readonly stand_flow_kg_s: number;
}

export interface IndicatorLimit {
  readonly limit: number;
  readonly deadband: number;
  readonly on_delay_s: number;
  readonly off_delay_s: number;
}

export interface WatchDefinition {
  readonly spread_ratio: IndicatorLimit;
  /** Margin between an outlet and its stop limit [K]. */
  readonly outlet_margin_K: IndicatorLimit;
  /** Age of the newest reading [s]. */
  readonly data_age_s: IndicatorLimit;
  readonly sensor_rejected: Pick<IndicatorLimit, 'on_delay_s' | 'off_delay_s'>;
  readonly database_down: Pick<IndicatorLimit, 'on_delay_s' | 'off_delay_s'>;
  /** Absent: as shipped, see core/watch/rules. */
  readonly indicators?: IndicatorsDefinition;
}

export interface UnitDefinition {
  readonly id: string;
  readonly name: string;
  readonly scan_period_s: number;
  readonly rated_power_W: number;
  readonly rated_hours: number;
  /** Assumed ambient temperature where no channel measures it [K]. */
  readonly ambient_K: number;
  readonly stores: readonly StoreDefinition[];
  readonly channels: readonly ChannelDefinition[];
  readonly machine: MachineDefinition;
  readonly limits: LimitsDefinition;
  readonly estimator: EstimatorDefinition;
  readonly watch: WatchDefinition;
  /** Powers for which hours are computed without being asked [W]. */
  readonly hours_at_W: readonly number[];
  readonly hours_every_s: number;
}
