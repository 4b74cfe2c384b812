import type { Command, Unmet } from './command.js';
import type { Leg } from './leg.js';
import type { Planner } from './planner.js';

/** What was taken out may make room for less: a late start that moves on, at most so often. */
const ROUNDS = 6;
/** Times that are whole milliseconds within this are written as they are [ms]. */
const SAME_MS = 1e-3;

/**
 * Legs without what the machine's limits, its connection or outages cannot do: powers cut to what is
 * possible, late starts begun late, the rest stood through. Where the machine ramps down ahead of a
 * ceiling, the power that it ramps to is asked for from the beginning of that ramp on. New edges are
 * whole seconds where they would not be whole milliseconds, so that they can be written.
 *
 * @returns `legs` themselves where everything is possible
 */
export function withoutUnmet(planner: Planner, legs: readonly Leg[]): readonly Leg[] {
  let own = legs;
  for (let n = 0; n < ROUNDS; n++) {
    const command = planner.command(own);
    if (command.unmet.length === 0) return own;
    own = own.flatMap((leg, index) => less(leg, lacksOf(command, index)));
  }
  return own;
}

/** Part of a leg that lacks power. */
interface Lack {
  readonly from_s: number;
  readonly to_s: number;
  readonly missing_W: number;
  /** Greatest power that may be asked for then [W]. */
  readonly most_W: number;
}

function lacksOf(command: Command, index: number): Lack[] {
  return command.unmet
    .filter((part) => part.leg === index)
    .map((part) => {
      const { from_s, to_s } = part;
      const end_W = rampsTo(command, part);
      // A ramp down ahead of a ceiling begins no later than it has to, all else no sooner than it can.
      const begins_s = end_W === null ? from_s : written(from_s, Math.floor);
      const ends_s = written(to_s, Math.ceil);
      if (end_W === null) {
        const { missing_W } = part;
        return { from_s: begins_s, to_s: ends_s, missing_W, most_W: Number.POSITIVE_INFINITY };
      }
      return { from_s: begins_s, to_s: ends_s, missing_W: 0, most_W: end_W };
    });
}

/** Where a part is a ramp down ahead of a ceiling: the power it ends at [W]; null = it is none. */
function rampsTo({ pieces }: Command, { from_s, to_s }: Unmet): number | null {
  const own = pieces.filter((piece) => piece.from_s < to_s && piece.to_s > from_s);
  const first = own[0];
  const last = own[own.length - 1];
  const falls = own.every(
    ({ purpose, power0_W, power1_W }) =>
      purpose === 'ramp' && Math.abs(power1_W) < Math.abs(power0_W),
  );
  if (first === undefined || last === undefined || !falls) return null;
  return first.from_s === from_s && last.to_s === to_s ? Math.abs(last.power1_W) : null;
}

/** A time that can be written to the millisecond [s]. */
function written(t_s: number, whole: (t_s: number) => number): number {
  const ms = t_s * 1000;
  return Math.abs(ms - Math.round(ms)) < SAME_MS ? t_s : whole(t_s);
}

/** A leg cut where parts of it begin or end, less what each lacks; equal neighbours are one. */
function less(leg: Leg, lacks: readonly Lack[]): Leg[] {
  if (lacks.length === 0) return [leg];
  const inside = lacks
    .flatMap(({ from_s, to_s }) => [from_s, to_s])
    .filter((edge) => edge > leg.from_s && edge < leg.to_s);
  const cuts = [...new Set([leg.from_s, ...inside, leg.to_s])].sort((a, b) => a - b);
  const parts: Leg[] = [];
  cuts.slice(1).forEach((to_s, i) => {
    const from_s = cuts[i] as number;
    const own = lacks.filter((lack) => lack.from_s < to_s && lack.to_s > from_s);
    const missing = own.reduce((sum, lack) => sum + lack.missing_W, 0);
    const power_W = Math.max(
      0,
      Math.min(leg.power_W - missing, ...own.map(({ most_W }) => most_W)),
    );
    const last = parts[parts.length - 1];
    if (last?.power_W === power_W) parts[parts.length - 1] = { ...last, to_s };
    else if (power_W > 0) parts.push({ ...leg, from_s, to_s, power_W });
    else parts.push({ mode: 'stand', power_W: 0, from_s, to_s });
  });
  return parts;
}
