import type { Direction } from '../definitions.js';
import { SETTLED_S, toldBelow } from '../dispatch/firstMinutes.js';
import { RULES } from '../dispatch/rollout.js';
import type { Command } from './command.js';
import type { Course } from './course.js';
import type { Episode } from './episode.js';
import { NORMAL_COUNT } from './latinNormals.js';
import type { Outlook } from './outlook.js';
import {
  closestFlows,
  covarianceOf,
  type Marches,
  type PlanSpread,
  responseOf,
  ruleSamples,
  ruleTimes,
  startMargins,
} from './spread.js';
import { withSteadyFlow } from './steadyFlow.js';

/** What becomes of a command, and how surely: one value per point of the joint distribution. */
export interface Evaluation {
  readonly command: Command;
  readonly course: Course;
  /**
   * Per run: when it first gives less than commanded [s], and by which rule (index in `RULES`, -1 =
   * none): its first rule breaks, or more is missing in its first minutes than goes untold.
   */
  readonly first_s: readonly Float64Array[];
  /** Per run: when its first rule breaks, what is missing in its first minutes aside [s]. */
  readonly breaks_s: readonly Float64Array[];
  /** Per run: least margin of its first minutes [W], see `lackBetween`; null = nothing near to missing. */
  readonly start_W: readonly (Float64Array | null)[];
  readonly rule: readonly Int8Array[];
  /** Per run: when it stops [s], and from when on it needs more than the greatest flow [s]. */
  readonly stop_s: readonly Float64Array[];
  readonly derate_s: readonly Float64Array[];
  /** Times of each rule in each run [s], by run and rule; absent = not reached. */
  readonly samples: readonly {
    readonly e: number;
    readonly rule: number;
    readonly values: Float64Array;
  }[];
  /** How far past their ends runs were followed [s]; Infinity above stands for later than that. */
  readonly beyond_s: number;
}

const FLOW = RULES.indexOf('flow');
/** Ends of pieces are sums of floats [s]. */
const SAME_S = 1e-6;

/**
 * Carries out a command with everything that is uncertain.
 *
 * Later runs follow the most likely course of those before: where that stops one early, they begin
 * with what it left. Runs that no leg asks for are marched, but what becomes of them is not told.
 *
 * @param marches of this command, `beyond_s` past the end of each run
 */
export function evaluate(
  outlook: Outlook,
  command: Command,
  marches: Marches,
  beyond_s: number,
): Evaluation {
  const course = marches.best();
  const times = [
    ...ruleTimes(course),
    ...closestFlows(course, command),
    ...startMargins(course, command),
  ].filter((q) => isAsked(command, course.episodes[q.episode] as Episode));
  const slopes = responseOf(outlook.model, marches, times);
  const response = withSteadyFlow(slopes, times, command, course);
  const covariance = covarianceOf(outlook, command, course, times, response);
  return { ...samplesOf({ course, times, covariance }, command), command, course, beyond_s };
}

/** Whether a run serves any leg: one that only comes down from before the plan does not. */
export function isAsked({ pieces }: Command, { direction, from_s, to_s }: Episode): boolean {
  return pieces.some(
    (piece) =>
      piece.leg >= 0 && piece.mode === direction && piece.from_s >= from_s && piece.to_s <= to_s,
  );
}

function samplesOf(
  spread: PlanSpread,
  command: Command,
): Omit<Evaluation, 'command' | 'course' | 'beyond_s'> {
  const { episodes } = spread.course;
  const never = (): Float64Array[] =>
    episodes.map(() => new Float64Array(NORMAL_COUNT).fill(Number.POSITIVE_INFINITY));
  const breaks_s = never();
  const stop_s = never();
  const derate_s = never();
  const rule = episodes.map(() => new Int8Array(NORMAL_COUNT).fill(-1));
  const start_W: (Float64Array | null)[] = episodes.map(() => null);
  const all = ruleSamples(spread).flatMap((values, a) => {
    const q = spread.times[a] as (typeof spread.times)[number];
    if (q.start) {
      start_W[q.episode] = values;
      return [];
    }
    return [{ e: q.episode, rule: q.rule, values, reached: q.closest_s === undefined }];
  });
  for (const { e, rule: r, values, reached } of all) {
    const own = r === FLOW ? derate_s : stop_s;
    const { held_s, times_s } = episodes[e] as Episode;
    // Broken by the best march alone: where the margin is above 0 there is no break.
    const touch =
      r === FLOW && reached && (times_s[FLOW] as number) < held_s
        ? all.find((one) => one.e === e && !one.reached)?.values
        : undefined;
    values.forEach((value, k) => {
      if (touch?.[k] === Number.POSITIVE_INFINITY) return;
      if (value < (own[e]?.[k] as number)) (own[e] as Float64Array)[k] = value;
      if (!(value < (breaks_s[e]?.[k] as number))) return;
      (breaks_s[e] as Float64Array)[k] = value;
      (rule[e] as Int8Array)[k] = r;
    });
  }
  const first_s = breaks_s.map((own, e) => {
    const margins_W = start_W[e];
    const episode = episodes[e] as Episode;
    if (!margins_W) return own;
    const below_W = toldBelow(episode.start, greatestPower(command, episode));
    return own.map((break_s, k) => {
      if (!((margins_W[k] as number) < below_W)) return break_s;
      (rule[e] as Int8Array)[k] = FLOW;
      return episode.from_s;
    });
  });
  const samples = all.filter(({ reached }) => reached);
  return { first_s, breaks_s, start_W, rule, stop_s, derate_s, samples };
}

/** Greatest power commanded in the first quarter of an hour of a run, about which `toldBelow` asks [W]. */
export function greatestPower({ pieces }: Command, { direction, from_s }: Episode): number {
  const first = pieces.filter(
    (piece) => piece.mode === direction && piece.to_s > from_s && piece.from_s < from_s + SETTLED_S,
  );
  return Math.max(0, ...first.map((p) => Math.max(Math.abs(p.power0_W), Math.abs(p.power1_W))));
}

/**
 * Probability that all runs hold their power to their end, jointly.
 *
 * @param direction only these runs; absent = all
 */
export function holding(
  episodes: readonly Episode[],
  first_s: readonly Float64Array[],
  direction?: Direction,
): number {
  const runs = episodes.flatMap((episode, e) =>
    direction === undefined || episode.direction === direction
      ? [{ held_s: episode.held_s - SAME_S, first: first_s[e] as Float64Array }]
      : [],
  );
  if (runs.length === 0) return 1;
  let held = 0;
  for (let k = 0; k < NORMAL_COUNT; k++) {
    if (runs.every(({ held_s, first }) => (first[k] as number) >= held_s)) held++;
  }
  return held / NORMAL_COUNT;
}

/**
 * Value that is exceeded with a probability, of values in any order; Infinity counts as any other.
 *
 * @param certainty 0 to 1, exclusive of 1
 */
export function exceeded(values: Float64Array, certainty: number): number {
  const sorted = values.slice().sort();
  const at = Math.floor((1 - certainty) * sorted.length);
  return sorted[Math.min(sorted.length - 1, at)] as number;
}
