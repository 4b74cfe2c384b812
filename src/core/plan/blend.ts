import { leastMargin } from '../dispatch/firstMinutes.js';
import { RULES } from '../dispatch/rollout.js';
import type { EndCause } from '../estimate.js';
import type { Course } from './course.js';
import type { Episode } from './episode.js';
import type { PlanResponse, RuleTime } from './spread.js';

/** A run of which all was marched, to go between by. */
export interface ResponseNode {
  /** Where it stands: ln(power), or its start [s]. */
  readonly at: number;
  /** The best march, and that on the estimate's own cells. */
  readonly course: Course;
  readonly base: Course;
  readonly times: readonly RuleTime[];
  readonly response: PlanResponse;
}

/** Nodes stand no further apart than by this factor in power, where there are powers between. */
const FURTHEST = 3;

/**
 * Which powers' slopes are marched: the least, the greatest, and as many between as keep neighbours
 * within `FURTHEST` of each other; the rest goes between them.
 *
 * @returns indices in `powers_W`, ascending in power
 */
export function nodesAmong(powers_W: readonly number[]): number[] {
  const order = powers_W.map((_, i) => i).sort((a, b) => powerOf(a) - powerOf(b));
  function powerOf(i: number): number {
    return powers_W[i] as number;
  }
  const nodes: number[] = [];
  order.forEach((i, at) => {
    const next = order[at + 1];
    const last = nodes[nodes.length - 1];
    const needed =
      last === undefined || next === undefined || powerOf(next) > FURTHEST * powerOf(last);
    if (needed) nodes.push(i);
  });
  return nodes;
}

/** Shorter runs are all start: what ends them is no share of their length [s]. */
const SHORT_S = 3600;
/** Further apart the two marches do not tell of each other. */
const UNLIKE = 0.1;

/** Whether a node's last run, in either march, is too short to go by. */
function isShort({ course, base }: ResponseNode): boolean {
  return [course, base].some(({ episodes }) => {
    const last = episodes[episodes.length - 1];
    return last === undefined || last.first_s - last.from_s < SHORT_S;
  });
}

/** The two nodes about a place, and how far it stands from the lower to the higher. */
function about(nodes: readonly ResponseNode[], at: number) {
  const above = nodes.findIndex((node) => node.at >= at);
  const high = nodes[above];
  const low = nodes[Math.max(0, above - 1)];
  if (high === undefined || low === undefined || low.at > at) return null;
  if (isShort(low) || isShort(high)) return null;
  const span = high.at - low.at;
  return { low, high, weight: span > 0 ? (at - low.at) / span : 0 };
}

/**
 * The best march of a run between two whose own were made: that on the estimate's own cells, the
 * length of each run until each rule taken at the ratio of the two marches, which goes linearly from
 * one node to the other.
 *
 * @param nodes ascending, `at` among them
 * @param base march on the estimate's own cells
 * @returns null where a rule breaks in `base` that breaks at neither node, or the two marches or the
 *   nodes tell too little of each other: it has to be marched
 */
export function blendCourse(
  nodes: readonly ResponseNode[],
  at: number,
  base: Course,
): Course | null {
  const sides = about(nodes, at);
  if (sides === null) return null;
  const { low, high, weight } = sides;
  const ratioAt = (node: ResponseNode, e: number, rule: number): number => {
    const best = node.course.episodes[e];
    const own = node.base.episodes[e];
    if (best === undefined || own === undefined) return Number.NaN;
    return lasted(best, rule) / lasted(own, rule);
  };
  const episodes: Episode[] = [];
  for (const [e, episode] of base.episodes.entries()) {
    const times_s = episode.times_s.map((time_s, rule) => {
      if (!Number.isFinite(time_s)) return time_s;
      const a = ratioAt(low, e, rule);
      const b = ratioAt(high, e, rule);
      const ratio = Number.isFinite(a) && Number.isFinite(b) ? a + (b - a) * weight : a || b;
      const alike = Math.abs(ratio - 1) <= UNLIKE && lasted(episode, rule) >= 0;
      return alike ? episode.from_s + lasted(episode, rule) * ratio : Number.NaN;
    });
    if (times_s.some(Number.isNaN)) return null;
    let first_s = Number.POSITIVE_INFINITY;
    let ends_by: EndCause = 'empty';
    times_s.forEach((time_s, rule) => {
      if (!(time_s < first_s)) return;
      first_s = time_s;
      ends_by = RULES[rule] as EndCause;
    });
    const apart_W = (node: ResponseNode): number => {
      const [best, own] = [node.course, node.base].map((of) =>
        leastMargin(of.episodes[e]?.start ?? []),
      ) as [number, number];
      return Number.isFinite(best - own) ? best - own : 0;
    };
    const shift_W = apart_W(low) + (apart_W(high) - apart_W(low)) * weight;
    const start = episode.start.map(({ t_s, margin_W }) => ({ t_s, margin_W: margin_W + shift_W }));
    episodes.push({ ...episode, times_s, first_s, ends_by, start });
  }
  return { ...base, episodes };
}

function lasted(episode: Episode, rule: number): number {
  return (episode.times_s[rule] as number) - episode.from_s;
}

/**
 * Slopes of a run between two whose own were marched. What a run's end moves by, over the run's length,
 * changes little with its power and with the wait before it: that ratio goes linearly from one node to
 * the other. A rule that one of the two never comes to takes the other's ratio.
 *
 * @param nodes ascending, `place` among them
 * @param times, course of the run itself
 * @returns null where a rule of `times` is known at neither, or a node's run is too short: its slopes
 *   have to be marched
 */
export function blendResponse(
  nodes: readonly ResponseNode[],
  place: number,
  course: Course,
  times: readonly RuleTime[],
): PlanResponse | null {
  const sides = about(nodes, place);
  if (sides === null) return null;
  const { low, high, weight } = sides;
  const rows = times.map((q) => {
    const length = lengthOf(course, q);
    const share = (node: ResponseNode, own: number): { at: number; factor: number }[] => {
      const at = node.times.findIndex(
        (p) => p.episode === q.episode && p.rule === q.rule && p.start === q.start,
      );
      // A margin of the first minutes hangs on the gas that stood, not on how long the run lasts.
      if (q.start) return at < 0 ? [] : [{ at, factor: own }];
      const before = at < 0 ? 0 : lengthOf(node.course, node.times[at] as RuleTime);
      return before > 0 ? [{ at, factor: (own * length) / before }] : [];
    };
    const [a] = share(low, 1 - weight);
    const [b] = share(high, weight);
    if (a === undefined && b === undefined) return null;
    const alone = a === undefined ? weight : b === undefined ? 1 - weight : 1;
    // Nothing to divide by: the power is that of the node which knows nothing of the rule.
    return alone === 0 ? null : { a, b, alone };
  });
  if (rows.some((row) => row === null)) return null;
  const blend = (of: (response: PlanResponse) => readonly number[]): number[] =>
    rows.map((row) => {
      const { a, b, alone } = row as NonNullable<typeof row>;
      const low_ = a === undefined ? 0 : a.factor * (of(low.response)[a.at] as number);
      const high_ = b === undefined ? 0 : b.factor * (of(high.response)[b.at] as number);
      return (low_ + high_) / alone;
    });
  return {
    stores: low.response.stores.map((store, s) => ({
      bumps: store.bumps.map((_, k) => blend((r) => r.stores[s]?.bumps[k] as readonly number[])),
      flow: blend((r) => r.stores[s]?.flow as readonly number[]),
      transfer: blend((r) => r.stores[s]?.transfer as readonly number[]),
    })),
    work: {
      discharge: blend((r) => r.work.discharge),
      charge: blend((r) => r.work.charge),
    },
    ambient: blend((r) => r.ambient),
  };
}

function lengthOf(course: Course, q: RuleTime): number {
  return q.time_s - (course.episodes[q.episode]?.from_s as number);
}
