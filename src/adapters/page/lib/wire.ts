import type { AlarmStateName } from '../../../core/alarm/state.js';
import type {
  DispatchAnswer,
  Estimate,
  Quality,
  SensorReading,
  StoreEstimate,
  TubeProfile,
} from '../../../core/estimate.js';
import type { LimitedAnswer } from '../../../core/plan/limitedBy.js';
import type { AlarmText } from '../../../core/watch/alarmTexts.js';
import type { WatchEvent } from '../../../core/watch/event.js';

/** What the server sends, as far as the page reads it; a test holds it against the server's types. */

export interface StoreDefinition {
  id: string;
  kind: 'hot' | 'cold';
  charge_inlet_at: 'top' | 'bottom';
  length_m: number;
  diameter_m: number;
  reference_hot_degC: number;
  reference_cold_degC: number;
  outlet_limit_degC: number | null;
  strings: {
    id: string;
    radius_m: number;
    area_share: number;
    thermocouples: { id: string; position_m: number }[];
  }[];
}

export interface UnitDefinition {
  unit: string;
  name: string;
  rated_power_MW_el: number;
  rated_hours: number;
  hours_at_MW_el: number[];
  stores: StoreDefinition[];
  limits: { charge: { power_max_MW_el: number } };
}

export type StoreState = Omit<StoreEstimate, 'outlet_K'> & { outlet_degC: number | null };

export type EstimateState = Omit<Estimate, 'stores' | 'dispatch'> & {
  stores: Record<string, StoreState>;
};

export interface Dispatch {
  time: string;
  age_s: number | null;
  answers: LimitedAnswer[];
}

/** Hours that were asked for: from a stale estimate too, and then marked. */
export interface AskedHours extends Dispatch {
  unit: string;
  stale: boolean;
}

/** What a unit can still take at a power, from now on. */
export interface HeadroomAnswer {
  power_MW_el: number;
  hours: DispatchAnswer['hours'];
  energy_MWh_el: DispatchAnswer['energy_MWh_el'];
  ends_by: DispatchAnswer['ends_by'] | null;
  refused: string | null;
  limited_by: LimitedAnswer['limited_by'];
}

export interface AskedHeadroom {
  unit: string;
  time: string;
  age_s: number | null;
  stale: boolean;
  answers: HeadroomAnswer[];
}

export type Reading = Omit<SensorReading, 'value_K'> & { value_degC: number | null };
export type Tube = Pick<TubeProfile, 'id' | 'sigma_K'> & { temperature_degC: number[] };

export interface StoreProfile {
  x_m: number[];
  mean_degC: number[];
  tubes: Tube[];
  readings: Reading[];
}

export interface Profile {
  time: string;
  unit: string;
  stores: Record<string, StoreProfile>;
}

export interface UnitState {
  unit: string;
  estimate: EstimateState | null;
  dispatch: Dispatch | null;
  age_s: number | null;
  stale: boolean;
  flow_kg_s: number | null;
  power_MW_el: number | null;
}

export type StreamState = UnitState & { profile: Profile | null };

export interface UnitSummary {
  unit: string;
  name: string;
  age_s: number | null;
  stale: boolean;
  dispatchable: { power_MW: number } | null;
}

/** A unit that is not run, as its part of the configuration has faults. */
export interface LeftOut {
  unit: string;
  name: string;
  faults: { path: string; line: number | null; found: string; expected: string }[];
}

export interface UnitList {
  site: string;
  version: string;
  units: UnitSummary[];
  left_out: LeftOut[];
}

/** What is told of an event, whatever has become of it. */
export type Told = Omit<WatchEvent, 'transition'>;

export type Standing = Told &
  AlarmText & {
    state: AlarmStateName;
    /** The condition stands, be it shown or held back. */
    active: boolean;
    acknowledged_by: string | null;
    shelved: { by: string; why: string; until: string } | null;
    out_of_service: { by: string; why: string } | null;
  };

/** What is shown and what is held back. */
export interface AlarmLists {
  standing: Standing[];
  suppressed: Standing[];
  /** Longest time for which one may be shelved [h]. */
  shelve_most_h: number;
}

export interface History {
  from: string;
  to: string;
  series: string[];
  rows: Record<string, string | number | null>[];
}

export interface Hello {
  site: string;
  version: string;
  units: string[];
  heartbeat_ms: number;
  resume: 'new' | 'resumed' | 'gap';
}

export interface Beat {
  units: { unit: string; age_s: number | null; stale: boolean }[];
}

export type { DispatchAnswer, LimitedAnswer, Quality };
