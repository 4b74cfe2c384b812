import type { UnitDefinition } from '../definitions.js';
import type { Quantiles } from '../estimate.js';
import { type Discharge, type DoneRow, dischargesIn, GAP_MS } from './discharges.js';
import { DoneSeries } from './doneSeries.js';
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
  /** Tables that were looked at: those asked last, where there are more. */
  readonly tables: number;
  readonly older_left_out: boolean;
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
 * @param older_left_out whether there are tables from before, which are not among the offers
 */
export function offerReport(
  unit: UnitDefinition,
  offers: readonly PastOffer[],
  rows: readonly DoneRow[],
  older_left_out = false,
): OfferReport {
  const run = reporting(unit, offers, rows, older_left_out);
  for (let next = run.next(); ; next = run.next()) if (next.done) return next.value;
}

/** As `offerReport`, in slices: each offer is a step, for who must not be kept from others. */
export function* reporting(
  unit: UnitDefinition,
  offers: readonly PastOffer[],
  rows: readonly DoneRow[],
  older_left_out = false,
): Generator<void, OfferReport> {
  const discharges = dischargesIn(unit, rows);
  const done = new DoneSeries(rows);
  yield;
  const untested = Object.fromEntries(UNTESTED.map((why) => [why, 0])) as Record<Untested, number>;
  const byRun = new Map<Discharge, PastOffer>();
  for (const offer of [...offers].sort((a, b) => a.asked_ms - b.asked_ms || a.no - b.no)) {
    const found = runOf(offer, discharges, done);
    yield;
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
  const tables = new Set(offers.map((offer) => offer.no)).size;
  const shares = { p90: count('p90', 0.9), p50: count('p50', 0.5) };
  return { tables, older_left_out, ...shares, tested, untested };
}

/** The discharge that puts an offer to the test, or why there is none. */
function runOf(
  offer: PastOffer,
  discharges: readonly Discharge[],
  done: DoneSeries,
): Discharge | Untested {
  if (offer.refused) return 'refused';
  const { begins_ms } = offer;
  const { last_ms } = done;
  if (last_ms < begins_ms + BEGINS_WITHIN_MS) return 'not_yet';
  const run = discharges.find((one) => Math.abs(one.from_ms - begins_ms) <= BEGINS_WITHIN_MS);
  if (run === undefined) return 'not_run';
  if (Math.abs(run.power_MW_el / offer.power_MW_el - 1) > POWER_WITHIN) return 'other_power';
  if (run.to_ms >= last_ms) return 'not_yet';
  if (!run.whole) return 'readings_missing';
  if (run.ended_by === null) return 'stopped_before_a_rule';
  const followed = followedPlan(offer, done, Math.min(begins_ms, run.from_ms));
  if (followed === null) return 'readings_missing';
  return followed ? run : 'plan_not_followed';
}

/** null where too few scans are stored to tell. */
function followedPlan(offer: PastOffer, done: DoneSeries, until_ms: number): boolean | null {
  const { asked_ms, legs } = offer;
  // Asked shortly before: there is nothing to follow.
  if (until_ms - asked_ms <= 2 * GAP_MS) return true;
  if (!done.isWhole(asked_ms, until_ms)) return null;
  const within = (ms: number): number => Math.min(until_ms, Math.max(asked_ms, ms));
  const edges = legs.flatMap((leg) => [within(leg.from_ms), within(leg.to_ms)]);
  const all = [asked_ms, ...edges, until_ms].sort((a, b) => a - b);
  let told = 0;
  let as = 0;
  all.slice(1).forEach((to_ms, i) => {
    const from_ms = all[i] as number;
    // Within a quarter of an hour of each change the machine may still be on its way.
    const [from, to] = [from_ms + GAP_MS, to_ms - GAP_MS];
    if (to < from) return;
    const leg = legs.find((one) => one.from_ms <= from && from < one.to_ms);
    const stands = leg === undefined || leg.mode === 'stand' || leg.power_W === 0;
    told += done.scans(from, to);
    as += stands ? done.stood(from, to) : done.ran(leg, from, to);
  });
  return as >= PLAN_SHARE * told;
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
