import { firstMinutes } from '../dispatch/firstMinutes.js';
import type { FirstMinutes } from '../estimate.js';
import type { Episode } from './episode.js';
import { type Evaluation, greatestPower } from './evaluation.js';

/** What is missing in the first minutes of a run of an evaluated command, as a field or none. */
export function firstMinutesOf(
  { command, course, start_W }: Evaluation,
  e: number,
): { readonly first_minutes?: FirstMinutes } {
  const margins_W = start_W[e];
  if (!margins_W) return {};
  const episode = course.episodes[e] as Episode;
  const found = firstMinutes(episode.start, greatestPower(command, episode), sigmaOf(margins_W));
  return found === null ? {} : { first_minutes: found.told };
}

/** Standard deviation. */
export function sigmaOf(values: Float64Array): number {
  const mean = values.reduce((sum, v) => sum + v, 0) / values.length;
  return Math.sqrt(values.reduce((sum, v) => sum + (v - mean) ** 2, 0) / values.length);
}
