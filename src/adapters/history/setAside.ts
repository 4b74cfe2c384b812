import { closeSync, existsSync, openSync, readSync, renameSync, statSync } from 'node:fs';
import SQLite from 'better-sqlite3';
import type { Database } from './database.js';

/** Damage that no further try mends: SQLite's own words for it. */
const DAMAGE = /^SQLITE_(CORRUPT|NOTADB)/;
/** How far a file is looked at to tell whose it is [bytes]. */
const LOOK_BYTES = 1 << 20;
const PAGE_BYTES = 4096;
/** First bytes of the pages of a b-tree: inner and leaf pages of indices and tables. */
const PAGE_KINDS = new Set([2, 5, 10, 13]);
/** Rows taken over at a time: a damaged page costs no more than these. */
const ROWS = 256;

/** What was done about a damaged file. */
export interface SetAside {
  /** Where it lies now. */
  readonly kept: string;
  /** What SQLite said. */
  readonly reason: string;
  /** Rows taken over from it. */
  readonly rows: number;
  /** Rows that are known to have been in it and are lost; absent where that cannot be told. */
  readonly lost?: number;
}

export function isDamage(thrown: unknown): boolean {
  if (typeof thrown !== 'object' || thrown === null) return false;
  const { code, cause } = thrown as { code?: unknown; cause?: unknown };
  return (
    (typeof code === 'string' && DAMAGE.test(code)) || (cause !== undefined && isDamage(cause))
  );
}

/**
 * Whether a file that SQLite cannot read was a database of this program: it still holds the text that
 * makes one of its tables, or at least half of its whole pages are such as SQLite writes. What somebody
 * else put there is neither.
 */
export function wasOurs(file: string, table: string): boolean {
  return [file, `${file}-wal`].some((one) => {
    const bytes = headOf(one);
    if (bytes.includes(`CREATE TABLE ${table} (`)) return true;
    if (one !== file || statSync(file).size % PAGE_BYTES !== 0) return false;
    let [pages, sound] = [0, 0];
    for (let at = PAGE_BYTES; at + PAGE_BYTES <= bytes.length; at += PAGE_BYTES) {
      pages++;
      // Of a page of a b-tree the place where its content begins lies within it.
      const begin = bytes.readUInt16BE(at + 5);
      if (PAGE_KINDS.has(bytes[at]!) && begin > 0 && begin <= PAGE_BYTES) sound++;
    }
    return pages > 0 && sound * 2 >= pages;
  });
}

function headOf(file: string): Buffer {
  if (!existsSync(file)) return Buffer.alloc(0);
  const handle = openSync(file, 'r');
  try {
    const bytes = Buffer.alloc(LOOK_BYTES);
    return bytes.subarray(0, readSync(handle, bytes, 0, LOOK_BYTES, 0));
  } finally {
    closeSync(handle);
  }
}

/** Renames a database and what belongs to it, to a name with the time; gives that name. */
export function moveAside(file: string, now = new Date()): string {
  const stamp = now.toISOString().replace(/[:.]/g, '-');
  let kept = `${file}.damaged-${stamp}`;
  for (let n = 2; existsSync(kept); n++) kept = `${file}.damaged-${stamp}-${n}`;
  for (const end of ['', '-wal', '-shm']) {
    if (existsSync(file + end)) renameSync(file + end, kept + end);
  }
  return kept;
}

/**
 * A table to take over, its whole-number key, and at most how many of its newest numbers; one without
 * such a key is walked through from both its ends.
 */
export type Salvaged =
  | { readonly table: string; readonly key: string; readonly most: number }
  | { readonly table: string; readonly key: readonly string[] };

/**
 * Copies what can still be read of a damaged database into a fresh one, in pieces of a few rows: one that
 * cannot be read is left out. Rows that are in the fresh one already stay as they are.
 *
 * @returns rows taken over
 */
export function takeOverRows(kept: string, fresh: Database, tables: readonly Salvaged[]): number {
  let damaged: Database | null = null;
  try {
    damaged = openKept(kept);
    let rows = 0;
    for (const one of tables) rows += takeOverTable(damaged, fresh, one);
    return rows;
  } catch {
    // Nothing at all can be read: it begins anew.
    return 0;
  } finally {
    damaged?.close();
  }
}

/** To read alone, unless its write-ahead log has to be worked in first. */
function openKept(kept: string): Database {
  try {
    return new SQLite(kept, { readonly: true });
  } catch {
    return new SQLite(kept);
  }
}

function takeOverTable(damaged: Database, fresh: Database, salvaged: Salvaged): number {
  const { table } = salvaged;
  const columns = fresh.pragma(`table_info(${table})`) as { name: string; type: string }[];
  const names = columns.map(({ name }) => `"${name}"`).join(', ');
  const insert = fresh.prepare(
    `INSERT OR IGNORE INTO ${table} (${names}) VALUES (${columns.map(() => '?').join(', ')})`,
  );
  const fits = (row: unknown[]) =>
    row.every((value, i) => columns[i]!.type !== 'INTEGER' || isWhole(value));
  let rows = 0;
  const take = (row: unknown[]) => {
    if (!fits(row)) return;
    try {
      rows += insert.run(...row).changes;
    } catch {
      // A row whose bytes are garbage fits no table.
    }
  };
  try {
    if ('most' in salvaged) walkByNumber(damaged, salvaged, names, take);
    else walkFromBothEnds(damaged, salvaged, names, take);
  } catch {
    // Nothing more of this table.
  }
  return rows;
}

/** Columns of whole numbers may be empty where the table lets them be. */
function isWhole(value: unknown): boolean {
  return value === null || Number.isSafeInteger(value);
}

function walkByNumber(
  damaged: Database,
  { table, key, most }: Extract<Salvaged, { most: number }>,
  names: string,
  take: (row: unknown[]) => void,
): void {
  // Each by itself is a look at one end of the table; both in one would read all of it.
  const [least, last] = ['min', 'max'].map(
    (end) => damaged.prepare(`SELECT ${end}(${key}) FROM ${table}`).pluck().get() as number | null,
  ) as [number | null, number | null];
  if (least === null || last === null) return;
  const piece = damaged
    .prepare(`SELECT ${names} FROM ${table} WHERE ${key} > ? AND ${key} <= ? ORDER BY ${key}`)
    .raw();
  const next = damaged.prepare(`SELECT min(${key}) FROM ${table} WHERE ${key} > ?`).pluck();
  for (let at = Math.max(least, last - most + 1) - 1; at < last; ) {
    try {
      for (const row of piece.all(at, at + ROWS) as unknown[][]) take(row);
    } catch {
      // Left out.
    }
    at += ROWS;
    try {
      // Numbers may have been left out.
      at = Math.max(at, ((next.get(at) as number | null) ?? last) - 1);
    } catch {
      // Goes on piece by piece.
    }
  }
}

/** What lies between two damaged pages is left out. */
function walkFromBothEnds(
  damaged: Database,
  { table, key }: Extract<Salvaged, { key: readonly string[] }>,
  names: string,
  take: (row: unknown[]) => void,
): void {
  for (const way of ['ASC', 'DESC']) {
    const order = key.map((name) => `"${name}" ${way}`).join(', ');
    try {
      const rows = damaged.prepare(`SELECT ${names} FROM ${table} ORDER BY ${order}`).raw();
      for (const row of rows.iterate() as IterableIterator<unknown[]>) take(row);
      return;
    } catch {
      // From the other end.
    }
  }
}

/** Numbers that were given out are never given out again: those of a damaged database count on. */
export function countOn(kept: string, fresh: Database, table: string, least = 0): void {
  let newest = least;
  try {
    const damaged = openKept(kept);
    try {
      const found = damaged.prepare('SELECT seq FROM sqlite_sequence WHERE name = ?').pluck();
      const seq = found.get(table);
      if (Number.isSafeInteger(seq)) newest = Math.max(newest, seq as number);
    } finally {
      damaged.close();
    }
  } catch {
    // What can be told from elsewhere has to do.
  }
  const now = fresh.prepare('SELECT seq FROM sqlite_sequence WHERE name = ?').pluck().get(table);
  if (now === undefined)
    fresh.prepare('INSERT INTO sqlite_sequence (name, seq) VALUES (?, ?)').run(table, newest);
  else if (newest > (now as number))
    fresh.prepare('UPDATE sqlite_sequence SET seq = ? WHERE name = ?').run(newest, table);
}
