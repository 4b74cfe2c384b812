import type { Direction, UnitDefinition } from '../definitions.js';
import { directionOf, type Leg } from './leg.js';

/** Ends drawn in and powers scaled: the ways in which a nearest schedule differs from what was asked. */
export interface Sought {
  readonly legs: readonly Leg[];
  readonly factor: Readonly<Record<Direction, number>>;
  readonly drawn_in: readonly DrawnIn[];
}

export interface DrawnIn {
  readonly direction: Direction;
  readonly asked_s: number;
  /** Start of the run where nothing of it is left. */
  readonly end_s: number;
}

/** Where no least power is set a factor goes down to this. */
const LEAST_FACTOR = 0.01;

/** Whether what was sought keeps more of what was asked for than another. */
export function isNearer(one: Sought, other: Sought): boolean {
  return energyOf(one.legs) > energyOf(other.legs);
}

export const energyOf = (legs: readonly Leg[]): number =>
  legs.reduce((sum, { power_W, from_s, to_s }) => sum + power_W * (to_s - from_s), 0);

/** Whether legs lack more than factors and drawn ends took. */
export function tookOut(found: Sought, legs: readonly Leg[]): boolean {
  const plain = drawIn(scale(legs, found.factor), found.drawn_in);
  return energyOf(plain) - energyOf(found.legs) > 1e-9 * energyOf(plain);
}

/** Factor at which the smallest power of a direction is the least power. */
export function leastFactor(
  unit: UnitDefinition,
  legs: readonly Leg[],
  direction: Direction,
): number {
  const powers = legs.filter((leg) => directionOf(leg) === direction).map((leg) => leg.power_W);
  const least_W = unit.limits[direction].power_min_W;
  // A hair above, so that the product is not below the least power by a rounding.
  return Math.min(1, Math.max(LEAST_FACTOR, (least_W / Math.min(...powers)) * (1 + 1e-12)));
}

export function scale(legs: readonly Leg[], factor: Readonly<Record<Direction, number>>): Leg[] {
  return legs.map((leg) => {
    const direction = directionOf(leg);
    return direction === null ? leg : { ...leg, power_W: leg.power_W * factor[direction] };
  });
}

/** Runs of a direction: legs that follow each other without a break [s]. */
export function runsOf(
  legs: readonly Leg[],
  direction: Direction,
): { readonly from_s: number; readonly to_s: number }[] {
  const runs: { from_s: number; to_s: number }[] = [];
  for (const leg of legs) {
    if (directionOf(leg) !== direction) continue;
    const last = runs[runs.length - 1];
    if (last !== undefined && last.to_s === leg.from_s) last.to_s = leg.to_s;
    else runs.push({ from_s: leg.from_s, to_s: leg.to_s });
  }
  return runs;
}

/** Legs without what lies past the ends drawn in of their runs. */
export function drawIn(legs: readonly Leg[], ends: readonly DrawnIn[]): Leg[] {
  return legs.flatMap((leg) => {
    const direction = directionOf(leg);
    const end = ends.find(
      ({ direction: own, asked_s, end_s }) =>
        own === direction && leg.to_s <= asked_s && leg.to_s > end_s && sameRun(legs, leg, asked_s),
    );
    if (end === undefined) return [leg];
    return end.end_s > leg.from_s ? [{ ...leg, to_s: end.end_s }] : [];
  });
}

/** Whether a leg belongs to the run that ends then. */
function sameRun(legs: readonly Leg[], leg: Leg, end_s: number): boolean {
  const direction = directionOf(leg) as Direction;
  return runsOf(legs, direction).some(
    (run) => run.to_s === end_s && leg.from_s >= run.from_s && leg.to_s <= run.to_s,
  );
}
