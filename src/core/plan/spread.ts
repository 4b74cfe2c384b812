import type { Direction } from '../definitions.js';
import { cholesky } from '../dispatch/earliestQuantiles.js';
import { leastMargin, lidSigma } from '../dispatch/firstMinutes.js';
import { MODEL_SIGMA } from '../dispatch/hours.js';
import { addProfile, type StoreResponse } from '../dispatch/profileCovariance.js';
import { BUMP_K, BUMPS } from '../dispatch/roller.js';
import { RULES } from '../dispatch/rollout.js';
import type { EndCause } from '../estimate.js';
import { unseenSigma } from '../track/unseenFlow.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import type { Command } from './command.js';
import type { Course } from './course.js';
import type { Delivered } from './episode.js';
import { latinNormals, NORMAL_COUNT } from './latinNormals.js';
import { type Change, type Outlook, STEP_S } from './outlook.js';

/** A rule's time in a run of a plan. */
export interface RuleTime {
  /** Index of the run among the course's episodes, and of the rule in `RULES`. */
  readonly episode: number;
  readonly rule: number;
  readonly cause: EndCause;
  /** By the best march [s from the plan's start]; of a closest approach its margin [W]. */
  readonly time_s: number;
  /** When the rule is closest to breaking, or beyond it by most [s]; absent = this is a time. */
  readonly closest_s?: number;
  /** The margin is the least until the lids are swept, which breaks no rule; see `startMargins`. */
  readonly start?: boolean;
}

/** Where the rules of a plan's runs stand, and how surely: jointly Gaussian. */
export interface PlanSpread {
  readonly course: Course;
  readonly times: readonly RuleTime[];
  /** [s2], symmetric. */
  readonly covariance: readonly Float64Array[];
}

const FLOW = RULES.indexOf('flow');
/** Machine and meter are known far better than to this share of their power. */
const NEAR = 0.25;
/** The last step of a run begins before its end. */
const END_STEPS = 2;
export const PROBE_LOG = 0.01;
export const PROBE_AMBIENT_K = 2;
/** Ambient temperature over the hours ahead against that of now [K]: common practice, no source. */
export const AMBIENT_SIGMA_K = 3;

/** Marches of one command; see Outlook. */
export interface Marches {
  best(): Course;
  march(change?: Change): Course;
  marchFine(change?: Change): Course;
}

/** Slopes of every rule's time of a plan along what is uncertain. */
export interface PlanResponse {
  readonly stores: readonly StoreResponse[];
  /** [s] per ln of the work per metered kilogram. */
  readonly work: Readonly<Record<Direction, readonly number[]>>;
  /** [s/K] */
  readonly ambient: readonly number[];
}

/**
 * Times at which the stop rules of each run of a plan break, with their covariance: the gradient of
 * every time with respect to the profiles, the flow and transfer factors, the machine's work in both
 * directions and the ambient temperature, from marches with common numbers (see computeHours, whose
 * sources of uncertainty these are).
 */
export function spreadOf(outlook: Outlook, command: Command): PlanSpread {
  const marches: Marches = {
    best: () => outlook.best(command),
    march: (change) => outlook.march(command, change),
    marchFine: (change) => outlook.marchFine(command, change),
  };
  const course = marches.best();
  const times = [...ruleTimes(course), ...startMargins(course, command)];
  const response = responseOf(outlook.model, marches, times);
  return { course, times, covariance: covarianceOf(outlook, command, course, times, response) };
}

/** The rules that break within the time looked ahead. */
export function ruleTimes(course: Course): RuleTime[] {
  return course.episodes.flatMap((episode, e) =>
    RULES.flatMap((cause, rule): RuleTime[] => {
      const time_s = episode.times_s[rule] as number;
      return Number.isFinite(time_s) ? [{ episode: e, rule, cause, time_s }] : [];
    }),
  );
}

/**
 * Where runs come close to their greatest flow, or a little beyond it, at a time before their end: a
 * time of the break tells nothing then, as it may be there or not; the margin, which is smooth,
 * tells. Towards the end the margin falls with the fronts, and the time of the break is the better
 * one, where there is any.
 */
export function closestFlows(course: Course, command: Command): RuleTime[] {
  return course.episodes.flatMap((episode, e): RuleTime[] => {
    const { times_s, closest, from_s, to_s, held_s, stopped_s } = episode;
    const { margin_W, t_s } = closest;
    const before_end = Math.min(held_s, stopped_s ?? held_s) - t_s > END_STEPS * STEP_S;
    const reached = Number.isFinite(times_s[FLOW] as number);
    if (reached && !before_end) return [];
    if (!(Math.abs(margin_W) < NEAR * powerAbout(command, from_s, to_s))) return [];
    return [{ episode: e, rule: FLOW, cause: 'flow', time_s: margin_W, closest_s: t_s }];
  });
}

/**
 * Least margins of the first minutes, where they are near to 0 or below: how much is missing until the
 * lids are swept. A run whose power is not had after that either breaks the rule itself.
 */
export function startMargins(course: Course, command: Command): RuleTime[] {
  return course.episodes.flatMap((episode, e): RuleTime[] => {
    const { start, from_s, to_s } = episode;
    const last = start[start.length - 1]?.margin_W ?? -1;
    const margin_W = leastMargin(start);
    if (last < 0 || !(margin_W < NEAR * powerAbout(command, from_s, to_s))) return [];
    const own = { episode: e, rule: FLOW, cause: 'flow', time_s: margin_W } as const;
    return [{ ...own, closest_s: from_s, start: true }];
  });
}

/** Slopes of the given times, from marches that differ in one thing each. */
export function responseOf(
  model: UnitModel,
  marches: Marches,
  times: readonly RuleTime[],
): PlanResponse {
  const none = times.map(() => 0);
  if (times.length === 0) {
    const stores = model.stores.map(() => ({
      ...{ bumps: Array.from({ length: BUMPS }, () => none), flow: none, transfer: none },
    }));
    return { stores, work: { discharge: none, charge: none }, ambient: none };
  }
  const at = (of: Course, q: RuleTime): number => {
    const episode = of.episodes[q.episode];
    if (q.start && episode !== undefined) return leastMargin(episode.start);
    const value = q.closest_s === undefined ? episode?.times_s[q.rule] : episode?.closest.margin_W;
    return value as number;
  };
  const base = marches.march();
  const slope = (of: Course, from: Course, delta: number): number[] =>
    times.map((q) => {
      const change = (at(of, q) - at(from, q)) / delta;
      return Number.isFinite(change) ? change : 0;
    });
  const along = (change: Change, delta: number): number[] =>
    slope(marches.march(change), base, delta);
  const fine = marches.marchFine();
  const stores = model.stores.map((_, s) => ({
    bumps: Array.from({ length: BUMPS }, (_, bump) => along({ store: s, bump }, BUMP_K)),
    flow: along({ store: s, flow: PROBE_LOG }, PROBE_LOG),
    transfer: slope(marches.marchFine({ store: s, transfer: PROBE_LOG }), fine, PROBE_LOG),
  }));
  const runs = new Set(base.episodes.map((episode) => episode.direction));
  const work = (direction: Direction): number[] =>
    runs.has(direction) ? along({ [direction]: PROBE_LOG }, PROBE_LOG) : none;
  return {
    stores,
    work: { discharge: work('discharge'), charge: work('charge') },
    ambient: along({ ambient_K: PROBE_AMBIENT_K }, PROBE_AMBIENT_K),
  };
}

/** Covariance of the given times [s2], by their slopes. */
export function covarianceOf(
  outlook: Outlook,
  command: Command,
  course: Course,
  times: readonly RuleTime[],
  response: PlanResponse,
): Float64Array[] {
  const { model, state } = outlook;
  const covariance = times.map(() => new Float64Array(times.length));
  if (times.length === 0) return covariance;
  const { work, ambient } = response;
  const factors = model.stores.map((store, s) => {
    addUnseen(model, state, s, course, times, command, covariance);
    const own = state.stores[s] as UnitState['stores'][number];
    return addProfile(store, own, response.stores[s] as StoreResponse, covariance);
  });
  factors.push([...work.discharge], [...work.charge]);
  // A margin is the machine's, not the fronts': it has no share of the model's error in time.
  const length = (q: RuleTime): number =>
    q.closest_s === undefined ? q.time_s - (course.episodes[q.episode]?.from_s as number) : 0;
  times.forEach((a, i) => {
    times.forEach((b, j) => {
      let sum = Math.max(0, length(a)) * Math.max(0, length(b)) * MODEL_SIGMA ** 2;
      sum += (ambient[i] as number) * (ambient[j] as number) * AMBIENT_SIGMA_K ** 2;
      outlook.calibration.covariance.forEach((row, k) => {
        row.forEach((value, l) => {
          sum += (factors[k]?.[i] as number) * (factors[l]?.[j] as number) * value;
        });
      });
      if (i === j && a.start) sum += lidSigma(course.episodes[a.episode]?.start ?? []) ** 2;
      (covariance[i] as Float64Array)[j]! += sum;
    });
  });
  return covariance;
}

/** What flow that no string sees may do to a store's own rules; see computeHours. */
function addUnseen(
  model: UnitModel,
  state: UnitState,
  s: number,
  course: Course,
  times: readonly RuleTime[],
  command: Command,
  covariance: readonly Float64Array[],
): void {
  const store = model.stores[s] as UnitModel['stores'][number];
  const own = store.store.kind === 'hot' ? 'hot_outlet' : 'cold_outlet';
  const soc = unseenSigma(store, state.stores[s] as UnitState['stores'][number]);
  const { unit } = model;
  const sigma = times.map((q) => {
    if (q.closest_s !== undefined || (q.cause !== own && q.cause !== 'flow')) return 0;
    const episode = course.episodes[q.episode] as Course['episodes'][number];
    const { from_s, to_s, derated_s, stopped_s } = episode;
    const until_s = Math.min(q.time_s, to_s);
    // A derated unit takes longer than the power commanded says.
    const power =
      derated_s === null
        ? powerAbout(command, from_s, until_s)
        : meanAbout(course.delivered, from_s, Math.min(until_s, stopped_s ?? to_s));
    const lasts_s = power > 0 ? (unit.rated_hours * 3600 * unit.rated_power_W) / power : 0;
    // More charge of a store lengthens a discharge and shortens a charge.
    return (episode.direction === 'discharge' ? 1 : -1) * soc * lasts_s;
  });
  sigma.forEach((a, i) => {
    sigma.forEach((b, j) => {
      (covariance[i] as Float64Array)[j]! += a * b;
    });
  });
}

/** Mean commanded power of the running pieces between two times [W]. */
function powerAbout(command: Command, from_s: number, to_s: number): number {
  return meanAbout(
    command.pieces.filter(({ mode }) => mode !== 'stand'),
    from_s,
    to_s,
  );
}

function meanAbout(pieces: readonly Delivered[], from_s: number, to_s: number): number {
  let energy = 0;
  let time = 0;
  for (const piece of pieces) {
    const from = Math.max(from_s, piece.from_s);
    const to = Math.min(to_s, piece.to_s);
    if (!(to > from)) continue;
    energy += (Math.abs(piece.power0_W + piece.power1_W) / 2) * (to - from);
    time += to - from;
  }
  return time > 0 ? energy / time : 0;
}

/** When each run first breaks a rule, and which, at one point of the joint distribution per index. */
export interface Breaks {
  /** Per episode [s]; Infinity where nothing breaks within the time looked ahead. */
  readonly first_s: readonly Float64Array[];
  /** Index in `RULES`; -1 where nothing breaks. */
  readonly rule: readonly Int8Array[];
  /** Least margin of the first minutes [W]; null = nothing near to missing. */
  readonly start_W: readonly (Float64Array | null)[];
}

/**
 * Rules' times over fixed points of their joint distribution.
 *
 * @returns per time of `spread.times`, `NORMAL_COUNT` values [s], none before its run begins, Infinity
 *   where a closest approach breaks nothing, and of `start` the margin itself [W]; points of the same
 *   index belong together
 */
export function ruleSamples(spread: PlanSpread): Float64Array[] {
  const { times, covariance, course } = spread;
  const factor = cholesky(covariance);
  const points = latinNormals(times.length);
  return times.map((q, a) => {
    const from_s = course.episodes[q.episode]?.from_s as number;
    const own = new Float64Array(NORMAL_COUNT).fill(q.time_s);
    for (let b = 0; b <= a; b++) {
      const weight = factor[a]?.[b] as number;
      const column = points[b] as Float64Array;
      for (let k = 0; k < NORMAL_COUNT; k++) own[k]! += weight * (column[k] as number);
    }
    const { closest_s, start } = q;
    if (start) return own;
    if (closest_s !== undefined) {
      return own.map((margin_W) => (margin_W < 0 ? closest_s : Number.POSITIVE_INFINITY));
    }
    return own.map((value) => Math.max(from_s, value));
  });
}

/**
 * When each run first breaks a rule, over fixed points of the joint distribution.
 *
 * @returns per episode, `NORMAL_COUNT` times [s], Infinity where nothing breaks within the time looked
 *   ahead; points of the same index belong together
 */
export function firstBreaks(spread: PlanSpread): Float64Array[] {
  return [...breaksOf(spread).first_s];
}

/** As `firstBreaks`, with the rules. */
export function breaksOf(spread: PlanSpread): Breaks {
  const { episodes } = spread.course;
  const first_s = episodes.map(() => new Float64Array(NORMAL_COUNT).fill(Number.POSITIVE_INFINITY));
  const rule = episodes.map(() => new Int8Array(NORMAL_COUNT).fill(-1));
  const start_W: (Float64Array | null)[] = episodes.map(() => null);
  ruleSamples(spread).forEach((samples, a) => {
    const q = spread.times[a] as RuleTime;
    if (q.start) {
      start_W[q.episode] = samples;
      return;
    }
    const own = first_s[q.episode] as Float64Array;
    const which = rule[q.episode] as Int8Array;
    samples.forEach((value, k) => {
      if (!(value < (own[k] as number))) return;
      own[k] = value;
      which[k] = q.rule;
    });
  });
  return { first_s, rule, start_W };
}
