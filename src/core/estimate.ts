import type { Mode } from './definitions.js';

/**
 * What a unit publishes. Key names carry the unit at the edge (MWh_th, MWh_el, m, degC is never
 * used inside). Numbers are finite or null. The closed lists below are documented in README.md.
 */
export const QUALITIES = ['good', 'degraded', 'blind', 'stale'] as const;
export type Quality = (typeof QUALITIES)[number];

export const SENSOR_VERDICTS = [
  'open',
  'burst',
  'stuck',
  'drifting',
  'offset',
  'reversed',
  'swapped',
  'wrong_type',
  'outlier',
  'group_fault',
  'uncovered',
] as const;
export type SensorVerdict = (typeof SENSOR_VERDICTS)[number];

export const FRONT_REASONS = ['uniform', 'no_half_crossing', 'not_started'] as const;
export type FrontReason = (typeof FRONT_REASONS)[number];

export const END_CAUSES = ['hot_outlet', 'cold_outlet', 'flow', 'pressure_drop', 'empty'] as const;
export type EndCause = (typeof END_CAUSES)[number];

export interface FrontEstimate {
  position_m: number | null;
  position_sigma_m: number | null;
  /** Half the distance between the 16 % and 84 % crossings; null where one lies outside the bed. */
  width_m: number | null;
  width_sigma_m: number | null;
}

export interface StringEstimate {
  id: string;
  flow_factor: number;
  flow_factor_sigma: number;
  position_m: number | null;
  width_m: number | null;
}

/** The front view of one string (maintenance), independent of the tubes. */
export interface FrontViewEstimate {
  id: string;
  position_m: number | null;
  position_sigma_m: number | null;
  width_m: number | null;
  width_sigma_m: number | null;
  /** False while the string does not see the front and the filters only predict. */
  seen: boolean;
  /** (front view - tube) over the sigma of the difference; null where one has none. */
  disagreement: number | null;
}

export interface RejectedSensor {
  id: string;
  verdict: SensorVerdict;
  /** ISO 8601 UTC. */
  since: string;
  evidence: string;
}

export interface TubeProfile {
  id: string;
  /** Temperatures at the cell centres [K] and their sigma [K]. */
  temperature_K: number[];
  sigma_K: number[];
}

export interface SensorReading {
  id: string;
  string: string;
  position_m: number;
  /** null = missing. */
  value_K: number | null;
  verdict: SensorVerdict | null;
}

export interface StoreEstimate {
  soc: number;
  soc_sigma: number;
  stored_MWh_th: number;
  stored_sigma_MWh_th: number;
  fronts: FrontEstimate[];
  fronts_reason: FrontReason | null;
  energy_position_m: number;
  spread_ratio: number | null;
  heat_transfer_factor: number;
  heat_transfer_factor_sigma: number;
  strings: StringEstimate[];
  front_views: FrontViewEstimate[];
  sensors: { used: number; rejected: RejectedSensor[] };
  /** Gas leaving the store now [K]; null while standing. */
  outlet_K: number | null;
}

export interface Quantiles {
  p90: number;
  p50: number;
  p10: number;
}

/**
 * What is missing of a power at first: after a long rest the gas at the end where it leaves has cooled, and
 * the greatest flow does not give the power asked until that gas is pushed out, within 10 minutes.
 */
export interface FirstMinutes {
  /** That more than 0.5 % of the energy of the first quarter of an hour is missing. */
  readonly probability: number;
  /** At its most, likeliest; and not exceeded with 90 % probability. */
  readonly lacking_MW: number;
  readonly lacking_at_worst_MW: number;
  /** Until the power asked is had, likeliest; 0 where likeliest nothing is missing. */
  readonly minutes: number;
  readonly lacking_MWh_el: number;
}

export interface DispatchAnswer {
  power_MW: number;
  hours: Quantiles;
  energy_MWh_el: Quantiles;
  ends_by: EndCause;
  /** Absent = nothing that counts is missing at first, with 90 % probability. */
  first_minutes?: FirstMinutes | undefined;
}

export interface Estimate {
  /** ISO 8601 UTC. */
  time: string;
  unit: string;
  revision: number;
  mode: Mode;
  quality: Quality;
  /** Dispatchable energy over rated energy at rated power. */
  state_of_charge: number;
  stores: Record<string, StoreEstimate>;
  dispatch?: DispatchAnswer[];
}

/** The part of an estimate that only pages and reports want; kept apart for its size. */
export interface ProfileView {
  time: string;
  unit: string;
  stores: Record<
    string,
    { x_m: number[]; tubes: TubeProfile[]; mean_K: number[]; readings: SensorReading[] }
  >;
}
