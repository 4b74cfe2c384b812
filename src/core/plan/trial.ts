import { MODEL_SIGMA } from '../dispatch/hours.js';
import type { Command } from './command.js';
import type { Course } from './course.js';
import type { Episode } from './episode.js';
import { type Evaluation, isAsked } from './evaluation.js';
import { latinNormals, NORMAL_COUNT } from './latinNormals.js';
import type { Leg } from './leg.js';
import { asFarAs, type Planner } from './planner.js';

/** A fully evaluated command, from whose spread the odds of others like it are told. */
export interface TrialBase {
  readonly evaluation: Evaluation;
  /** The same command by a march on the bare beds. */
  readonly coarse: Course;
}

/** Legs as a cheap march carries them out. */
export interface Trial {
  readonly episodes: readonly Episode[];
  /** As of an Evaluation [s]. */
  readonly first_s: readonly Float64Array[];
}

/** A run is followed so far past its end; and where the base never broke, or breaks surely [s]. */
const SIGMAS = 4;
const UNKNOWN_LOOK_S = 3600;
const LEAST_LOOK_S = 1800;
/** A run broken sooner than this tells nothing of one that lasts [s]. */
const SHORTEST_S = 60;

export function trialBase(planner: Planner, evaluation: Evaluation): TrialBase {
  const { outlook } = planner;
  return {
    evaluation,
    coarse: outlook.march(evaluation.command, {}, { beyond_s: asFarAs(evaluation.course) }),
  };
}

/**
 * When the runs of some legs break, by one march on the bare beds: each rule's time in a run is that
 * of the base's like run (same direction, most of its time in common), its time since the run's start
 * changed in the proportion in which that march changes it, which keeps what the bare beds leave out
 * in proportion. Its spread is that of the base over the run's power: as much energy is uncertain.
 */
export function trial(planner: Planner, base: TrialBase, legs: readonly Leg[]): Trial {
  const { outlook, beyond_s } = planner;
  const command = planner.command(legs);
  const { episodes } = outlook.march(
    command,
    {},
    {
      beyond_s: (from_s, held_s) => Math.min(beyond_s, lookOf(base, from_s, held_s)),
    },
  );
  const first_s = episodes.map((episode) => breaks(planner, base, command, episode));
  return { episodes, first_s };
}

/** How far past its end a run has to be followed [s]: so many sigmas of the like run of the base. */
function lookOf({ evaluation }: TrialBase, from_s: number, held_s: number): number {
  const { episodes } = evaluation.course;
  const e = episodes.findIndex((one) => one.from_s < held_s && one.held_s > from_s);
  const sigmas = evaluation.samples
    .filter((one) => one.e === e)
    .map(({ values }) => sigmaOf(values));
  return sigmas.length > 0 ? Math.max(LEAST_LOOK_S, SIGMAS * Math.max(...sigmas)) : UNKNOWN_LOOK_S;
}

/** Standard deviation. */
function sigmaOf(values: Float64Array): number {
  const mean = values.reduce((sum, v) => sum + v, 0) / values.length;
  return Math.sqrt(values.reduce((sum, v) => sum + (v - mean) ** 2, 0) / values.length);
}

function breaks(
  planner: Planner,
  base: TrialBase,
  command: Command,
  episode: Episode,
): Float64Array {
  const first = new Float64Array(NORMAL_COUNT).fill(Number.POSITIVE_INFINITY);
  if (!isAsked(command, episode)) return first;
  const e = likeOf(base, episode);
  const like = base.evaluation.course.episodes[e];
  const wider =
    like === undefined ? 1 : meanPower(base.evaluation.command, like) / meanPower(command, episode);
  episode.times_s.forEach((now_s, rule) => {
    if (!Number.isFinite(now_s)) return;
    timesOf(planner, base, episode, { e, rule, wider }).forEach((value, k) => {
      if (value < (first[k] as number)) first[k] = value;
    });
  });
  return first;
}

/** Mean power while a run holds it, ramps down aside [W]. */
function meanPower({ pieces }: Command, { direction, from_s, held_s }: Episode): number {
  let energy = 0;
  for (const piece of pieces) {
    if (piece.mode !== direction || piece.from_s < from_s || piece.to_s > held_s) continue;
    energy += (Math.abs(piece.power0_W + piece.power1_W) / 2) * (piece.to_s - piece.from_s);
  }
  return energy / (held_s - from_s);
}

/**
 * Times of one rule in a run [s], by those in the base's run `e`.
 *
 * @param like run and rule of the base, and the factor on the spread of its time
 */
function timesOf(
  planner: Planner,
  base: TrialBase,
  { times_s, from_s }: Episode,
  like: { readonly e: number; readonly rule: number; readonly wider: number },
): Float64Array {
  const { e, rule, wider } = like;
  const lasts_s = (times_s[rule] as number) - from_s;
  const was = base.coarse.episodes[e];
  const known = base.evaluation.samples.find((one) => one.e === e && one.rule === rule);
  const best_s = base.evaluation.course.episodes[e]?.times_s[rule] as number;
  const lasted_s = was === undefined ? 0 : (was.times_s[rule] as number) - was.from_s;
  if (was === undefined || known === undefined || !isLong(lasted_s)) {
    const sigma = relativeSigma(planner, base);
    const [normals] = latinNormals(1);
    return (normals as Float64Array).map((z) => from_s + lasts_s * (1 + sigma * z));
  }
  const middle_s = from_s + (best_s - was.from_s) * (lasts_s / lasted_s);
  return known.values.map((value) => Math.max(from_s, middle_s + (value - best_s) * wider));
}

const isLong = (run_s: number): boolean => run_s > SHORTEST_S && Number.isFinite(run_s);

/** Index of the base's run that has most time in common; -1 = none. */
function likeOf({ evaluation }: TrialBase, episode: Episode): number {
  let best = -1;
  let most = 0;
  evaluation.course.episodes.forEach((other, e) => {
    const common = Math.min(other.to_s, episode.to_s) - Math.max(other.from_s, episode.from_s);
    if (other.direction !== episode.direction || !(common > most)) return;
    most = common;
    best = e;
  });
  return best;
}

/** Of a rule that the base never reached: the greatest of the others, or what meter and machine leave. */
function relativeSigma({ outlook }: Planner, { evaluation }: TrialBase): number {
  const least = Math.hypot(
    MODEL_SIGMA,
    ...outlook.calibration.covariance.map((row, i) => Math.sqrt(row[i] as number)),
  );
  const others = evaluation.samples.map(({ e, values }) => {
    const mean = values.reduce((sum, v) => sum + v, 0) / values.length;
    const length_s = mean - (evaluation.course.episodes[e]?.from_s as number);
    return isLong(length_s) ? sigmaOf(values) / length_s : 0;
  });
  return Math.max(least, ...others);
}
