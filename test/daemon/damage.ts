import { closeSync, openSync, writeSync } from 'node:fs';
import SQLite from 'better-sqlite3';

const PAGE = 4096;

/**
 * Overwrites the root page of tables or indices in a database that may be in use: nothing of them can be
 * read any more, all else can.
 */
export function damageTables(file: string, ...tables: string[]): void {
  const before = new SQLite(file);
  const roots = tables.map((table) =>
    before.prepare('SELECT rootpage FROM sqlite_master WHERE name = ?').pluck().get(table),
  ) as number[];
  before.pragma('wal_checkpoint(TRUNCATE)');
  before.close();
  const handle = openSync(file, 'r+');
  for (const root of roots) writeSync(handle, Buffer.alloc(PAGE, 0xee), 0, PAGE, (root - 1) * PAGE);
  closeSync(handle);
  // Whoever has the file open reads its pages anew behind another's transaction.
  const other = new SQLite(file);
  other.exec('CREATE TABLE passing_by (no INTEGER); DROP TABLE passing_by');
  other.close();
}
