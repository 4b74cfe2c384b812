import { startCondition } from './condition.js';
import type { WatchState } from './watch.js';

/**
 * Makes conditions of a watch that was put back to an older state what has been told since: what
 * stands is raised, so that it returns by its own evidence; what has returned is not, so that it is
 * raised anew where it holds. Without this an alarm raised since that state would stand for ever, and
 * one that returned would never be raised again.
 *
 * @param state changed in place
 * @param standing `KIND/SUBJECT` of all that was told as raised and not as returned
 */
export function alignWatch(state: WatchState, standing: ReadonlySet<string>): void {
  for (const [key, { raised }] of Object.entries(state.conditions)) {
    if (raised && !standing.has(key)) delete state.conditions[key];
  }
  for (const key of standing) {
    if (state.conditions[key]?.raised) continue;
    state.conditions[key] = { ...startCondition(), raised: true };
  }
}
