import type { Statement } from 'better-sqlite3';
import {
  addToBucket,
  type Bucket,
  emptyBucket,
  type Picked,
  packBucket,
  pickFromBucket,
  unpackBucket,
} from './bucket.js';
import { ceilTo, floorTo, LEVELS_MS } from './buckets.js';
import type { Database } from './database.js';
import type { Layouts } from './layouts.js';
import { partOf, type SeriesPart } from './thin.js';

/** A part with the number of its layout. */
interface NumberedPart extends SeriesPart {
  readonly layout: number;
}

/** From when to when the series of a unit are rolled up: `from` is the begin of a day of UTC [ms]. */
interface Rolled {
  readonly from: number;
  readonly to: number;
}

/** The level of rows as they were stored. */
export const STORED = -1;

const TABLES = ['rollup_10min', 'rollup_2h', 'rollup_1d'] as const;
const DAY_MS = LEVELS_MS[2];
const FINEST_MS = LEVELS_MS[0];

/**
 * Series of estimates rolled up over stretches of time: count, mean, least and greatest of each series
 * in rows of one layout. A stretch is rolled up from its rows once it is over, a level from the one
 * below it. What comes late is taken into its stretches as it comes, so that they stay those of all
 * rows there ever were, be rows thinned since or not. Older rows are rolled up from the newest back,
 * a day at a time (`fillBack`). To be called within the transaction that writes the rows.
 */
export class Rollups {
  private readonly selectRolled: Statement;

  constructor(
    private readonly database: Database,
    private readonly layouts: Layouts,
  ) {
    this.selectRolled = database.prepare('SELECT "from", "to" FROM rolled_up WHERE unit = ?');
  }

  /** After a row that is new was entered. */
  added(unit: string, layout: number, time_ms: number, values: ArrayLike<number>): void {
    const { from, to } = this.rolled(unit) ?? this.begin(unit);
    const open = floorTo(time_ms, FINEST_MS);
    if (open > to) this.advance(unit, { from, to }, open);
    else if (time_ms >= from && time_ms < to) this.late(unit, to, layout, time_ms, values);
  }

  /** Rolls up all rows before a time, as before they are thinned; false where older ones still wait. */
  close(unit: string, end_ms: number): boolean {
    const span = this.rolled(unit) ?? this.begin(unit);
    const end = ceilTo(end_ms, FINEST_MS);
    if (span.to < end) this.advance(unit, span, end);
    return !this.hasRows(unit, span.from);
  }

  /**
   * Rolls up one more day of rows from before the first stretch, where there are any.
   *
   * @returns false where nothing is left to be done
   */
  fillBack(): boolean {
    for (const unit of this.units()) {
      const { from, to } = this.rolled(unit) ?? this.begin(unit);
      const newest = this.database
        .prepare('SELECT max(time) FROM estimates WHERE unit = ? AND time < ?')
        .pluck()
        .get(unit, from) as number | null;
      if (newest === null) continue;
      const day = floorTo(newest, DAY_MS);
      this.roll(unit, day, day + DAY_MS);
      this.set(unit, { from: day, to });
      return true;
    }
    return false;
  }

  /** Rolls up a span again in which rows were rewritten, as far as it is rolled up; none may be thinned. */
  redo(unit: string, from_ms: number, end_ms: number): void {
    const rolled = this.rolled(unit);
    if (rolled === null) return;
    const start = Math.max(from_ms, rolled.from);
    LEVELS_MS.forEach((width_ms, level) => {
      const first = floorTo(start, width_ms);
      const last = floorTo(Math.min(ceilTo(end_ms, width_ms), rolled.to), width_ms);
      if (first >= last) return;
      // Rows of a former layout may have gone.
      this.database
        .prepare(`DELETE FROM ${TABLES[level]} WHERE unit = ? AND time >= ? AND time < ?`)
        .run(unit, first, last);
      this.rollLevel(unit, level, first, last);
    });
  }

  /** Forgets what is rolled up of a time and after, where rows are gone; what comes is rolled up from there. */
  cut(unit: string, from_ms: number): void {
    const rolled = this.rolled(unit);
    if (rolled === null) return;
    LEVELS_MS.forEach((width_ms, level) => {
      this.database
        .prepare(`DELETE FROM ${TABLES[level]} WHERE unit = ? AND time >= ?`)
        .run(unit, floorTo(from_ms, width_ms));
    });
    const to = Math.min(rolled.to, floorTo(from_ms, FINEST_MS));
    if (rolled.from <= to) this.set(unit, { from: rolled.from, to });
    else this.database.prepare('DELETE FROM rolled_up WHERE unit = ?').run(unit);
  }

  /** Units that have estimates. */
  units(): string[] {
    // One look-up per unit: DISTINCT would walk through every row.
    return this.database
      .prepare(
        `WITH RECURSIVE found (unit) AS (
           SELECT min(unit) FROM estimates UNION ALL
           SELECT (SELECT min(unit) FROM estimates WHERE unit > found.unit) FROM found
           WHERE found.unit IS NOT NULL)
         SELECT unit FROM found WHERE unit IS NOT NULL`,
      )
      .pluck()
      .all() as string[];
  }

  /** Deletes stretches that end before a time. */
  forget(end_ms: number): void {
    LEVELS_MS.forEach((width_ms, level) => {
      this.database.prepare(`DELETE FROM ${TABLES[level]} WHERE time <= ?`).run(end_ms - width_ms);
    });
  }

  /**
   * What a unit has in a span of time, oldest first: stretches of a level where they lie whole within
   * the span and are rolled up, finer ones and rows before and after.
   *
   * @param level -1 = rows as they were stored
   * @param end_ms exclusive
   * @param wanted series that are needed, null: all; a part may have others too
   */
  *parts(
    unit: string,
    from_ms: number,
    end_ms: number,
    level: number,
    wanted: ReadonlySet<string> | null = null,
  ): IterableIterator<SeriesPart> {
    const rolled = level < 0 ? null : this.rolled(unit);
    const width_ms = LEVELS_MS[level];
    if (rolled === null || width_ms === undefined) {
      yield* this.rows(unit, from_ms, end_ms);
      return;
    }
    const first = Math.max(ceilTo(from_ms, width_ms), rolled.from);
    const last = floorTo(Math.min(end_ms, rolled.to), width_ms);
    if (first >= last) {
      yield* this.parts(unit, from_ms, end_ms, level - 1, wanted);
      return;
    }
    if (from_ms < first) yield* this.parts(unit, from_ms, first, level - 1, wanted);
    yield* this.stretches(unit, first, last, level, wanted);
    if (last < end_ms) yield* this.parts(unit, last, end_ms, level - 1, wanted);
  }

  private rolled(unit: string): Rolled | null {
    return (this.selectRolled.get(unit) as Rolled | undefined) ?? null;
  }

  private set(unit: string, { from, to }: Rolled): void {
    this.database
      .prepare('INSERT OR REPLACE INTO rolled_up (unit, "from", "to") VALUES (?, ?, ?)')
      .run(unit, from, to);
  }

  /** A unit that is rolled up from the day of its newest row on. */
  private begin(unit: string): Rolled {
    const newest = this.database
      .prepare('SELECT max(time) FROM estimates WHERE unit = ?')
      .pluck()
      .get(unit) as number | null;
    const day = floorTo(newest ?? 0, DAY_MS);
    const rolled = { from: day, to: day };
    if (newest !== null) this.set(unit, rolled);
    return rolled;
  }

  private hasRows(unit: string, before_ms: number): boolean {
    const row = this.database
      .prepare('SELECT 1 FROM estimates WHERE unit = ? AND time < ? LIMIT 1')
      .get(unit, before_ms);
    return row !== undefined;
  }

  private advance(unit: string, { from, to }: Rolled, end: number): void {
    this.roll(unit, to, end);
    this.set(unit, { from, to: end });
  }

  /** Rolls up all levels whose stretches come to their end after `start` and up to `end`. */
  private roll(unit: string, start: number, end: number): void {
    LEVELS_MS.forEach((width_ms, level) => {
      const [first, last] = [floorTo(start, width_ms), floorTo(end, width_ms)];
      if (first < last) this.rollLevel(unit, level, first, last);
    });
  }

  /** Rolls up the stretches of one level in a span of whole stretches. */
  private rollLevel(unit: string, level: number, first: number, last: number): void {
    const parts =
      level === 0 ? this.rows(unit, first, last) : this.stretches(unit, first, last, level - 1);
    // Written once all are read: no statement is open on the table meanwhile.
    for (const one of [...gather(parts, LEVELS_MS[level]!)]) this.enter(unit, level, one);
  }

  private late(
    unit: string,
    to: number,
    layout: number,
    time_ms: number,
    values: ArrayLike<number>,
  ): void {
    const row = partOf(time_ms, this.layouts.of(layout), values);
    LEVELS_MS.forEach((width_ms, level) => {
      const start = floorTo(time_ms, width_ms);
      if (start + width_ms > to) return;
      const bucket = emptyBucket(row.names.length);
      for (const known of this.stretches(unit, start, start + width_ms, level)) {
        if (known.layout === layout) addToBucket(bucket, known);
      }
      addToBucket(bucket, row);
      this.enter(unit, level, { start, layout, bucket });
    });
  }

  private enter(unit: string, level: number, { start, layout, bucket }: Gathered): void {
    this.database
      .prepare(
        `INSERT OR REPLACE INTO ${TABLES[level]} (unit, time, layout, last, content)
         VALUES (?, ?, ?, ?, ?)`,
      )
      .run(unit, start, layout, bucket.last_ms, packBucket(bucket));
  }

  private *rows(unit: string, from_ms: number, end_ms: number): IterableIterator<NumberedPart> {
    const rows = this.database
      .prepare(
        `SELECT time, layout, series FROM estimates WHERE unit = ? AND time >= ? AND time < ?
         ORDER BY time`,
      )
      .iterate(unit, from_ms, end_ms) as IterableIterator<StoredRow>;
    for (const { time, layout, series } of rows) {
      yield { ...partOf(time, this.layouts.of(layout), valuesOf(series)), layout };
    }
  }

  private *stretches(
    unit: string,
    from_ms: number,
    end_ms: number,
    level: number,
    wanted: ReadonlySet<string> | null = null,
  ): IterableIterator<NumberedPart> {
    const picked = new Map<number, Picked>();
    const rows = this.database
      .prepare(
        `SELECT layout, last, content FROM ${TABLES[level]}
         WHERE unit = ? AND time >= ? AND time < ? ORDER BY time, last`,
      )
      .iterate(unit, from_ms, end_ms) as IterableIterator<StoredBucket>;
    for (const { layout, last, content } of rows) {
      if (wanted === null) {
        yield { ...unpackBucket(last, this.layouts.of(layout), content), layout };
        continue;
      }
      const own = picked.get(layout) ?? pick(this.layouts.of(layout), wanted);
      picked.set(layout, own);
      yield { ...pickFromBucket(last, own, content), layout };
    }
  }
}

interface StoredRow {
  time: number;
  layout: number;
  series: Buffer;
}

interface StoredBucket {
  layout: number;
  last: number;
  content: Buffer;
}

function pick(names: readonly string[], wanted: ReadonlySet<string>): Picked {
  const places = names.flatMap((name, i) => (wanted.has(name) ? [i] : []));
  return { places, names: places.map((i) => names[i]!) };
}

/** Values of a row as they were stored. */
export function valuesOf(series: Buffer): Float64Array {
  // SQLite's buffers are not aligned to eight bytes.
  const bytes = Uint8Array.prototype.slice.call(series);
  return new Float64Array(bytes.buffer, bytes.byteOffset, bytes.byteLength / 8);
}

interface Gathered {
  readonly start: number;
  readonly layout: number;
  readonly bucket: Bucket;
}

/** Parts in order of time as one per stretch and layout. */
function* gather(parts: Iterable<NumberedPart>, width_ms: number): IterableIterator<Gathered> {
  let start = Number.NaN;
  let buckets = new Map<number, Gathered>();
  for (const part of parts) {
    const own = floorTo(part.time_ms, width_ms);
    if (own !== start) {
      yield* buckets.values();
      buckets = new Map();
      start = own;
    }
    const { layout } = part;
    const known = buckets.get(layout);
    const one = known ?? { start, layout, bucket: emptyBucket(part.names.length) };
    if (known === undefined) buckets.set(layout, one);
    addToBucket(one.bucket, part);
  }
  yield* buckets.values();
}
