import { MODEL_SIGMA } from '../dispatch/hours.js';
import type { Course } from './course.js';
import type { Episode } from './episode.js';
import type { Evaluation } from './evaluation.js';
import { latinNormals, NORMAL_COUNT } from './latinNormals.js';
import type { Leg } from './leg.js';
import type { Planner } from './planner.js';

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

/** A run broken sooner than this tells nothing of one that lasts [s]. */
const SHORTEST_S = 60;

export function trialBase(planner: Planner, evaluation: Evaluation): TrialBase {
  const { outlook, beyond_s } = planner;
  return { evaluation, coarse: outlook.march(evaluation.command, {}, { beyond_s }) };
}

/**
 * When the runs of some legs break, by one march on the bare beds: a run breaks as the like run of
 * the base does (same direction, most of its time in common), its time since the run's start changed
 * in the proportion in which that march changes it. So the base's errors, its spread and what the
 * bare beds leave out are kept in proportion.
 */
export function trial(planner: Planner, base: TrialBase, legs: readonly Leg[]): Trial {
  const { outlook, beyond_s } = planner;
  const { episodes } = outlook.march(planner.command(legs), {}, { beyond_s });
  return { episodes, first_s: episodes.map((episode) => breaks(planner, base, episode)) };
}

function breaks(planner: Planner, base: TrialBase, episode: Episode): Float64Array {
  const { first_s: now_s, from_s } = episode;
  const never = new Float64Array(NORMAL_COUNT).fill(Number.POSITIVE_INFINITY);
  if (!Number.isFinite(now_s)) return never;
  const e = likeOf(base, episode);
  const was = base.coarse.episodes[e];
  const spread = base.evaluation.first_s[e];
  const length_s = (was?.first_s ?? Number.NaN) - (was?.from_s ?? 0);
  if (
    was === undefined ||
    spread === undefined ||
    !(length_s > SHORTEST_S && length_s < Infinity)
  ) {
    const sigma = relativeSigma(planner, base);
    const [normals] = latinNormals(1);
    return (normals as Float64Array).map((z) => from_s + (now_s - from_s) * (1 + sigma * z));
  }
  const ratio = (now_s - from_s) / length_s;
  return spread.map((value) => from_s + (value - was.from_s) * ratio);
}

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

/** Of a run whose like never broke: the greatest of the others, or what meter and machine leave. */
function relativeSigma({ outlook }: Planner, { evaluation }: TrialBase): number {
  const least = Math.hypot(
    MODEL_SIGMA,
    ...outlook.calibration.covariance.map((row, i) => Math.sqrt(row[i] as number)),
  );
  const others = evaluation.course.episodes.map((episode, e) => {
    const values = evaluation.first_s[e] as Float64Array;
    if (!values.every(Number.isFinite)) return 0;
    const mean = values.reduce((sum, v) => sum + v, 0) / values.length;
    const variance = values.reduce((sum, v) => sum + (v - mean) ** 2, 0) / values.length;
    const length = mean - episode.from_s;
    return length > SHORTEST_S ? Math.sqrt(variance) / length : 0;
  });
  return Math.max(least, ...others);
}
