import type { DrawOptions, PlantDraw } from './draws.js';
import type { PlantChange, SensorFault } from './faults.js';
import type { PlantGeometry } from './geometry.js';
import type { Resolution, StoreTruth } from './simulatedStore.js';

export type Mode = 'charge' | 'stand' | 'discharge';

/** Part of a schedule. Net power is given as a positive number in either direction. */
export interface Segment {
  readonly mode: Mode;
  readonly duration_s: number;
  /** Net electrical power [W] or flow [kg/s]; neither while standing. */
  readonly power_W?: number;
  readonly flow_kg_s?: number;
  /** While standing: flow through all stores that the meter sees, positive as while charging [kg/s]. */
  readonly leak_kg_s?: number;
}

export interface TruthOptions extends Partial<DrawOptions> {
  readonly seed: number;
  readonly geometry: PlantGeometry;
  readonly resolution?: Partial<Resolution>;
  /** Longest inner step [s]. */
  readonly step_s?: number;
  /** Time of the start [s since 1970]; 2025-01-01T00:00:00Z if absent. */
  readonly start_s?: number;
  /** Front position and width of each store at the start; 15 % of the length and 0.35 m if absent. */
  readonly initial?: Readonly<
    Record<string, { readonly front_m: number; readonly width_m: number }>
  >;
  readonly faults?: readonly SensorFault[];
  readonly changes?: readonly PlantChange[];
  /** Adjusts the draw before the plant is built. */
  readonly adjust?: (draw: PlantDraw) => PlantDraw;
}

/** Readings of one scan in SI units and kelvin; NaN = missing. `time_s` counts from 1970. */
export interface ScanReadings {
  readonly time_s: number;
  readonly readings: Readonly<Record<string, number>>;
}

export interface PlantTruth {
  readonly time_s: number;
  readonly mode: Mode;
  /** True flow, positive while charging [kg/s]. */
  readonly flow_kg_s: number;
  /** Net power, positive while charging [W]. */
  readonly power_W: number;
  readonly ambient_K: number;
  /** Mean reading of the flow meter over true flow. */
  readonly meter_factor: number;
  readonly stores: Readonly<Record<string, StoreTruth>>;
}

export type EndedBy = 'hot_outlet' | 'cold_outlet' | 'flow' | 'empty';

export interface TrueHours {
  readonly hours: number;
  readonly energy_MWh_el: number;
  readonly ends_by: EndedBy;
}
