import type { StoreDefinition, UnitDefinition } from '../definitions.js';
import type { Estimate } from '../estimate.js';
import { type Evidence, evidenceOf } from './condition.js';
import type { EventKind, WatchEvent } from './event.js';
import * as say from './outletWords.js';
import { isGuide, type RunEndState } from './runEnd.js';
import type { Step, WatchInput } from './watch.js';

export const OUTLET_ALARM: EventKind = 'outlet_near_limit';
/** Less is not worth acting on: the shortest block in which power is sold; and back from it. */
const LEAST_LOST_MS = 15 * 60_000;
const BACK_LOST_MS = 10 * 60_000;
/** What is further off is for whoever plans, not for the operator; and back from it. */
const WITHIN_MS = 60 * 60_000;
const BACK_WITHIN_MS = 75 * 60_000;
/**
 * Less is no time to act: to see it, to choose a power and to set it. No alarm is raised then: the run is
 * over before anything came of it, and an outlet past its limit while it goes on is an alarm by itself.
 */
export const LEAST_LEFT_MS = 5 * 60_000;
/** High is what leaves little time, or costs an hour of power that was told. */
const HURRY_MS = 15 * 60_000;
const MUCH_LOST_MS = 60 * 60_000;

/** Outlet of a store above the limit that ends a discharge, or below it [K]; null: not known, or none. */
export function outletMargin(
  { limits }: UnitDefinition,
  { kind }: StoreDefinition,
  outlet_K: number | null,
): number | null {
  const stop = kind === 'hot' ? limits.hot_outlet_min_K : limits.cold_outlet_max_K;
  if (stop === null || outlet_K === null) return null;
  return kind === 'hot' ? outlet_K - stop : stop - outlet_K;
}

/** Whether an outlet is as close to its limit as makes one look closer. */
export function isOutletNear(unit: UnitDefinition, { stores }: Estimate): boolean {
  return unit.stores.some((store) => {
    const margin = outletMargin(unit, store, stores[store.id]?.outlet_K ?? null);
    return margin !== null && margin < unit.watch.outlet_margin_K.limit;
  });
}

/** Why the alarm is raised. */
type Why = 'early' | 'past' | 'untold';

interface Judged {
  readonly evidence: Evidence;
  readonly why: Why;
}

/**
 * A discharge that runs to its end as told is no alarm: hours announce it, the cycle log records it.
 * The operator has to act where
 *
 * - it ends before what was told as firm (p90), by a quarter of an hour at least, and within the hour,
 *   but no sooner than he can act, in five minutes; one that stands by then goes on standing: of the store whose outlet, or without whose outlet nearest to its limit, ends it;
 * - an outlet is past its limit by the deadband, and the unit still discharges;
 * - an outlet is near its limit and nothing was told, as the estimate or the power was not known.
 *
 * While the estimate is no guide nothing is decided: `estimate_blind` stands then.
 */
export function watchOutlets(unit: UnitDefinition, input: WatchInput, step: Step): void {
  const { run, estimate, mode, time_ms } = input;
  const margins = unit.stores.map((store) =>
    outletMargin(unit, store, estimate.stores[store.id]?.outlet_K ?? null),
  );
  const ending = endingStore(unit, margins, run);
  const rule = unit.watch.outlet_margin_K;
  unit.stores.forEach((store, s) => {
    const { kind } = store;
    const stop = kind === 'hot' ? unit.limits.hot_outlet_min_K : unit.limits.cold_outlet_max_K;
    const outlet_K = estimate.stores[store.id]?.outlet_K ?? null;
    const margin = margins[s] ?? null;
    if (stop === null || estimate.stores[store.id] === undefined) return;
    const { evidence, why } = judge(unit, input, margin, ending === s);
    const limit = why === 'early' ? null : why === 'past' ? 0 : rule.limit;
    step(OUTLET_ALARM, store.id, evidence, rule, margin, limit, (raised) => {
      const zone = unit.limits.connection?.time_zone ?? null;
      if (!raised) return say.outletReturned(store.id, zone, mode, why, run ?? null);
      const words = { store: store.id, kind, outlet_K: outlet_K ?? Number.NaN, stop_K: stop };
      if (why !== 'early' || !run?.told || !run.expected)
        return {
          message: say.outletRaised(words, why === 'past'),
          ...(why === 'past' ? { act_by_ms: time_ms } : {}),
        };
      const { told, expected } = run;
      return {
        message: say.runsOutEarly({ ...words, zone, told, expected }),
        priority: priorityOf(expected.end_ms - time_ms, told.end_ms - expected.end_ms),
        act_by_ms: Math.max(time_ms, expected.end_ms),
      };
    });
  });
}

function priorityOf(left_ms: number, lost_ms: number): WatchEvent['priority'] {
  return left_ms <= HURRY_MS || lost_ms >= MUCH_LOST_MS ? 'high' : 'medium';
}

function judge(
  { watch }: UnitDefinition,
  { mode, estimate, run, time_ms }: WatchInput,
  margin: number | null,
  ends: boolean,
): Judged {
  const { limit, deadband } = watch.outlet_margin_K;
  const told = run?.told ?? null;
  const why: Why = told !== null ? 'early' : 'untold';
  if (mode !== 'discharge') return { evidence: 'clear', why };
  if (!isGuide(estimate.quality)) return { evidence: 'unknown', why };
  if (margin !== null && margin <= -deadband) return { evidence: 'active', why: 'past' };
  // Nothing can have been told of a discharge that has just begun: that comes next.
  if (run && told === null && time_ms - run.since_ms < JUST_BEGUN_MS)
    return { evidence: 'between', why };
  if (!run || told === null)
    return { evidence: evidenceOf({ limit, deadband, value: margin, sense: 'below' }), why };
  const back = margin !== null && margin <= 0 ? 'between' : 'clear';
  if (run.expected === null || !ends) return { evidence: back, why };
  const { end_ms } = run.expected;
  const lost_ms = told.end_ms - end_ms;
  if (end_ms >= told.firm_ms || lost_ms < BACK_LOST_MS) return { evidence: back, why };
  if (end_ms - time_ms > BACK_WITHIN_MS) return { evidence: back, why };
  const left_ms = end_ms - time_ms;
  const acts = lost_ms >= LEAST_LOST_MS && left_ms <= WITHIN_MS && left_ms >= LEAST_LEFT_MS;
  return { evidence: acts ? 'active' : 'between', why };
}

const JUST_BEGUN_MS = 5 * 60_000;

/** The store whose outlet ends the run, else the one that is nearest to its limit; -1: none. */
function endingStore(
  { stores }: UnitDefinition,
  margins: readonly (number | null)[],
  run: RunEndState | null | undefined,
): number {
  const by = run?.expected?.ends_by;
  const kind = by === 'hot_outlet' ? 'hot' : by === 'cold_outlet' ? 'cold' : null;
  const named = stores.findIndex((store) => store.kind === kind);
  if (named >= 0) return named;
  const known = margins.map((margin) => margin ?? Number.POSITIVE_INFINITY);
  const least = Math.min(...known);
  return Number.isFinite(least) ? known.indexOf(least) : -1;
}
