import type { Mode, UnitDefinition } from '../definitions.js';
import { ZERO_CELSIUS_K } from '../units.js';

/** One stored scan, as far as it tells what a unit did. */
export interface DoneRow {
  readonly time_ms: number;
  readonly mode: Mode | null;
  /** Net power given at the connection point [MW_el], below 0 = drawn; NaN = not read. */
  readonly given_MW_el: number;
  readonly flow_kg_s: number;
  /** Outlets of the stores by kind [degC]; NaN = not known or none. */
  readonly hot_degC: number;
  readonly cold_degC: number;
}

/** A discharge that really was. */
export interface Discharge {
  readonly from_ms: number;
  readonly to_ms: number;
  readonly energy_MWh_el: number;
  /** Median power once it had come up [MW_el]. */
  readonly power_MW_el: number;
  /** Rule at whose limit it ended; null = none was near, so that someone stopped it. */
  readonly ended_by: 'hot_outlet' | 'cold_outlet' | 'flow' | null;
  /** Readings were missing for longer than `GAP_MS` within it, or it had not ended. */
  readonly whole: boolean;
}

/** Longest time without a row over which power is taken as known [ms]. */
export const GAP_MS = 900_000;
/** Time for the power to come up [ms]. */
const UP_MS = 900_000;
/** An outlet this near its limit in the last ten minutes, or a flow at this share of the greatest. */
const NEAR_K = 3;
const NEAR_FLOW = 0.98;
const LAST_MS = 600_000;
const HOUR_MS = 3_600_000;

/**
 * Discharges among stored scans: scans of the mode `discharge` that follow each other. A rule ended
 * one where in its last ten minutes an outlet came within 3 K of its limit, or the flow within 2 % of
 * the greatest; the stored outlets are those of the estimate, so that a limit set by another
 * instrument a few kelvin off still counts.
 *
 * @param rows ascending in time
 */
export function dischargesIn(unit: UnitDefinition, rows: readonly DoneRow[]): Discharge[] {
  const found: Discharge[] = [];
  let begins = -1;
  for (let i = 0; i <= rows.length; i++) {
    const runs = rows[i]?.mode === 'discharge';
    if (runs && begins < 0) begins = i;
    if (runs || begins < 0) continue;
    found.push(dischargeOf(unit, rows, begins, i));
    begins = -1;
  }
  return found;
}

function dischargeOf(
  unit: UnitDefinition,
  rows: readonly DoneRow[],
  begins: number,
  ends: number,
): Discharge {
  const own = rows.slice(begins, ends);
  const first = own[0] as DoneRow;
  const last = own[own.length - 1] as DoneRow;
  // With the scans before and after: power came and went within a scan.
  const around = rows.slice(Math.max(0, begins - 1), ends + 1);
  let energy = 0;
  let whole = ends < rows.length && begins > 0;
  for (let i = 1; i < around.length; i++) {
    const a = around[i - 1] as DoneRow;
    const b = around[i] as DoneRow;
    const span = b.time_ms - a.time_ms;
    if (span > GAP_MS) {
      whole = false;
      continue;
    }
    const mean = (Math.max(0, a.given_MW_el) + Math.max(0, b.given_MW_el)) / 2;
    if (Number.isFinite(mean)) energy += (mean * span) / HOUR_MS;
    else whole = false;
  }
  const up = own.filter((row) => row.time_ms >= first.time_ms + UP_MS);
  return {
    from_ms: first.time_ms,
    to_ms: last.time_ms,
    energy_MWh_el: energy,
    power_MW_el: median((up.length > 0 ? up : own).map((row) => row.given_MW_el)),
    ended_by: ruleAtEnd(
      unit,
      own.filter((row) => row.time_ms >= last.time_ms - LAST_MS),
    ),
    whole,
  };
}

function ruleAtEnd(unit: UnitDefinition, rows: readonly DoneRow[]): Discharge['ended_by'] {
  const { hot_outlet_min_K, cold_outlet_max_K, discharge } = unit.limits;
  const hot = (hot_outlet_min_K ?? Number.NaN) - ZERO_CELSIUS_K + NEAR_K;
  const cold = (cold_outlet_max_K ?? Number.NaN) - ZERO_CELSIUS_K - NEAR_K;
  if (rows.some((row) => row.hot_degC <= hot)) return 'hot_outlet';
  if (rows.some((row) => row.cold_degC >= cold)) return 'cold_outlet';
  const most = NEAR_FLOW * discharge.flow_max_kg_s;
  return rows.some((row) => Math.abs(row.flow_kg_s) >= most) ? 'flow' : null;
}

function median(values: readonly number[]): number {
  const known = values.filter(Number.isFinite).sort((a, b) => a - b);
  return known[known.length >> 1] ?? Number.NaN;
}
