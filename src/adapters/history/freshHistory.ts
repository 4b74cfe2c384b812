import type { Database } from './database.js';
import { openDatabase } from './database.js';
import { HISTORY_SCHEMA } from './schema.js';
import { countOn, moveAside, type Salvaged, takeOverRows } from './setAside.js';

const ROW = { key: 'rowid', most: Number.MAX_SAFE_INTEGER } as const;
/** What is taken over of a damaged history: all that cannot be made again, and is small. */
const TAKEN_OVER: readonly Salvaged[] = [
  { table: 'cursors', key: ['name'] },
  { table: 'alarms', key: ['id'] },
  { table: 'late_readings', key: ['unit', 'time', 'seq'] },
  ...[
    ...['checkpoints', 'rewind_points', 'alarm_transitions', 'events', 'cycles'],
    ...['offers', 'tellings', 'rewinds', 'withdrawals'],
  ].map((table) => ({ table, ...ROW })),
  // What was told of hours; months of them stay in the old file.
  { table: 'dispatch', key: 'rowid', most: 10_000 },
];

/**
 * Sets a damaged history aside and makes a fresh one in its place, with what could be taken over.
 * @param note what else is written in the same transaction
 */
export function freshHistory(
  file: string,
  note: (fresh: Database) => void,
): { fresh: Database; kept: string; rows: number } {
  const kept = moveAside(file);
  const fresh = openDatabase(file, 'normal', HISTORY_SCHEMA);
  const rows = fresh.transaction(() => {
    const taken = takeOverRows(kept, fresh, TAKEN_OVER);
    // A receiver that has been told up to a number is told what has a greater one.
    const told = fresh.prepare("SELECT max(value) FROM cursors WHERE name LIKE 'events to %'");
    countOn(kept, fresh, 'tellings', (told.pluck().get() as number | null) ?? 0);
    for (const table of ['offers', 'rewinds']) countOn(kept, fresh, table);
    note(fresh);
    return taken;
  })();
  return { fresh, kept, rows };
}
