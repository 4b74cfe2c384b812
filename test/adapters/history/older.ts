import type SQLite from 'better-sqlite3';
import { HISTORY_SCHEMA } from '../../../src/adapters/history/schema.js';

/**
 * Makes a history one of an older build: without the tables that later steps of its schema have made.
 *
 * @param steps how many steps it has, or the table that the first of the later ones makes
 */
export function makeOlder(database: SQLite.Database, steps: number | string): void {
  const kept =
    typeof steps === 'number'
      ? steps
      : HISTORY_SCHEMA.findIndex((step) => step.includes(`CREATE TABLE ${steps} `));
  for (const step of HISTORY_SCHEMA.slice(kept)) {
    for (const [, table] of step.matchAll(/CREATE TABLE (\w+)/g)) {
      database.exec(`DROP TABLE IF EXISTS ${table}`);
    }
  }
  database.pragma(`user_version = ${kept}`);
}
