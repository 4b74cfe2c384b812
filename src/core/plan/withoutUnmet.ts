import type { Unmet } from './command.js';
import type { Leg } from './leg.js';
import type { Planner } from './planner.js';

/** What was taken out may make room for less: a late start that moves on, at most so often. */
const ROUNDS = 6;

/**
 * Legs without what the machine's limits, its connection or outages cannot do: powers cut to what is
 * possible, late starts begun late, the rest stood through.
 *
 * @returns `legs` themselves where everything is possible
 */
export function withoutUnmet(planner: Planner, legs: readonly Leg[]): readonly Leg[] {
  let own = legs;
  for (let n = 0; n < ROUNDS; n++) {
    const { unmet } = planner.command(own);
    if (unmet.length === 0) return own;
    own = own.flatMap((leg, index) =>
      less(
        leg,
        unmet.filter((part) => part.leg === index),
      ),
    );
  }
  return own;
}

/** A leg cut where parts of it begin or end, less what each lacks. */
function less(leg: Leg, unmet: readonly Unmet[]): Leg[] {
  if (unmet.length === 0) return [leg];
  const edges = [leg.from_s, leg.to_s, ...unmet.flatMap(({ from_s, to_s }) => [from_s, to_s])];
  const cuts = [...new Set(edges)].sort((a, b) => a - b);
  return cuts.slice(1).map((to_s, i): Leg => {
    const from_s = cuts[i] as number;
    const missing = unmet
      .filter((part) => part.from_s < to_s && part.to_s > from_s)
      .reduce((sum, part) => sum + part.missing_W, 0);
    const power_W = Math.max(0, leg.power_W - missing);
    return power_W > 0 ? { ...leg, from_s, to_s, power_W } : standing(from_s, to_s);
  });
}

function standing(from_s: number, to_s: number): Leg {
  return { mode: 'stand', power_W: 0, from_s, to_s };
}
