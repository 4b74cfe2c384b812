import type { Command } from './command.js';
import type { Course } from './course.js';
import { type Change, FINE_STEP_S, type Outlook, STEP_S } from './outlook.js';
import type { Marches } from './spread.js';

/**
 * What several plans have in common until they part: marched once with each thing changed, and gone
 * on from as often as there are ways on.
 */
export interface Trunk {
  /**
   * Marches of the whole of a plan.
   *
   * @param outlook of the way on; a gradient takes the same change before and after the parting
   * @param tail pieces from where `head` ends, on the same clock
   * @param longer steps of the tail over those at rated power
   */
  marches(outlook: Outlook, tail: Command, longer?: number): Marches;
}

/** Marches of pieces from the present on. */
export function fromNow(outlook: Outlook, head: Command): Marches {
  return {
    best: () => outlook.best(head),
    march: (change) => outlook.march(head, change),
    marchFine: (change) => outlook.marchFine(head, change),
  };
}

/** @param heads marches until the plans part, ending with a whole run or a stand; made once each */
export function createTrunk(heads: Marches): Trunk {
  const known = new Map<string, Course>();
  const once = (kind: string, march: () => Course): Course => {
    const before = known.get(kind);
    if (before !== undefined) return before;
    const made = march();
    known.set(kind, made);
    return made;
  };
  const joined = (before: Course, after: Course): Course => ({
    ...after,
    episodes: [...before.episodes, ...after.episodes],
    delivered: [...before.delivered, ...after.delivered],
  });
  return {
    marches: (own, tail, longer = 1) => {
      const on = (kind: 'march' | 'marchFine', change: Change): Course => {
        const from = once(`${kind} ${JSON.stringify(change)}`, () => heads[kind](change));
        const step_s = longer * (kind === 'march' ? STEP_S : FINE_STEP_S);
        return joined(from, own[kind](tail, change, { from, open: true, step_s }));
      };
      return {
        best: () => {
          const from = once('best', () => heads.best());
          const step_s = longer * FINE_STEP_S;
          return joined(from, own.best(tail, { from, open: true, step_s }));
        },
        march: (change = {}) => on('march', change),
        marchFine: (change = {}) => on('marchFine', change),
      };
    },
  };
}
