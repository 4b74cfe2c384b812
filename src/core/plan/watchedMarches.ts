import { type BedsAhead, copyAhead } from './bedsAhead.js';
import type { Command } from './command.js';
import type { Course } from './course.js';
import type { MarchOptions } from './episode.js';
import type { Change, Outlook } from './outlook.js';
import { asFarAs } from './planner.js';
import type { Marches } from './spread.js';
import { type ChargeRecord, chargeRecord } from './storeCharge.js';

/** Marches of a plan that take down the states of charge on their way. */
export interface WatchedMarches extends Marches {
  /** At every edge, of the best march. */
  readonly edges: ChargeRecord;
  /** States of charge by mark and store of a march for gradients, which is made if it was not yet. */
  at(kind: 'march' | 'marchFine', change: Change): readonly number[][];
  /** The bare beds at every mark, nothing changed. */
  beds(): readonly BedsAhead[];
}

/**
 * @param beyond_s how far past its end each run is followed [s]
 * @param edges_s, marks_s ascending, above 0, ends of pieces of the command
 */
export function watchedMarches(
  outlook: Outlook,
  command: Command,
  beyond_s: number,
  edges_s: readonly number[],
  marks_s: readonly number[],
): WatchedMarches {
  const { model } = outlook;
  const whole = outlook.beds().ahead.stores;
  const bare = outlook.bare().ahead.stores;
  const edges = chargeRecord(model.stores, whole, edges_s);
  const marks = new Map<string, ChargeRecord>();
  const keyOf = (kind: 'march' | 'marchFine', change: Change): string =>
    `${kind} ${JSON.stringify(change)}`;
  const beds: BedsAhead[] = [];
  let further: Partial<MarchOptions> = { beyond_s };
  const watched = (kind: 'march' | 'marchFine', change: Change): Course => {
    const record = chargeRecord(model.stores, bare, marks_s);
    marks.set(keyOf(kind, change), record);
    const base = kind === 'march' && Object.keys(change).length === 0;
    const each = (t_s: number, ahead: BedsAhead): void => {
      record.each(t_s, ahead);
      if (base && t_s >= (marks_s[beds.length] ?? Number.POSITIVE_INFINITY) - 1e-3) {
        beds.push(copyAhead(ahead));
      }
    };
    return outlook[kind](command, change, { ...further, each });
  };
  const at = (kind: 'march' | 'marchFine', change: Change): readonly number[][] => {
    const key = keyOf(kind, change);
    if (!marks.has(key)) watched(kind, change);
    return (marks.get(key) as ChargeRecord).charges;
  };
  return {
    edges,
    at,
    beds: () => {
      at('march', {});
      return beds;
    },
    best: () => {
      const best = outlook.best(command, { beyond_s, each: edges.each });
      further = { beyond_s: asFarAs(best) };
      return best;
    },
    march: (change = {}) => watched('march', change),
    marchFine: (change = {}) => watched('marchFine', change),
  };
}
