import type { HistoryParts } from './historyParts.js';
import { thinnedName } from './retention.js';

/**
 * Deletes what a unit has told of after a time by clocks that were ahead: estimates, hours, profiles,
 * views of the watch, runs and roll-ups; the time-series database is to forget it too. Events, alarms
 * and kept offers stay as they were told. To be called within a transaction.
 *
 * @param after_ms source time [ms]
 * @returns how many estimates went
 */
export function takeBack(
  { database, rollups, watch, rewinds }: HistoryParts,
  unit: string,
  after_ms: number,
): number {
  const newest_ms = database
    .prepare('SELECT max(time) FROM estimates WHERE unit = ? AND time > ?')
    .pluck()
    .get(unit, after_ms) as number | null;
  const remove = (table: string) =>
    database.prepare(`DELETE FROM ${table} WHERE unit = ? AND time > ?`).run(unit, after_ms)
      .changes;
  const estimates = remove('estimates');
  for (const table of ['dispatch', 'profiles', 'cycles']) remove(table);
  watch.forget(unit, after_ms + 1, Number.MAX_SAFE_INTEGER);
  watch.beginAnew(unit);
  rollups.cut(unit, after_ms + 1);
  database
    .prepare('UPDATE cursors SET value = min(value, ?) WHERE name = ?')
    .run(after_ms, thinnedName(unit));
  if (newest_ms !== null) rewinds.withdraw(unit, after_ms + 1, newest_ms, false);
  return estimates;
}
