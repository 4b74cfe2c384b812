import { RULES } from '../dispatch/rollout.js';
import type { EndCause, Quantiles } from '../estimate.js';
import { blendCourse, blendResponse, nodesAmong, type ResponseNode } from './blend.js';
import type { PlanContext } from './context.js';
import type { Course } from './course.js';
import { worthBidding } from './newsvendor.js';
import { type OffersAsk, requireOffers } from './offerAsk.js';
import { type OfferBlock, type OfferFigures, offerFigures } from './offerFigures.js';
import { type Limited, type OfferRoute, offerRoutes } from './offerRoute.js';
import { type Change, createOutlook } from './outlook.js';
import { breaksOf, covarianceOf, type Marches, responseOf, ruleTimes } from './spread.js';
import { createTrunk, type Trunk } from './trunk.js';

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
  /** Drawn by start-up and change-over: ahead of the start, and after it (in the blocks' figures). */
  readonly start_up_MWh_el: { readonly before_start: number; readonly after_start: number };
  /** Probability of each cause that may end it; they add up to 1. */
  readonly ends_by: Readonly<Partial<Record<OfferEnd, number>>>;
  /** Probability that the plan until the start is carried out as commanded; null where refused. */
  readonly plan_holds: number | null;
}

const J_PER_MWH = 3.6e9;
/** Slower fronts are marched in longer steps, as far as they then travel no further in one. */
const LONGEST_STEP = 2.5;

/**
 * What the unit can sell: net energy at the connection point of a discharge at each power from each
 * start, whole and block by block, at each certainty asked for.
 *
 * The wait is marched as what it is, with the plan until the start, its losses and the spreading of
 * the fronts. Of each discharge the first rule that breaks ends it, by the joint distribution of the
 * rules' times (see `spreadOf`); the greatest flow counts as one, since power falls from then on.
 * What several powers have in common before their start is marched once. The best march and its slopes
 * are made at some powers and go between them in relative terms (see `blendCourse`, `blendResponse`).
 *
 * Block by block, `alone` is the probability that a block is run through whatever became of the plan,
 * `jointly` that it is run through with all blocks before it and the plan. One discharge without a plan
 * is cut short once and for all: who runs through a block has run through all before it, the two are
 * the same. After a plan they are not: its own runs may have failed and the block be given all the same.
 *
 * @throws WrongQuestion (a RangeError) for what cannot be asked; see `requireOffers`
 */
export function offersOf(context: PlanContext, ask: OffersAsk): Offer[] {
  const { model, state, now_ms } = context;
  const starts = requireOffers(model.unit, now_ms, ask);
  const certainty = ask.prices === undefined ? null : worthBidding(ask.prices);
  return starts.flatMap((start_ms) => {
    const routes = offerRoutes(context, ask, (start_ms - now_ms) / 1000);
    const open = routes.filter((route) => route.refused === null);
    const trunks = new Map<string, Trunk>();
    const trunkOf = (route: OfferRoute): Trunk => {
      const key = JSON.stringify(route.head.pieces);
      const known = trunks.get(key);
      if (known !== undefined) return known;
      const made = createTrunk(createOutlook(model, state, route.headLoad), route.head);
      trunks.set(key, made);
      return made;
    };
    const marched = open.map((route) => {
      const load = route.power_W / model.unit.rated_power_W;
      const outlook = createOutlook(model, state, load);
      const longer = Math.min(LONGEST_STEP, Math.max(1, 1 / load));
      const marches = trunkOf(route).marches(outlook, route.tail, longer);
      return { route, outlook, marches, base: marches.march() };
    });
    const wholly = ({ route, marches, base }: (typeof marched)[number]): ResponseNode => {
      const course = marches.best();
      const times = ruleTimes(course);
      const known = { ...marches, march: (change?: Change) => marchOr(base, marches, change) };
      const response = responseOf(model, known, times);
      return { power_W: route.power_W, course, base, times, response };
    };
    const chosen = nodesAmong(open.map((route) => route.power_W));
    const nodes = chosen.map((i) => wholly(marched[i] as (typeof marched)[number]));
    const between = (one: (typeof marched)[number]): ResponseNode => {
      const { power_W } = one.route;
      const course = blendCourse(nodes, power_W, one.base);
      const times = course === null ? [] : ruleTimes(course);
      const response = course === null ? null : blendResponse(nodes, power_W, course, times);
      if (course === null || response === null) return wholly(one);
      return { power_W, course, base: one.base, times, response };
    };
    const offers = new Map(
      marched.map((one, i) => {
        const { route, outlook } = one;
        const { course, times, response } = nodes[chosen.indexOf(i)] ?? between(one);
        const covariance = covarianceOf(outlook, route.command, course, times, response);
        return [route, offerOf(route, { course, times, covariance }, ask, certainty)] as const;
      }),
    );
    return routes.map((route) => offers.get(route) ?? nothing(route, certainty, ask));
  });
}

/** The march without a change is at hand. */
function marchOr(base: Course, marches: Marches, change: Change | undefined): Course {
  return change === undefined ? base : marches.march(change);
}

function offerOf(
  route: OfferRoute,
  spread: Parameters<typeof breaksOf>[0],
  ask: OffersAsk,
  bid: number | null,
): Offer {
  const { episodes } = spread.course;
  const last = episodes.length - 1;
  const run = episodes[last];
  if (run === undefined) throw new RangeError('course: expected the run that is offered');
  const breaks = breaksOf(spread);
  const stops_s = breaks.first_s[last] as Float64Array;
  const { begins_s } = route;
  if (Math.max(begins_s, run.from_s) >= run.first_s || stops_s.every((t) => t <= begins_s)) {
    const why = `empty: the rule ${run.ends_by} is broken as soon as it holds`;
    return nothing({ ...route, refused: why }, bid, ask, { [run.ends_by]: 1 });
  }
  const rules = breaks.rule[last] as Int8Array;
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
    { start_s, begins_s, ends_s, closes_s, pieces, stops_s, held, bid },
    ask.block_s,
    ask.certainties,
  );
  return {
    ...headOf(route),
    ...figures,
    ends_by,
    plan_holds: held.reduce((sum, one) => sum + one, 0) / held.length,
  };
}

function headOf(route: OfferRoute) {
  return {
    power_MW_el: route.power_W / 1e6,
    start_s: route.start_s,
    begins_s: route.begins_s,
    refused: route.refused,
    limited: route.limited,
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
  };
}
