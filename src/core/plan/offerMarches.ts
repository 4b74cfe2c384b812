import type { UnitModel } from '../unitModel.js';
import { blendCourse, blendResponse, nodesAmong, type ResponseNode } from './blend.js';
import type { Command } from './command.js';
import type { PlanContext } from './context.js';
import type { Course } from './course.js';
import type { OfferRoute } from './offerRoute.js';
import { type Change, createOutlook, type Outlook } from './outlook.js';
import {
  covarianceOf,
  type Marches,
  type PlanSpread,
  type RuleTime,
  responseOf,
  ruleTimes,
  startMargins,
} from './spread.js';
import { createTrunk, fromNow, type Trunk } from './trunk.js';

/** Slower fronts are marched in longer steps, as far as they then travel no further in one. */
const LONGEST_STEP = 2.5;
/** Starts are gone between over so long at most [s]. */
const LONGEST_BETWEEN_S = 24 * 3600;

/** One offered run on the estimate's own cells, and the way to march it otherwise. */
interface Marched {
  readonly route: OfferRoute;
  readonly outlook: Outlook;
  readonly marches: Marches;
  readonly base: Course;
}

/** The runs from one start. */
interface Start {
  readonly start_s: number;
  readonly runs: readonly Marched[];
  /** Indices in `runs` of the powers between which the others go; ascending in power. */
  readonly chosen: readonly number[];
  /** What is run before it, as text; the same from start to start where the unit stands between. */
  readonly plan: string;
}

/**
 * Courses of offered runs with the covariance of their rules' times. What several powers have in
 * common before their start is marched once. The best march and its slopes are made at some powers and
 * go between them in relative terms, and where the unit only stands from start to start, from the
 * first start to the last alike (see `blendCourse`, `blendResponse`).
 *
 * @param routes by start, ascending; none of them refused
 */
export function offerMarches(
  context: PlanContext,
  routes: readonly (readonly OfferRoute[])[],
): Map<OfferRoute, PlanSpread> {
  const { model } = context;
  const plans = new Map<string, Trunk>();
  const starts = routes.filter((own) => own.length > 0).map((own) => startOf(context, own, plans));
  const first = starts[0];
  const last = starts[starts.length - 1];
  const outer = new Map<Start, ResponseNode[]>();
  const nodesOf = (start: Start): ResponseNode[] => {
    const known = outer.get(start);
    if (known !== undefined) return known;
    const made = start.chosen.map((i) => wholly(model, start.runs[i] as Marched));
    outer.set(start, made);
    return made;
  };
  const spreads = new Map<OfferRoute, PlanSpread>();
  for (const start of starts) {
    const inner = start !== first && start !== last;
    const nodes =
      inner && first !== undefined && last !== undefined && areAlike(first, start, last)
        ? start.chosen.map((i) =>
            betweenStarts(model, start.runs[i] as Marched, start.start_s, [
              { at: first.start_s, nodes: nodesOf(first) },
              { at: last.start_s, nodes: nodesOf(last) },
            ]),
          )
        : nodesOf(start);
    start.runs.forEach((one, i) => {
      const { route, outlook } = one;
      const found = nodes[start.chosen.indexOf(i)] ?? between(model, one, nodes);
      const { course, times, response } = found;
      const covariance = covarianceOf(outlook, route.command, course, times, response);
      spreads.set(route, { course, times, covariance });
    });
  }
  return spreads;
}

function areAlike(first: Start, start: Start, last: Start): boolean {
  if (last.start_s - first.start_s > LONGEST_BETWEEN_S) return false;
  return first.plan === start.plan && start.plan === last.plan;
}

/** @param plans trunks of what is run before several starts, to be shared */
function startOf(
  { model, state }: PlanContext,
  routes: readonly OfferRoute[],
  plans: Map<string, Trunk>,
): Start {
  const trunks = new Map<string, Trunk>();
  const trunkOf = (route: OfferRoute): Trunk =>
    shared(trunks, JSON.stringify(route.head.pieces), () => {
      const outlook = createOutlook(model, state, route.headLoad);
      const { run, rest } = partsOf(route.head);
      const plan = shared(plans, planKey(route), () => createTrunk(fromNow(outlook, run)));
      return createTrunk(plan.marches(outlook, rest));
    });
  const runs = routes.map((route): Marched => {
    const load = route.power_W / model.unit.rated_power_W;
    const outlook = createOutlook(model, state, load);
    const longer = Math.min(LONGEST_STEP, Math.max(1, 1 / load));
    const marches = trunkOf(route).marches(outlook, route.tail, longer);
    return { route, outlook, marches, base: marches.march() };
  });
  const start_s = routes[0]?.start_s ?? Number.NaN;
  const plan = routes[0] === undefined ? '' : planKey(routes[0]);
  return { start_s, runs, chosen: nodesAmong(routes.map((route) => route.power_W)), plan };
}

function shared(known: Map<string, Trunk>, key: string, make: () => Trunk): Trunk {
  const before = known.get(key);
  if (before !== undefined) return before;
  const made = make();
  known.set(key, made);
  return made;
}

function planKey(route: OfferRoute): string {
  return JSON.stringify([route.headLoad, partsOf(route.head).run.pieces]);
}

/** What is run before a start, and how the unit stands after it. */
function partsOf(head: Command): { readonly run: Command; readonly rest: Command } {
  const last = head.pieces.findLastIndex((piece) => piece.mode !== 'stand');
  return {
    run: { pieces: head.pieces.slice(0, last + 1), unmet: [] },
    rest: { pieces: head.pieces.slice(last + 1), unmet: [] },
  };
}

/** Times of all rules, and what may be missing in the first minutes of the run that is offered. */
function timesOf({ command }: OfferRoute, course: Course): RuleTime[] {
  const last = course.episodes.length - 1;
  return [
    ...ruleTimes(course),
    ...startMargins(course, command).filter(({ episode }) => episode === last),
  ];
}

/** Everything marched. */
function wholly(model: UnitModel, { route, marches, base }: Marched): ResponseNode {
  const course = marches.best();
  const times = timesOf(route, course);
  const known: Marches = {
    ...marches,
    // The march without a change is at hand.
    march: (change?: Change) => (change === undefined ? base : marches.march(change)),
  };
  const response = responseOf(model, known, times);
  return { at: Math.log(route.power_W), course, base, times, response };
}

/** Between the nodes of the same start; all marched where these tell too little. */
function between(model: UnitModel, one: Marched, nodes: readonly ResponseNode[]): ResponseNode {
  const at = Math.log(one.route.power_W);
  const course = blendCourse(nodes, at, one.base);
  const times = course === null ? [] : timesOf(one.route, course);
  const response = course === null ? null : blendResponse(nodes, at, course, times);
  if (course === null || response === null) return wholly(model, one);
  return { at, course, base: one.base, times, response };
}

/** The same power between two starts; all marched where these tell too little. */
function betweenStarts(
  model: UnitModel,
  one: Marched,
  at_s: number,
  starts: readonly { readonly at: number; readonly nodes: readonly ResponseNode[] }[],
): ResponseNode {
  const power = Math.log(one.route.power_W);
  const pair = starts.flatMap(({ at, nodes }) =>
    nodes.filter((node) => node.at === power).map((node) => ({ ...node, at })),
  );
  if (pair.length !== starts.length) return wholly(model, one);
  const course = blendCourse(pair, at_s, one.base);
  const times = course === null ? [] : timesOf(one.route, course);
  const response = course === null ? null : blendResponse(pair, at_s, course, times);
  if (course === null || response === null) return wholly(model, one);
  return { at: power, course, base: one.base, times, response };
}
