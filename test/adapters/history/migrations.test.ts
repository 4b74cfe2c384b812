import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { JOURNAL_SCHEMA, Journal } from '../../../src/adapters/history/journal.js';
import { HISTORY_SCHEMA } from '../../../src/adapters/history/schema.js';
import { smallSite } from '../../daemon/site.js';
import { temporaryFolder } from '../../support/folders.js';

type Row = Record<string, unknown>;
/** What a history was before any of its later steps: rows of each table. */
type Content = Record<string, Row[]>;

const folder = temporaryFolder('migrations');
const store = smallSite(null).store;
let files = 0;

const tablesOf = (database: SQLite.Database) =>
  database
    .prepare("SELECT name FROM sqlite_master WHERE type = 'table' AND name NOT LIKE 'sqlite_%'")
    .pluck()
    .all() as string[];
const content = (database: SQLite.Database): Content =>
  Object.fromEntries(
    tablesOf(database).map((table) => [
      table,
      (database.prepare(`SELECT * FROM ${table}`).all() as Row[]).sort((a, b) =>
        JSON.stringify(a) < JSON.stringify(b) ? -1 : 1,
      ),
    ]),
  );

/** What a column may hold; JSON has what steps and readers look at in it. */
function columnValue(column: string, type: string): fc.Arbitrary<unknown> {
  const text = fc.string({ minLength: 1, maxLength: 8 });
  const time = fc.integer({ min: 1.6e12, max: 1.8e12 });
  const iso = time.map((ms) => new Date(ms).toISOString());
  if (column === 'id') return fc.nat(20).map((n) => `u/data_stale/s${n}`);
  if (column === 'alarm')
    return fc
      .record({ state: text, active: fc.boolean(), raised_ms: time })
      .map((one) => JSON.stringify(one));
  if (['json', 'event', 'summary'].includes(column))
    return fc
      .record({
        kind: fc.constant('data_stale'),
        time: iso,
        note: text,
        value: fc.double({ noNaN: true }),
      })
      .map((one) => JSON.stringify(one));
  if (column === 'names') return fc.array(text).map((names) => JSON.stringify(names));
  if (column === 'state')
    return fc.constantFrom('unacknowledged', 'acknowledged', 'returned_unacknowledged');
  if (column === 'transition') return fc.constantFrom('raised', 'returned');
  if (column === 'unit') return fc.constantFrom('u', 'v');
  if (column === 'name') return fc.constantFrom('influxdb', 'events to hook', 'events to mqtt');
  if (type === 'INTEGER') return ['time', 'from', 'asked'].includes(column) ? time : fc.nat(1e6);
  if (type === 'REAL') return fc.double({ noNaN: true });
  if (type === 'BLOB') return fc.uint8Array({ maxLength: 30 }).map((bytes) => Buffer.from(bytes));
  return text;
}

/** A file as the version of so many steps wrote it, with rows in all its tables. */
function older(steps: readonly string[], count: number, seed: number): string {
  const file = join(folder, `${files++}.sqlite`);
  const database = new SQLite(file);
  database.pragma('journal_mode = WAL');
  for (const step of steps.slice(0, count)) database.exec(step);
  for (const [t, table] of tablesOf(database).entries()) {
    const columns = database.pragma(`table_info(${table})`) as { name: string; type: string }[];
    const row = fc.record(
      Object.fromEntries(columns.map(({ name, type }) => [name, columnValue(name, type)])),
    );
    const names = columns.map(({ name }) => `"${name}"`);
    const insert = database.prepare(
      `INSERT OR IGNORE INTO ${table} (${names}) VALUES (${names.map(() => '?')})`,
    );
    for (const one of fc.sample(row, { numRuns: 12, seed: seed * 100 + t }))
      insert.run(...columns.map(({ name }) => one[name]));
  }
  database.pragma(`user_version = ${count}`);
  database.close();
  return file;
}

function read(file: string): { content: Content; version: number } {
  const database = new SQLite(file, { readonly: true });
  const version = Number(database.pragma('user_version', { simple: true }));
  const found = content(database);
  database.close();
  return { content: found, version };
}

const untold = (row: Row): Row => {
  if (typeof row.alarm !== 'string') return row;
  const { told: _, ...alarm } = JSON.parse(row.alarm);
  return { ...row, alarm: JSON.stringify(alarm) };
};
const sorted = (rows: readonly Row[]) => rows.map((row) => JSON.stringify(untold(row))).sort();

describe('a history of a former version', () => {
  const versions = HISTORY_SCHEMA.map((_, n) => n + 1);
  it.each(versions)('of %i steps is brought up to date, and nothing is lost', (count) => {
    for (const seed of [1, 2, 3]) {
      const file = older(HISTORY_SCHEMA, count, seed);
      const before = read(file).content;
      expect(Object.values(before).every((rows) => rows.length > 0)).toBe(true);
      const open = () => {
        const history = new History(file, store);
        history.start();
        // What readers find is what is there.
        expect(history.events.between('u', 0, 8e15, 1e6).length).toBe(
          before.events!.filter(({ unit }) => unit === 'u').length,
        );
        history.stop();
      };
      open();
      const after = read(file);
      expect(after.version).toBe(HISTORY_SCHEMA.length);
      const { standing = [], acknowledgements = [], alarm_transitions = [], ...kept } = before;
      const { tellings = [], cursors = [], ...same } = kept;
      for (const [table, rows] of Object.entries({ ...same, cursors })) {
        expect(sorted(after.content[table]!), table).toEqual(sorted(rows));
      }
      // What receivers wait for: at least what they had.
      expect(sorted(after.content.tellings!)).toEqual(expect.arrayContaining(sorted(tellings)));
      const places = cursors.filter(({ name }) => String(name).startsWith('events to'));
      if (count < 5 && places.length > 0) {
        const from = Math.min(...places.map(({ value }) => Number(value)));
        const due = before.events!.filter(({ seq }) => Number(seq) > from).map(({ seq }) => seq);
        expect(after.content.tellings!.map(({ no }) => no).sort()).toEqual(due.sort());
      }
      if (count < 3) {
        const alarms = after.content.alarms!.map(({ id, state, event }) => ({ id, state, event }));
        const stood = standing.map(({ id, state, json }) => ({ id, state, event: json }));
        expect(sorted(alarms)).toEqual(sorted(stood));
        expect(after.content.alarm_transitions!.length).toBe(
          before.events!.length + acknowledgements.length,
        );
      } else expect(sorted(after.content.alarm_transitions!)).toEqual(sorted(alarm_transitions));
      // Once is enough.
      open();
      expect(read(file).content).toEqual(after.content);
    }
  });
});

describe('a journal of a former version', () => {
  it.each(JOURNAL_SCHEMA.map((_, n) => n + 1))('of %i steps loses nothing', (count) => {
    const file = older(JOURNAL_SCHEMA, count, 1);
    const before = read(file).content;
    const journal = new Journal(file);
    journal.start();
    expect(journal.lastSeq).toBe(Math.max(...before.entries!.map(({ seq }) => Number(seq))));
    journal.stop();
    expect(read(file)).toEqual({ content: before, version: JOURNAL_SCHEMA.length });
  });
});

it('one of a newer version is refused in words and stays as it was', () => {
  const file = older(HISTORY_SCHEMA, HISTORY_SCHEMA.length, 1);
  const database = new SQLite(file);
  database.pragma(`user_version = ${HISTORY_SCHEMA.length + 1}`);
  database.close();
  const before = read(file);
  expect(() => new History(file, store).start()).toThrow(/written by a newer rockhour/);
  expect(read(file)).toEqual(before);
});
