import type { UnitDefinition } from '../definitions.js';
import type { Estimate } from '../estimate.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import type { Taken } from '../unitTakeIn.js';
import type { SpreadRatio } from './spreadRatio.js';

/** What is followed over weeks, so that a person learns early which part of the plant degrades. */
export const INDICATOR_KINDS = [
  'spread_ratio',
  'heat_transfer',
  'string_flow',
  'front_travel',
  'standing_loss',
  'valve_leak',
  'pressure_drop',
  'plateau',
  'gas_inventory',
  'settling',
  'store_mismatch',
  'front_view',
  'energy_lost',
  'sensor_health',
] as const;
export type IndicatorKind = (typeof INDICATOR_KINDS)[number];

/** Those that speak of the unit as a whole, no store of it. */
export const UNIT_INDICATORS: ReadonlySet<IndicatorKind> = new Set([
  'gas_inventory',
  'store_mismatch',
  'energy_lost',
]);

/** Why an indicator has no decision now. */
export const INDICATOR_REASONS = [
  /** No channel, or no string, from which it could be told. */
  'not_instrumented',
  /** The healthy value is still being learned. */
  'learning',
  /** The plant does not do now, and has not yet done, what would show it. */
  'not_exercised',
  /** Readings or their bounds leave it open. */
  'too_uncertain',
] as const;
export type IndicatorReason = (typeof INDICATOR_REASONS)[number];

/** Where the healthy value comes from. */
export type HealthyFrom = 'configured' | 'learned' | 'twin' | 'law';

export interface IndicatorRule {
  /** Deviation at which the plant counts as degraded, in the unit and sense of its kind. */
  readonly limit: number;
  /** How far back from the limit a value must come to count as healthy again, >= 0. */
  readonly deadband: number;
  readonly on_delay_s: number;
  readonly off_delay_s: number;
}

/** How a unit's indicators decide. */
export interface IndicatorsDefinition {
  /** Mean time to a false decision of one healthy indicator is at least this long [d]; see sequential.ts. */
  readonly in_control_d: number;
  /** Nothing before this time counts to what is healthy: after an overhaul [ms since 1970]; null = all. */
  readonly baseline_from_ms: number | null;
  readonly rules: Readonly<Record<IndicatorKind, IndicatorRule>>;
}

/** One indicator of one subject, as people and programs see it. Numbers are finite or null. */
export interface IndicatorView {
  readonly kind: IndicatorKind;
  /** Store, `store/string`, channel or unit that it speaks of. */
  readonly subject: string;
  readonly value: number | null;
  readonly sigma: number | null;
  /** Of value, sigma, healthy, limit and deadband: `-`, `K`, `kg/s`, `MWh_el`, ... */
  readonly unit: string;
  readonly healthy: number | null;
  readonly healthy_from: HealthyFrom | null;
  /** Value at which it counts as degraded, beyond it in the sense of its kind. */
  readonly limit: number;
  readonly deadband: number;
  readonly on_delay_s: number;
  readonly off_delay_s: number;
  /** Sequential test: 0 as healthy as can be, 1 decided; null before anything is known. */
  readonly score: number | null;
  readonly state: 'normal' | 'degraded' | 'undetermined';
  readonly reason: IndicatorReason | null;
  /** Source time of the newest value, ISO 8601 UTC; null before the first. */
  readonly time: string | null;
  /** Plain sentence: what is the case, against what, and what it means. */
  readonly sentence: string;
  /** Of `pressure_drop`: too high only while the bed is below freezing; null or absent: not known. */
  readonly only_while_cold?: boolean | null;
}

/** What an indicator can see of one scan, after it was taken in and estimated. */
export interface IndicatorInput {
  readonly unit: UnitDefinition;
  readonly model: UnitModel;
  /** Not to be changed. */
  readonly state: Readonly<UnitState>;
  readonly taken: Taken;
  readonly estimate: Estimate;
  readonly spread: Readonly<Record<string, SpreadRatio | null>>;
  /** Source time [ms], and time since the last scan [s]; 0 at the first. */
  readonly time_ms: number;
  readonly dt_s: number;
}

/**
 * An indicator: a pure step over plain, bounded state. `step` changes the state in place and returns
 * the views of all its subjects, in a fixed order, the same subjects every time.
 */
export interface Indicator<S> {
  readonly kind: IndicatorKind;
  start(model: UnitModel): S;
  step(
    state: S,
    rule: IndicatorRule,
    watching: IndicatorsDefinition,
    input: IndicatorInput,
  ): IndicatorView[];
}
