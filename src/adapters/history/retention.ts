import type { StoreConfig } from '../../config/site.js';
import { floorTo } from './buckets.js';
import type { Database } from './database.js';
import { MOST_KEPT } from './offers.js';
import type { Rollups } from './rollups.js';

const DAY_MS = 86_400_000;
/** Rows thinned or deleted for room in one go, which holds the loop for some 20 ms. */
export const PIECE = 1000;

export interface RetentionCounts {
  readonly estimates: number;
  readonly events: number;
  readonly cycles: number;
  /** Kept offer tables that were too old, too many or too large together. */
  readonly offers: number;
  /** Deleted although the time-series database had not yet taken them over. */
  readonly not_forwarded: number;
}

/**
 * Deletes what is older than the configuration keeps, and thins a piece of estimates to one (the last)
 * per `thin_to_s` once they are older than `thin_after_days`. Times are source times against `now_ms`.
 * What is still due to the time-series database is not thinned, but it does not outlive its
 * retention either: the disk must not fill because that database is gone. Roll-ups are kept as long
 * as estimates are, and are those of all rows, thinned ones included.
 * @param forwarded cursor of the forwarder, Infinity where there is none
 */
export function applyRetention(
  database: Database,
  rollups: Rollups,
  store: StoreConfig,
  now_ms: number,
  forwarded: number,
): RetentionCounts {
  return database.transaction(() => {
    const end = now_ms - store.keep_estimates_days * DAY_MS;
    const limit = Math.min(forwarded, Number.MAX_SAFE_INTEGER);
    const not_forwarded = database
      .prepare('SELECT count(*) FROM estimates WHERE time < ? AND seq > ?')
      .pluck()
      .get(end, limit) as number;
    let estimates = remove(database, 'estimates', end);
    for (const table of ['dispatch', 'profiles', 'watch', 'rewinds', 'withdrawals'])
      remove(database, table, end);
    const offers = remove(database, 'offers', end) + removeSurplusOffers(database);
    const events = remove(database, 'events', end);
    const cycles = remove(database, 'cycles', end);
    for (const table of ['alarm_transitions', 'tellings']) remove(database, table, end);
    rollups.forget(end);
    estimates += thinEstimates(database, rollups, store, now_ms, limit).rows;
    return { estimates, events, cycles, offers, not_forwarded };
  })();
}

function remove(database: Database, table: string, end_ms: number): number {
  return database.prepare(`DELETE FROM ${table} WHERE time < ?`).run(end_ms).changes;
}

/**
 * Clients may ask without end: beyond so many tables or bytes of a unit the oldest go, whatever their
 * age.
 *
 * @returns how many went
 */
export function removeSurplusOffers(database: Database, most = MOST_KEPT): number {
  const units = database.prepare('SELECT DISTINCT unit FROM offers').pluck().all() as string[];
  let removed = 0;
  for (const unit of units) {
    removed += database
      .prepare(
        `DELETE FROM offers WHERE unit = @unit AND no <= (
           SELECT max(no) FROM (
             SELECT no, row_number() OVER newest AS tables,
               sum(octet_length(content) + octet_length(summary)) OVER newest AS bytes
             FROM offers WHERE unit = @unit WINDOW newest AS (ORDER BY no DESC))
           WHERE tables > @tables OR bytes > @bytes)`,
      )
      .run({ unit, ...most }).changes;
  }
  return removed;
}

/** Younger rows stay even where the disk is nearly full [ms]. */
const KEPT_ANYHOW_MS = 7 * DAY_MS;
const SEQUENCED = ['estimates', 'dispatch'];
const OTHERS = ['profiles', 'watch', 'offers'];

/**
 * Makes room where the disk is nearly full: deletes a piece of the oldest day of pictures (profiles,
 * indicators, offers), and where none of more than a week is left, of estimates and hours. What the time-series
 * database has not yet taken over stays. Events, alarms, runs and roll-ups are small and stay as well.
 *
 * @returns rows deleted
 */
export function forgetOldest(
  database: Database,
  rollups: Rollups,
  now_ms: number,
  forwarded: number,
): number {
  const limit = Math.min(forwarded, Number.MAX_SAFE_INTEGER);
  for (const tables of [OTHERS, SEQUENCED]) {
    const oldest = tables.flatMap((table) => {
      const time = database.prepare(`SELECT min(time) FROM ${table}`).pluck().get();
      return time === null ? [] : [time as number];
    });
    if (oldest.length === 0) continue;
    const end = Math.min(Math.min(...oldest) + DAY_MS, now_ms - KEPT_ANYHOW_MS);
    if (tables === SEQUENCED && !rollups.units().every((unit) => rollups.close(unit, end)))
      continue;
    let rows = 0;
    for (const table of tables) {
      const due = tables === SEQUENCED ? ' AND seq <= @limit' : '';
      const sql = `DELETE FROM ${table} WHERE (unit, time) IN (
        SELECT unit, time FROM ${table} WHERE time < @end${due} LIMIT @most)`;
      const most = PIECE - rows;
      if (most <= 0) break;
      rows += database.prepare(sql).run({ end, most, ...(due === '' ? {} : { limit }) }).changes;
    }
    if (rows > 0) return rows;
  }
  return 0;
}

/** A piece of thinning: rows that went, and whether there may be more to thin. */
export interface Thinned {
  readonly rows: number;
  readonly more: boolean;
}

/**
 * Thins estimates that are old enough in a piece of `PIECE` rows and a stretch more at most, unit by unit, each on from
 * where it was left. A unit of which some in the piece is not forwarded, or that is still to be rolled
 * up from before, stays as it is.
 *
 * @param limit cursor of the forwarder, Infinity where there is none
 */
export function thinEstimates(
  database: Database,
  rollups: Rollups,
  store: StoreConfig,
  now_ms: number,
  limit: number,
): Thinned {
  const width_ms = Math.round(store.thin_to_s * 1000);
  const due = Math.min(limit, Number.MAX_SAFE_INTEGER);
  const end_ms = floorTo(now_ms - store.thin_after_days * DAY_MS, width_ms);
  const thinning = new Thinning(database, rollups, width_ms, due);
  let rows = 0;
  let left = PIECE;
  for (const unit of rollups.units()) {
    const done = thinning.unit(unit, end_ms, left);
    rows += done.removed;
    left -= done.looked;
    if (done.isCut || left <= 0) return { rows, more: true };
  }
  return { rows, more: false };
}

class Thinning {
  constructor(
    private readonly database: Database,
    private readonly rollups: Rollups,
    private readonly width_ms: number,
    private readonly limit: number,
  ) {}

  /** @param most rows to be looked at, to the end of the stretch of the last of them */
  unit(unit: string, end_ms: number, most: number): ThinnedUnit {
    const { database, rollups, width_ms, limit } = this;
    const from = this.one('SELECT min(time) FROM estimates WHERE unit = ? AND time >= ?', [
      ...[unit, this.reached(unit)],
    ]);
    if (from === null) return NOTHING;
    const start = floorTo(from, width_ms);
    if (start >= end_ms) return NOTHING;
    const beyond = this.one(
      'SELECT time FROM estimates WHERE unit = ? AND time >= ? ORDER BY time LIMIT 1 OFFSET ?',
      [unit, start, most],
    );
    const whole = beyond === null ? end_ms : Math.max(start + width_ms, floorTo(beyond, width_ms));
    const span = { unit, start, to: Math.min(end_ms, whole), width: width_ms, limit };
    const { looked, waiting } = database
      .prepare(
        `SELECT count(*) AS looked, total(seq > @limit) AS waiting FROM estimates
         WHERE unit = @unit AND time >= @start AND time < @to`,
      )
      .get(span) as { looked: number; waiting: number };
    if (waiting > 0) return NOTHING;
    // Their extremes outlive them: rolled up first, and where older ones still wait for it, not yet.
    if (!rollups.close(unit, span.to)) return NOTHING;
    const { changes } = database
      .prepare(
        `DELETE FROM estimates WHERE unit = @unit AND time >= @start AND time < @to AND seq NOT IN (
           SELECT seq FROM (SELECT seq, max(time) FROM estimates
             WHERE unit = @unit AND time >= @start AND time < @to
             GROUP BY CAST((time - @start) / @width AS INTEGER)))`,
      )
      .run(span);
    database
      .prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)')
      .run(thinnedName(unit), span.to);
    return { looked, removed: changes, isCut: span.to < end_ms };
  }

  /** Up to when a unit is thinned [ms]; an older version had one time for all units. */
  private reached(unit: string): number {
    const sql = 'SELECT value FROM cursors WHERE name = ?';
    const known = this.one(sql, [thinnedName(unit)]) ?? this.one(sql, ['thinned']);
    return known ?? Number.MIN_SAFE_INTEGER;
  }

  private one(sql: string, values: readonly (string | number)[]): number | null {
    return (this.database.prepare(sql).pluck().get(values) as number | null | undefined) ?? null;
  }
}

interface ThinnedUnit {
  readonly looked: number;
  readonly removed: number;
  /** There is more of it. */
  readonly isCut: boolean;
}

const NOTHING: ThinnedUnit = { looked: 0, removed: 0, isCut: false };

/** Name of the cursor up to which a unit is thinned. */
export const thinnedName = (unit: string) => `thinned ${unit}`;
