import type { Database } from './database.js';

/** Rows of a span of time, with how they were chosen. */
export interface Chosen<T> {
  readonly rows: T[];
  /** More are stored than these. */
  readonly thinned: boolean;
  /** Usual spacing of what is given [ms]. */
  readonly every_ms: number;
}

/**
 * The rows of a unit in a span of time, oldest first; of more than `points` the last in each of so
 * many stretches of equal length. Each is looked up by its key: rows between, however large, are not
 * read, and a stretch without a row stays empty.
 *
 * @param table with a key of unit and time
 * @param column what is read besides the time, as `content`
 * @param usual_ms spacing in which rows are stored
 */
export function chooseRows(
  database: Database,
  table: 'profiles' | 'watch',
  column: 'json' | 'content',
  unit: string,
  { from_ms, to_ms }: { readonly from_ms: number; readonly to_ms: number },
  points: number,
  usual_ms: number,
): Chosen<{ time: number; content: string | Buffer }> {
  type Row = { time: number; content: string | Buffer };
  const inSpan = `FROM ${table} WHERE unit = ? AND time BETWEEN ? AND ?`;
  const many = database
    .prepare(`SELECT count(*) FROM (SELECT 1 ${inSpan} LIMIT ?)`)
    .pluck()
    .get(unit, from_ms, to_ms, points + 1) as number;
  const select = `SELECT time, ${column} AS content ${inSpan}`;
  if (many <= points) {
    const rows = database.prepare(`${select} ORDER BY time`).all(unit, from_ms, to_ms) as Row[];
    return { rows, thinned: false, every_ms: usual_ms };
  }
  const last = database.prepare(`${select} ORDER BY time DESC LIMIT 1`);
  const width_ms = (to_ms + 1 - from_ms) / points;
  const edge = (i: number) => from_ms + Math.round(i * width_ms);
  const rows = Array.from({ length: points }, (_, i) => last.get(unit, edge(i), edge(i + 1) - 1));
  return {
    rows: rows.filter((row) => row !== undefined) as Row[],
    thinned: true,
    every_ms: Math.max(usual_ms, width_ms),
  };
}
