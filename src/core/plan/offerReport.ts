import type { UnitDefinition } from '../definitions.js';
import type { Quantiles } from '../estimate.js';
import { type Discharge, type DoneRow, dischargesIn, GAP_MS } from './discharges.js';
import type { PlannedLeg } from './offerAsk.js';

/** An offer that was answered and kept. */
export interface PastOffer {
  /** Number of the table that it stands in. */
  readonly no: number;
  readonly asked_ms: number;
  readonly power_MW_el: number;
  readonly begins_ms: number;
  readonly refused: boolean;
  readonly energy_MWh_el: Quantiles;
  /** Plan until its start; empty = it was to stand. */
  readonly legs: readonly PlannedLeg[];
}

/** Why what was delivered tells nothing of an offer. */
export const UNTESTED = [
  'refused',
  'not_yet',
  'plan_not_followed',
  'not_run',
  'other_power',
  'stopped_before_a_rule',
  'readings_missing',
  'superseded',
] as const;
export type Untested = (typeof UNTESTED)[number];

export interface TestedOffer {
  readonly no: number;
  readonly asked_ms: number;
  readonly power_MW_el: number;
  readonly begins_ms: number;
  readonly energy_MWh_el: Quantiles;
  readonly delivered_MWh_el: number;
  readonly ended_by: NonNullable<Discharge['ended_by']>;
  readonly kept: { readonly p90: boolean; readonly p50: boolean };
}

/** How often a figure was kept, with the 95 % interval of its probability. */
export interface Kept {
  readonly kept: number;
  readonly of: number;
  /** What it was meant to be. */
  readonly meant: number;
  readonly share: number | null;
  readonly interval: readonly [number, number] | null;
}

export interface OfferReport {
  readonly p90: Kept;
  readonly p50: Kept;
  readonly tested: TestedOffer[];
  readonly untested: Record<Untested, number>;
}

/** A discharge counts as that of an offer if it begins so near its first power. */
export const BEGINS_WITHIN_MS = 900_000;
/** And if its median power is so near that offered. */
export const POWER_WITHIN = 0.05;
/** Share of the scans before it in which the unit did what was planned. */
const PLAN_SHARE = 0.9;

/**
 * Holds past offers against what was then delivered.
 *
 * An offer is put to the test only where the unit did what it was told by: it followed the plan (or
 * stood) until the start in nine scans of ten, then discharged from within 15 minutes of the first
 * power offered, at a median power within 5 % of it, until a rule ended it (see `dischargesIn`). A
 * discharge that someone stopped sooner says only that there was at least so much, and to count it
 * where it is enough would favour p90. Of several offers that one discharge tests the last asked
 * before it counts: the others would count the same discharge again.
 *
 * @param rows stored scans ascending in time, from the first offer's asking on
 */
export function offerReport(
  unit: UnitDefinition,
  offers: readonly PastOffer[],
  rows: readonly DoneRow[],
): OfferReport {
  const discharges = dischargesIn(unit, rows);
  const last_ms = rows[rows.length - 1]?.time_ms ?? Number.NEGATIVE_INFINITY;
  const untested = Object.fromEntries(UNTESTED.map((why) => [why, 0])) as Record<Untested, number>;
  const byRun = new Map<Discharge, PastOffer>();
  for (const offer of [...offers].sort((a, b) => a.asked_ms - b.asked_ms || a.no - b.no)) {
    const found = runOf(offer, discharges, rows, last_ms);
    if (typeof found === 'string') untested[found]++;
    else {
      if (byRun.has(found)) untested.superseded++;
      byRun.set(found, offer);
    }
  }
  const tested = [...byRun].map(([run, offer]): TestedOffer => {
    const { no, asked_ms, power_MW_el, begins_ms, energy_MWh_el } = offer;
    return {
      ...{ no, asked_ms, power_MW_el, begins_ms, energy_MWh_el },
      delivered_MWh_el: run.energy_MWh_el,
      ended_by: run.ended_by as NonNullable<Discharge['ended_by']>,
      kept: {
        p90: run.energy_MWh_el >= energy_MWh_el.p90,
        p50: run.energy_MWh_el >= energy_MWh_el.p50,
      },
    };
  });
  const count = (key: 'p90' | 'p50', meant: number): Kept => {
    const kept = tested.filter((one) => one.kept[key]).length;
    const of = tested.length;
    if (of === 0) return { kept, of, meant, share: null, interval: null };
    return { kept, of, meant, share: kept / of, interval: wilson(kept, of) };
  };
  return { p90: count('p90', 0.9), p50: count('p50', 0.5), tested, untested };
}

/** The discharge that puts an offer to the test, or why there is none. */
function runOf(
  offer: PastOffer,
  discharges: readonly Discharge[],
  rows: readonly DoneRow[],
  last_ms: number,
): Discharge | Untested {
  if (offer.refused) return 'refused';
  const { begins_ms } = offer;
  if (last_ms < begins_ms + BEGINS_WITHIN_MS) return 'not_yet';
  const run = discharges.find((one) => Math.abs(one.from_ms - begins_ms) <= BEGINS_WITHIN_MS);
  if (run === undefined) return 'not_run';
  if (Math.abs(run.power_MW_el / offer.power_MW_el - 1) > POWER_WITHIN) return 'other_power';
  if (run.to_ms >= last_ms) return 'not_yet';
  if (!run.whole) return 'readings_missing';
  if (run.ended_by === null) return 'stopped_before_a_rule';
  const followed = followedPlan(offer, rows, Math.min(begins_ms, run.from_ms));
  if (followed === null) return 'readings_missing';
  return followed ? run : 'plan_not_followed';
}

/** null where too few scans are stored to tell. */
function followedPlan(
  offer: PastOffer,
  rows: readonly DoneRow[],
  until_ms: number,
): boolean | null {
  // Within a quarter of an hour of each change the machine may still be on its way.
  const { asked_ms, legs } = offer;
  const edges = [asked_ms, until_ms, ...legs.flatMap((leg) => [leg.from_ms, leg.to_ms])];
  const near = (ms: number): boolean => edges.some((edge) => Math.abs(ms - edge) < GAP_MS);
  const own = rows.slice(firstFrom(rows, asked_ms + 1), firstFrom(rows, until_ms));
  const told = own.filter((row) => !near(row.time_ms));
  // Asked shortly before: there is nothing to follow.
  if (until_ms - asked_ms <= 2 * GAP_MS) return true;
  let at = asked_ms;
  for (const row of own) {
    if (row.time_ms - at > GAP_MS) return null;
    at = row.time_ms;
  }
  if (until_ms - at > GAP_MS) return null;
  const as = told.filter((row) => {
    const leg = legs.find((one) => one.from_ms <= row.time_ms && row.time_ms < one.to_ms);
    if (leg === undefined || leg.mode === 'stand' || leg.power_W === 0) return row.mode === 'stand';
    const share = Math.abs(row.given_MW_el) / (leg.power_W / 1e6);
    return row.mode === leg.mode && Math.abs(share - 1) <= 2 * POWER_WITHIN;
  });
  return as.length >= PLAN_SHARE * told.length;
}

/** Index of the first row at or after a time. */
function firstFrom(rows: readonly DoneRow[], time_ms: number): number {
  let low = 0;
  let high = rows.length;
  while (low < high) {
    const middle = (low + high) >> 1;
    if ((rows[middle] as DoneRow).time_ms < time_ms) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** z of a two-sided 95 % interval. */
const Z = 1.959964;

/** Score interval of a binomial probability (Wilson 1927, J. Am. Stat. Assoc. 22, 209). */
export function wilson(kept: number, of: number): [number, number] {
  const p = kept / of;
  const z2 = (Z * Z) / of;
  const middle = (p + z2 / 2) / (1 + z2);
  const half = (Math.sqrt((p * (1 - p)) / of + z2 / (4 * of)) * Z) / (1 + z2);
  return [Math.max(0, middle - half), Math.min(1, middle + half)];
}
