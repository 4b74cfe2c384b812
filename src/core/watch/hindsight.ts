import type { RewindDifference } from '../scan/rewindRecord.js';
import type { WatchEvent } from './event.js';
import { toldTime } from './messages.js';

/**
 * What is to be told now, where scans were made again with readings that came late: what holds and was
 * not told is raised, what was told and does not hold returns. What was told of the past stays told.
 *
 * @param told what is told as raised and not as returned
 * @param standing what the state of now has raised, as it raised it in the past
 * @param time of the newest scan, ISO 8601 UTC
 * @param by what it is seen by
 */
export function hindsight(
  told: readonly WatchEvent[],
  standing: readonly WatchEvent[],
  time: string,
  by = 'readings that came late',
): WatchEvent[] {
  const ids = (events: readonly WatchEvent[]) => new Set(events.map(({ id }) => id));
  const [toldIds, standingIds] = [ids(told), ids(standing)];
  const returned = told
    .filter(({ id }) => !standingIds.has(id))
    .map((event): WatchEvent => {
      const message = `By ${by}, it does not hold now.`;
      return { ...event, transition: 'returned', time, message };
    });
  const raised = standing
    .filter(({ id }) => !toldIds.has(id))
    .map((event): WatchEvent => {
      const since = `Seen only by ${by}; holds since ${toldTime(event.time)}.`;
      return { ...event, time, message: `${event.message} ${since}` };
    });
  return [...returned, ...raised];
}

/**
 * Where what was told and what the same scans say when they are made again are not the same, in order
 * of time. The same event may lie elsewhere in its scan, whose time its newest reading gives.
 *
 * @param period_ms of the scans
 */
export function differences(
  told: readonly WatchEvent[],
  again: readonly WatchEvent[],
  period_ms: number,
): RewindDifference[] {
  const key = ({ id, transition, time }: WatchEvent) =>
    `${id} ${transition} ${Math.floor(Date.parse(time) / period_ms)}`;
  const known = (events: readonly WatchEvent[]) => new Set(events.map(key));
  const [toldKeys, againKeys] = [known(told), known(again)];
  const entry = ({ id, kind, transition, time }: WatchEvent, isTold: boolean) => {
    return { id, kind, transition, time, told: isTold };
  };
  return [
    ...told.filter((event) => !againKeys.has(key(event))).map((event) => entry(event, true)),
    ...again.filter((event) => !toldKeys.has(key(event))).map((event) => entry(event, false)),
  ].sort((a, b) => Date.parse(a.time) - Date.parse(b.time));
}
