import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { readInflux } from '../../test/chain/readBack.js';
import type { ChaosSite } from './plant.js';

/** What became of what was published. Readings, then scans, then points of the unit's measurement. */
export interface Ledger {
  /** Readings that the broker acknowledged to the plant. */
  readonly in: number;
  /** Of them, those in the journal. */
  readonly journaled: number;
  /** Complete scans published. */
  readonly scans: number;
  /** Of them, those with an estimate in the history. */
  readonly committed: number;
  /** Scans with readings that rockhour itself counted as stamped ahead of its clock, and did not use. */
  readonly told: number;
  /** Estimates in the database. */
  readonly forwarded: number;
  /** Estimates that the database refused for good. */
  readonly refused: number;
  readonly lost: number;
  readonly doubled: number;
}

export const NOTHING: Ledger = {
  ...{ in: 0, journaled: 0, scans: 0, committed: 0, told: 0 },
  ...{ forwarded: 0, refused: 0, lost: 0, doubled: 0 },
};

export function addLedgers(a: Ledger, b: Ledger): Ledger {
  const keys = Object.keys(NOTHING) as (keyof Ledger)[];
  return Object.fromEntries(keys.map((key) => [key, a[key] + b[key]])) as unknown as Ledger;
}

/** What was published, and what a database refused of it. */
export interface Published {
  readonly chaos: ChaosSite;
  readonly acknowledged: number;
  readonly scans: ReadonlySet<number>;
  readonly refused: number;
  readonly databaseUrl: string;
}

/** Scans by what has become of them in the local store. */
export function countScans(chaos: ChaosSite, scans: ReadonlySet<number>) {
  const { folder } = chaos.site.store;
  const period_ms = chaos.unit.scan_period_s * 1000;
  const journal = journalCounts(folder, scans, period_ms, chaos.site.clock_tolerance_s ?? 300);
  const estimates = timesOf(join(folder, 'history.sqlite'));
  const stored = countBy(estimates.map((time) => Math.floor(time / period_ms)));
  const committed = [...scans].filter((index) => stored.has(index)).length;
  const told = [...journal.ahead].filter((index) => !stored.has(index)).length;
  return { journal, stored, committed, told };
}

/** Counts what stands in journal, history and InfluxDB, by plain SQL and InfluxQL. */
export async function ledgerOf(published: Published): Promise<Ledger> {
  const { chaos, acknowledged, scans, refused, databaseUrl } = published;
  const period_ms = chaos.unit.scan_period_s * 1000;
  const { journal, stored, committed, told } = countScans(chaos, scans);
  const points = await readInflux(databaseUrl, 'rockhour_unit', chaos.unit.id);
  const written = countBy(points.map(({ time }) => Math.floor(Number(time) / period_ms)));
  const forwarded = [...stored.keys()].filter((index) => written.has(index)).length;
  const excess = (counts: ReadonlyMap<number, number>) =>
    [...counts.values()].reduce((sum, count) => sum + count - 1, 0);
  return {
    ...{ in: acknowledged, journaled: journal.distinct, scans: scans.size, committed, told },
    ...{ forwarded, refused },
    lost:
      Math.max(0, acknowledged - journal.distinct) +
      (scans.size - committed - told) +
      (stored.size - forwarded - refused),
    doubled: journal.doubled + excess(stored) + excess(written),
  };
}

interface JournalCounts {
  readonly distinct: number;
  readonly doubled: number;
  /** Scans with a reading stamped ahead of the machine's clock by more than is believed. */
  readonly ahead: ReadonlySet<number>;
}

function journalCounts(
  folder: string,
  scans: ReadonlySet<number>,
  period_ms: number,
  tolerance_s: number,
): JournalCounts {
  return reading(join(folder, 'journal.sqlite'), (database) => {
    const rows = database
      .prepare(
        `SELECT time, count(*) AS n, max(time - arrival) AS ahead FROM entries
         WHERE quality < 9 GROUP BY source, time`,
      )
      .all() as { time: number; n: number; ahead: number }[];
    const index = (time: number) => Math.floor(time / period_ms);
    const ahead = rows.filter((row) => row.ahead > tolerance_s * 1000);
    return {
      distinct: rows.length,
      doubled: rows.reduce((sum, { n }) => sum + n - 1, 0),
      ahead: new Set(ahead.map(({ time }) => index(time)).filter((one) => scans.has(one))),
    };
  });
}

function timesOf(file: string): number[] {
  return reading(file, (database) => {
    return database.prepare('SELECT time FROM estimates').pluck().all() as number[];
  });
}

/** What the daemon still has to do; null where it is done. */
export function outstanding(chaos: ChaosSite, acknowledged: number): string | null {
  const { folder } = chaos.site.store;
  const readings = reading(join(folder, 'journal.sqlite'), (database) => {
    return database.prepare('SELECT count(*) FROM entries WHERE quality < 9').pluck().get();
  }) as number;
  if (readings < acknowledged) return `${acknowledged - readings} readings`;
  return reading(join(folder, 'history.sqlite'), (database) => {
    const [newest, cursor] = [
      'SELECT max(seq) FROM estimates',
      "SELECT max(value) FROM cursors WHERE name = 'forwarded'",
    ].map((sql) => database.prepare(sql).pluck().get() as number | null);
    const waits = (newest ?? 0) - (cursor ?? 0);
    return waits > 0 ? `${waits} entries to forward` : null;
  });
}

function reading<T>(file: string, read: (database: SQLite.Database) => T): T {
  const database = new SQLite(file, { readonly: true, timeout: 5000 });
  try {
    return read(database);
  } finally {
    database.close();
  }
}

function countBy(indices: readonly number[]): Map<number, number> {
  const counts = new Map<number, number>();
  for (const index of indices) counts.set(index, (counts.get(index) ?? 0) + 1);
  return counts;
}
