/**
 * Stretches of time, each beginning at a whole multiple of its length since 1970, for which series are
 * rolled up [ms]: 10 minutes, 2 hours, a day of UTC. Each length is a multiple of the one before.
 */
export const LEVELS_MS = [600_000, 7_200_000, 86_400_000] as const;

/** A roll-up is read where a stretch asked for is so many of it: less than a third is lost in rounding. */
const LEAST_IN_ONE = 3;

/** Below the finest level stretches are whole seconds. */
const SECOND_MS = 1000;

/** Begin of the stretch of `width_ms` that a time lies in. */
export function floorTo(time_ms: number, width_ms: number): number {
  return Math.floor(time_ms / width_ms) * width_ms;
}

export function ceilTo(time_ms: number, width_ms: number): number {
  return Math.ceil(time_ms / width_ms) * width_ms;
}

/**
 * Length of the stretches in which a span gives at most `points` points, and the level to read for
 * it, -1 = rows as they were stored.
 */
export function stretchFor(
  from_ms: number,
  to_ms: number,
  points: number,
): { bucket_ms: number; level: number } {
  const span_ms = to_ms + 1 - from_ms;
  // So many whole stretches touch one more at most, but where one alone is wanted.
  const least_ms = points > 1 ? span_ms / (points - 1) : span_ms;
  const level = LEVELS_MS.findLastIndex((width_ms) => width_ms * LEAST_IN_ONE <= least_ms);
  return { bucket_ms: ceilTo(least_ms, LEVELS_MS[level] ?? SECOND_MS), level };
}
