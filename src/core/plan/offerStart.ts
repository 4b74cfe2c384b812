import { lackBetween, leastMargin, type StartMargin, toldBelow } from '../dispatch/firstMinutes.js';
import type { MissingAtFirst } from './offerFigures.js';

/**
 * What is missing in the first minutes of an offered run, over the points of the joint distribution: at
 * each the margins of the best march, moved to that point's least one.
 *
 * @param margins of the best march, see `Episode.start`
 * @param least_W least margin at each point [W]
 */
export function missingAtFirst(
  margins: readonly StartMargin[],
  least_W: Float64Array,
  power_W: number,
): MissingAtFirst {
  const least = leastMargin(margins);
  const told_W = toldBelow(margins, power_W);
  const ends_s = margins.map(({ t_s }) => t_s);
  const means = ends_s.map(() => 0);
  for (const own of least_W) {
    if (own >= 0) continue;
    let sum = 0;
    for (let i = 1; i < ends_s.length; i++) {
      sum += lackBetween(margins, own - least, ends_s[i - 1] as number, ends_s[i] as number);
      means[i]! += sum / least_W.length;
    }
  }
  const until_s = ends_s[ends_s.length - 1] ?? 0;
  return {
    until_s,
    counts: Uint8Array.from(least_W, (own) => (own < told_W ? 1 : 0)),
    mean_J: (after_s) => {
      const i = ends_s.findIndex((t_s) => t_s >= after_s);
      if (i < 0) return means[means.length - 1] ?? 0;
      if (i === 0) return 0;
      const [from, to] = [ends_s[i - 1] as number, ends_s[i] as number];
      const [low, high] = [means[i - 1] as number, means[i] as number];
      return low + ((high - low) * (after_s - from)) / (to - from);
    },
  };
}
