import type { Mode } from '../../definitions.js';
import type { ToldEnd } from '../runEnd.js';

/** What one scan tells of a store's part in a run. */
export interface CycleStoreScan {
  readonly id: string;
  readonly length_m: number;
  readonly soc: number;
  /** Heat between the references, by the heat capacity as it is known now [MWh_th]. */
  readonly capacity_MWh_th: number;
  readonly stored_sigma_MWh_th: number;
  /** Variance of the state of charge: what lasts over a run (offsets), and what does not. */
  readonly soc_lasting: number;
  readonly soc_passing: number;
  /** Heat, or cold, that the gas brings [MW], below 0 = takes; 0 while standing, NaN = not known. */
  readonly carried_MW: number;
  /** Energy-equivalent position [m]. */
  readonly position_m: number;
  readonly width_m: number | null;
  readonly width_sigma_m: number | null;
  readonly spread_ratio: number | null;
  /** Gas that leaves now [K]; null while standing. */
  readonly outlet_K: number | null;
  /** Of all estimated rock [K]. */
  readonly hottest_K: number;
  readonly coldest_K: number;
  readonly heat_transfer_factor: number;
  readonly heat_transfer_factor_sigma: number;
  readonly flow_factors: Readonly<Record<string, number>>;
  readonly thermocouples_rejected: number;
}

/** What one scan tells the cycle log. */
export interface CycleScan {
  readonly time_ms: number;
  readonly mode: Mode;
  /** Any reading of any channel; of a thermocouple; of one that tells the mode (mode, valve, flow, power). */
  readonly read: boolean;
  readonly bedRead: boolean;
  readonly modeRead: boolean;
  /** Metered, + = charge [kg/s]. */
  readonly flow_kg_s: number;
  readonly flowKnown: boolean;
  /** Net, + = drawn [MW]; NaN = not read. */
  readonly power_MW: number;
  readonly ambient_K: number;
  /** Of the unit. */
  readonly soc: number;
  /** In the order of the unit; empty until every store has started. */
  readonly stores: readonly CycleStoreScan[];
  /** Ids of alarms and alerts raised in this scan. */
  readonly raised: readonly string[];
  /** What is told of the end of the discharge that runs; null where none is. */
  readonly told: ToldEnd | null;
}

/** How runs are told apart, by `cycleRules`. */
export interface CycleRules {
  readonly unit: string;
  /** Standing that ends a run [s]. */
  readonly pause_s: number;
  /** Running in a direction that begins a run [s]. */
  readonly confirm_s: number;
  /** Longest time without a reading that leaves a run complete, and over which power is held [s]. */
  readonly gap_s: number;
  /** Most that one scan counts as evidence [s]. */
  readonly scan_s: number;
}
