import type { Mode } from '../definitions.js';
import type { ChargePoints } from './chargeAhead.js';
import type { Command } from './command.js';
import type { Course } from './course.js';
import type { Leg } from './leg.js';
import type { Outlook } from './outlook.js';
import { type ChargeRecord, chargeRecord } from './storeCharge.js';

/** Most points of the state of charge, the present included. */
export const MOST_POINTS = 200;
/** Most times at which the unit's state of charge is rolled out. */
const MOST_MARKS = 14;
/** Times written to the millisecond are the same within this [s]. */
const SAME_S = 1e-3;

/** States of charge at edges, and at the stops of runs too: marched anew where there are any. */
export function withStops(
  outlook: Outlook,
  command: Command,
  { episodes }: Course,
  edges: ChargeRecord,
  edges_s: readonly number[],
): ChargePoints {
  const isNew = (t_s: number): boolean =>
    t_s > SAME_S && edges_s.every((edge) => Math.abs(edge - t_s) > SAME_S);
  const stops = episodes.flatMap(({ stopped_s }) => (stopped_s === null ? [] : [stopped_s]));
  const more = stops.filter(isNew);
  if (more.length === 0) return { times_s: edges_s, charges: edges.charges };
  const times_s = [...edges_s, ...more].sort((a, b) => a - b);
  const record = chargeRecord(outlook.model.stores, outlook.beds().ahead.stores, times_s);
  outlook.best(command, { beyond_s: 0, each: record.each });
  return { times_s, charges: record.charges };
}

/** Begins and ends of blocks after the present [s]. */
export function edgesOf(legs: readonly Leg[]): number[] {
  const all = new Set(legs.flatMap(({ from_s, to_s }) => [from_s, to_s]));
  return [...all].filter((t_s) => t_s > 0).sort((a, b) => a - b);
}

/** Edges at which the mode changes, and the last; evenly thinned and filled up to `MOST_MARKS`. */
export function marksOf(
  edges_s: readonly number[],
  pieces: readonly { readonly from_s: number; readonly to_s: number; readonly mode: Mode }[],
): number[] {
  const modeAt = (t_s: number): Mode =>
    pieces.find((piece) => piece.from_s <= t_s && t_s < piece.to_s)?.mode ?? 'stand';
  const last = edges_s[edges_s.length - 1] as number;
  const turns = edges_s.filter((t_s) => modeAt(t_s - 1) !== modeAt(t_s + 1) || t_s === last);
  const kept = evenly(turns, MOST_MARKS);
  const others = edges_s.filter((t_s) => !kept.includes(t_s));
  const more = MOST_MARKS - kept.length;
  return [...kept, ...(more > 0 ? evenly(others, more) : [])].sort((a, b) => a - b);
}

/** At most so many of a list, evenly, the last among them. */
function evenly<T>(list: readonly T[], most: number): T[] {
  if (list.length <= most) return [...list];
  return Array.from(
    { length: most },
    (_, i) => list[Math.round(((i + 1) * list.length) / most) - 1] as T,
  );
}

/** Points of the state of charge, the first and the last among them. */
export function thinned<T>(points: readonly T[]): T[] {
  if (points.length <= MOST_POINTS) return [...points];
  return [points[0] as T, ...evenly(points.slice(1), MOST_POINTS - 1)];
}
