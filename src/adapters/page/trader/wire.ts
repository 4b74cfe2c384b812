import type { Mode } from '../../../core/definitions.js';
import type { EndCause } from '../../../core/estimate.js';
import type { PowerLimit } from '../../../core/plan/greatest.js';
import type { CommandCause } from '../../../core/plan/leg.js';
import type { NearestReason } from '../../../core/plan/nearest.js';
import type { Untested } from '../../../core/plan/offerReport.js';
import type { UnitEntry } from '../lib/model.js';
import type { UnitDefinition } from '../lib/wire.js';

/** Answers about what lies ahead, as far as the trader's sheet reads them; held by a test. */

/** What a unit is, with the limits that the server tells beside its stores. */
export type TraderDefinition = UnitDefinition & { limits: AnswerHead['limits'] };

/** The definition of a unit; null until it has come. */
export const definitionOf = (entry: UnitEntry | null): TraderDefinition | null =>
  (entry?.definition ?? null) as TraderDefinition | null;

/** Zone of the connection, in which blocks are sold; null: it has none, and UTC is meant. */
export const zoneOf = (entry: UnitEntry | null): string | null =>
  definitionOf(entry)?.limits.connection?.time_zone ?? null;

export interface Quantiles {
  p90: number;
  p50: number;
  p10: number;
}

/** Head of every answer: what it stands on. */
export interface AnswerHead {
  unit: string;
  time: string;
  age_s: number | null;
  valid_until: string;
  stale: boolean;
  quality: 'good' | 'degraded' | 'blind' | 'stale';
  given: string;
  limits: {
    charge: { power_min_MW_el: number; power_max_MW_el: number };
    discharge: { power_min_MW_el: number; power_max_MW_el: number };
    connection: { time_zone: string } | null;
  };
}

export interface FirstMinutes {
  probability: number;
  lacking_MW: number;
  minutes: number;
  lacking_MWh_el: number;
}

export interface Limited {
  cause: CommandCause;
  from: string;
  to: string;
  missing_MW_el: number;
}

export interface OfferHead {
  power_MW_el: number;
  start: string;
  begins: string;
  refused: string | null;
  hours: Quantiles;
  energy_MWh_el: Quantiles;
}

export interface OfferBlock {
  from: string;
  to: string;
  whole: { alone: number };
  at: { certainty: number; energy_MWh_el: number }[];
}

export interface OfferAt {
  certainty: number;
  hours: number;
  energy_MWh_el: number;
  expected_shortfall_MWh_el: number;
  mean_below_MWh_el: number | null;
  whole_blocks: { alone: number };
}

export interface Offer extends OfferHead {
  limited: Limited[];
  start_up_MWh_el: { before_start: number; after_start: number };
  ends_by: Record<string, number>;
  first_minutes?: FirstMinutes | undefined;
  at: OfferAt[];
  bid: { certainty: number; energy_MWh_el: number } | null;
  blocks: OfferBlock[];
}

export interface OfferTable extends AnswerHead {
  block_s: number;
  certainties: number[];
  time_zone: string | null;
  offers: Offer[];
  kept: number | null;
}

export interface KeptTables {
  from: string;
  to: string;
  tables: { no: number; asked: string; time: string; block_s: number; offers: OfferHead[] }[];
  older_left_out: boolean;
}

export interface KeptShare {
  kept: number;
  of: number;
  meant: number;
  share: number | null;
  interval: [number, number] | null;
}

export interface TestedOffer {
  no: number;
  asked: string;
  begins: string;
  power_MW_el: number;
  energy_MWh_el: Quantiles;
  delivered_MWh_el: number;
  ended_by: string;
  kept: { p90: boolean; p50: boolean };
}

export interface OfferReport {
  from: string;
  to: string;
  tested_by: string;
  tables: number;
  older_left_out: boolean;
  p90: KeptShare;
  p50: KeptShare;
  tested: TestedOffer[];
  untested: Partial<Record<Untested, number>>;
}

export interface PlannedBlock {
  mode: Mode;
  power_MW_el: number;
  from: string;
  to: string;
}

export interface Short {
  time: string;
  MWh_el: number;
  cause: EndCause | CommandCause;
}

export interface CheckedBlock extends PlannedBlock {
  planned_MWh_el: number;
  expected_MWh_el: number;
  certain_MWh_el: number;
  expected_shortfall_MWh_el: number;
  unmet_MWh_el: number;
  ramp_MWh_el: number;
  met_probability: number;
}

export interface CheckedRun {
  mode: Mode;
  from: string;
  to: string;
  probability: number;
  reserve_hours: { p90: number | null; p50: number | null; p10: number | null };
  ends_by: EndCause | null;
  stops: string | null;
  first_minutes?: FirstMinutes | undefined;
}

export interface ChargePoint {
  time: string;
  state_of_charge: number;
  state_of_charge_sigma: number;
}

export interface NearestSchedule {
  blocks: PlannedBlock[];
  factor_discharge: number;
  factor_charge: number;
  drawn_in: { mode: Mode; asked: string; to: string }[];
  taken_out: boolean;
  probability: number;
}

export interface ScheduleCheck extends AnswerHead {
  certainty: number;
  probability: number;
  stores_probability: number;
  planned_net_MWh_el: number;
  expected_net_MWh_el: number;
  unmet: (Limited & { block: number; MWh_el: number })[];
  first_shortfall: { p50: Short | null; certain: Short | null };
  blocks: CheckedBlock[];
  runs: CheckedRun[];
  reserve_looked_hours: number;
  charge: ChargePoint[];
  charge_left_out: number;
  nearest: NearestSchedule | null;
  nearest_reason: NearestReason | null;
}

export interface HeadroomAnswer {
  power_MW_el: number;
  hours: Quantiles;
  energy_MWh_el: Quantiles;
  ends_by: EndCause | null;
  first_minutes?: FirstMinutes | undefined;
  derated_after_hours: number | null;
  derated_to_MW_el: number | null;
  refused: string | null;
  limited_by: CommandCause | null;
}

export interface Headroom extends AnswerHead {
  answers: HeadroomAnswer[];
}

export interface CapabilityPoint {
  state_of_charge: number;
  power_MW_el: number;
  limited_by: PowerLimit;
  energy_MWh_el: number;
}

export interface CapabilityCurve {
  direction: 'charge' | 'discharge';
  points: CapabilityPoint[];
  largest_error_MW_el: number;
  refused: string | null;
}

export interface Capability extends AnswerHead {
  state_of_charge: number;
  full_from_now: number;
  rated_power_MW_el: number;
  discharge: CapabilityCurve;
  charge: CapabilityCurve;
  cycle: { settled: boolean; round_trip: number } | null;
}
