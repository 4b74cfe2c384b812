import { firstMinutes } from '../dispatch/firstMinutes.js';
import { RULES } from '../dispatch/rollout.js';
import type { EndCause, FirstMinutes, Quantiles } from '../estimate.js';
import type { PlanContext } from './context.js';
import { worthBidding } from './newsvendor.js';
import { distinct, type OffersAsk, requireOffers } from './offerAsk.js';
import { type OfferBlock, type OfferFigures, offerFigures } from './offerFigures.js';
import { offerMarches } from './offerMarches.js';
import { type Limited, type OfferRoute, offerRoutes, type PlanLimited } from './offerRoute.js';
import { missingAtFirst } from './offerStart.js';
import { sigmaOf } from './runFirstMinutes.js';
import { breaksOf, type PlanSpread } from './spread.js';

/** What ends an offered discharge: a stop rule, or what was commanded. */
export type OfferEnd = EndCause | 'horizon' | 'connection' | 'outage';

/** What the unit can give at one power from one start. */
export interface Offer extends OfferFigures {
  readonly power_MW_el: number;
  /** Start asked for, and when the first power comes; seconds from the estimate. */
  readonly start_s: number;
  readonly begins_s: number;
  /** Why it is not offered; null = it is. All figures are 0 then. */
  readonly refused: string | null;
  /** Of what was asked: what the machine's own limits, the connection or an outage leave undone. */
  readonly limited: readonly Limited[];
  /** The same of the plan until the start; empty = the machine can do what is planned. */
  readonly plan_limited: readonly PlanLimited[];
  /** Drawn by start-up and change-over: ahead of the start, and after it (in `drawn_MWh_el`). */
  readonly start_up_MWh_el: { readonly before_start: number; readonly after_start: number };
  /** Probability of each cause that may end it; they add up to 1. */
  readonly ends_by: Readonly<Partial<Record<OfferEnd, number>>>;
  /**
   * Probability that the plan until the start is carried out as it was asked: 0 where the machine, the
   * connection or an outage leave something of it undone; null where refused.
   */
  readonly plan_holds: number | null;
  /** Probability that the stores carry all of it that the machine can do; null where refused. */
  readonly plan_stores_hold: number | null;
  /** Absent = nothing that counts is missing at first, with 90 % probability. */
  readonly first_minutes?: FirstMinutes;
}

const J_PER_MWH = 3.6e9;

/**
 * What the unit can sell: net energy at the connection point of a discharge at each power from each
 * start, whole and block by block, at each certainty asked for.
 *
 * The wait is marched as what it is, with the plan until the start, its losses and the spreading of
 * the fronts. Of each discharge the first rule that breaks ends it, by the joint distribution of the
 * rules' times (see `spreadOf`); the greatest flow counts as one, since power falls from then on.
 * What is marched, and what goes between, see `offerMarches`.
 *
 * Block by block, `alone` is the probability that a block is run through whatever became of the plan,
 * `jointly` that it is run through with all blocks before it and what the machine can do of the plan. One discharge without a plan
 * is cut short once and for all: who runs through a block has run through all before it, the two are
 * the same. After a plan they are not: its own runs may have failed and the block be given all the same.
 * Where what is missing in the first minutes counts (`LACK_TOLD`), the block they are in is not run
 * through.
 *
 * @param asked powers, starts and certainties asked for twice are answered once
 * @throws WrongQuestion (a RangeError) for what cannot be asked; see `requireOffers`
 */
export function offersOf(context: PlanContext, asked: OffersAsk): Offer[] {
  const { model, now_ms } = context;
  const starts = requireOffers(model.unit, now_ms, asked);
  const ask = distinct(asked);
  const certainty = ask.prices === undefined ? null : worthBidding(ask.prices);
  const routes = starts.map((start_ms) => offerRoutes(context, ask, (start_ms - now_ms) / 1000));
  const open = [...routes]
    .sort((a, b) => (a[0]?.start_s ?? 0) - (b[0]?.start_s ?? 0))
    .map((own) => own.filter((route) => route.refused === null));
  const spreads = offerMarches(context, open);
  return routes.flat().map((route) => {
    const spread = spreads.get(route);
    if (spread === undefined) return nothing(route, certainty, ask);
    return offerOf(route, spread, ask, certainty);
  });
}

function offerOf(route: OfferRoute, spread: PlanSpread, ask: OffersAsk, bid: number | null): Offer {
  const { episodes } = spread.course;
  const last = episodes.length - 1;
  const run = episodes[last];
  if (run === undefined) throw new RangeError('course: expected the run that is offered');
  const breaks = breaksOf(spread);
  const { begins_s, power_W } = route;
  const start_W = breaks.start_W[last] ?? null;
  const stops_s = breaks.first_s[last] as Float64Array;
  if (Math.max(begins_s, run.from_s) >= run.first_s || stops_s.every((t) => t <= begins_s)) {
    const why = `empty: the rule ${run.ends_by} is broken as soon as it holds`;
    return nothing({ ...route, refused: why }, bid, ask, { [run.ends_by]: 1 });
  }
  const rules = breaks.rule[last] as Int8Array;
  const missing = start_W === null ? null : missingAtFirst(run.start, start_W, power_W);
  const lack = start_W === null ? null : firstMinutes(run.start, power_W, sigmaOf(start_W));
  const held = new Uint8Array(stops_s.length).fill(1);
  episodes.slice(0, last).forEach((episode, e) => {
    breaks.first_s[e]?.forEach((stop, k) => {
      if (stop < episode.held_s) held[k] = 0;
    });
  });
  const ends_by: Partial<Record<OfferEnd, number>> = {};
  stops_s.forEach((stop, k) => {
    const cause = stop >= route.ends_s ? route.ending : (RULES[rules[k] as number] as EndCause);
    ends_by[cause] = (ends_by[cause] ?? 0) + 1 / stops_s.length;
  });
  const { start_s, ends_s, closes_s } = route;
  const { pieces } = route.command;
  const figures = offerFigures(
    { start_s, begins_s, ends_s, closes_s, pieces, stops_s, missing, held, bid },
    ask.block_s,
    ask.certainties,
  );
  const plan_stores_hold = held.reduce((sum, one) => sum + one, 0) / held.length;
  return {
    ...headOf(route),
    ...figures,
    ends_by,
    plan_holds: route.planLimited.length > 0 ? 0 : plan_stores_hold,
    plan_stores_hold,
    ...(lack === null ? {} : { first_minutes: lack.told }),
  };
}

function headOf(route: OfferRoute) {
  return {
    power_MW_el: route.power_W / 1e6,
    start_s: route.start_s,
    begins_s: route.begins_s,
    refused: route.refused,
    limited: route.limited,
    plan_limited: route.planLimited,
    start_up_MWh_el: {
      before_start: route.startUp_J.before / J_PER_MWH,
      after_start: route.startUp_J.after / J_PER_MWH,
    },
  };
}

/** Nothing is offered, for the reason that the route gives. */
function nothing(
  route: OfferRoute,
  bid: number | null,
  ask: OffersAsk,
  ends_by: Offer['ends_by'] = {},
): Offer {
  const zero: Quantiles = { p90: 0, p50: 0, p10: 0 };
  const blocks: OfferBlock[] = [];
  return {
    ...headOf({ ...route, startUp_J: { before: 0, after: 0 } }),
    hours: zero,
    mean_hours: 0,
    energy_MWh_el: zero,
    mean_MWh_el: 0,
    at: ask.certainties.map((certainty) => ({
      certainty,
      hours: 0,
      energy_MWh_el: 0,
      expected_shortfall_MWh_el: 0,
      mean_below_MWh_el: null,
      whole_blocks: { alone: 0, jointly: 0 },
    })),
    blocks,
    bid: bid === null ? null : { certainty: bid, energy_MWh_el: 0 },
    ends_by,
    plan_holds: null,
    plan_stores_hold: null,
  };
}
