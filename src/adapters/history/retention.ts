import type { StoreConfig } from '../../config/site.js';
import type { Database } from './database.js';
import { MOST_KEPT } from './offers.js';
import type { Rollups } from './rollups.js';

const DAY_MS = 86_400_000;
/** Most source time thinned in one go [ms]: a day of 30 s scans takes some 20 ms. */
const STEP_MS = DAY_MS;

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
 * Deletes what is older than the configuration keeps, and thins estimates to one (the last) per
 * `thin_to_s` once they are older than `thin_after_days`. Times are source times against `now_ms`.
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
    estimates += thinEstimates(database, rollups, store, now_ms, limit);
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
 * Makes room where the disk is nearly full: deletes the oldest day of pictures (profiles, indicators,
 * offers), and where none of more than a week is left, of estimates and hours. What the time-series
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
      const sql = `DELETE FROM ${table} WHERE time < @end${due}`;
      rows += database.prepare(sql).run({ end, ...(due === '' ? {} : { limit }) }).changes;
    }
    if (rows > 0) return rows;
  }
  return 0;
}

/** Thins estimates of a day that is old enough, unless some of it is not forwarded; rows that went. */
export function thinEstimates(
  database: Database,
  rollups: Rollups,
  store: StoreConfig,
  now_ms: number,
  limit: number,
): number {
  const width_ms = Math.round(store.thin_to_s * 1000);
  const due = Math.min(limit, Number.MAX_SAFE_INTEGER);
  const wanted = now_ms - store.thin_after_days * DAY_MS;
  const end = Math.floor(wanted / width_ms) * width_ms;
  const reached = database.prepare("SELECT value FROM cursors WHERE name = 'thinned'").pluck();
  const oldest = database.prepare('SELECT min(time) FROM estimates').pluck();
  const from = (reached.get() as number | undefined) ?? (oldest.get() as number | null);
  if (from === null) return 0;
  const start = Math.floor(from / width_ms) * width_ms;
  const to = Math.min(end, start + Math.max(width_ms, Math.floor(STEP_MS / width_ms) * width_ms));
  if (to <= start) return 0;
  const span = { start, to, width: width_ms, limit: due };
  const waiting = database
    .prepare('SELECT 1 FROM estimates WHERE time >= @start AND time < @to AND seq > @limit')
    .get(span);
  if (waiting) return 0;
  // Their extremes outlive them: rolled up first, and where older ones still wait for it, not yet.
  if (!rollups.units().every((unit) => rollups.close(unit, to))) return 0;
  const { changes } = database
    .prepare(
      `DELETE FROM estimates WHERE time >= @start AND time < @to AND seq NOT IN (
         SELECT seq FROM (SELECT seq, max(time) FROM estimates WHERE time >= @start AND time < @to
           GROUP BY unit, CAST((time - @start) / @width AS INTEGER)))`,
    )
    .run(span);
  database.prepare("INSERT OR REPLACE INTO cursors (name, value) VALUES ('thinned', ?)").run(to);
  return changes;
}
