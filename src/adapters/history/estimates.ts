import type { UnitDefinition } from '../../core/definitions.js';
import type { DispatchAnswer, Estimate } from '../../core/estimate.js';
import { stretchFor } from './buckets.js';
import type { Database } from './database.js';
import type { Layouts } from './layouts.js';
import { type Rollups, STORED, valuesOf } from './rollups.js';
import type { Sequence } from './sequence.js';
import { type Measured, seriesNames, seriesValues, wordsOf } from './series.js';
import { pointsOf, type ThinnedPoint, thin } from './thin.js';

interface StoredRow {
  time: number;
  layout: number;
  series: Buffer;
}

/** An estimate as it was stored, with what was measured at its scan. */
export interface EstimateThen extends Measured {
  readonly estimate: Estimate;
}

/** A span of source time [ms]; `end_ms` is not in it. */
export interface Span {
  readonly from_ms: number;
  readonly end_ms: number;
}

/** Estimates and dispatch answers by unit and time. A time once written stays, but for late readings. */
export class Estimates {
  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
    private readonly layouts: Layouts,
    private readonly rollups: Rollups,
  ) {}

  /** @returns false where the unit already has an estimate of this time */
  add(unit: UnitDefinition, estimate: Estimate, measured: Measured): boolean {
    const time_ms = Date.parse(estimate.time);
    const { isNew, layout, values } = this.store(unit, estimate, measured);
    if (isNew) this.rollups.added(unit.id, layout, time_ms, values);
    if (estimate.dispatch) this.addDispatch(unit.id, time_ms, estimate.dispatch);
    return isNew;
  }

  /**
   * Puts an estimate that was made again in the place of those of its scan. What was told of hours then
   * stays as it was told. Roll-ups are to be made anew afterwards.
   *
   * @param scan the time that no other scan has; the estimate's time lies in it
   * @param resend also where nothing has changed, for the time-series database
   * @returns whether anything has changed; then it has the next revision
   */
  revise(
    unit: UnitDefinition,
    estimate: Estimate,
    measured: Measured,
    scan: Span,
    resend: boolean,
  ): boolean {
    const { again, isSame, isFirst } = this.heldAgainst(unit, estimate, scan);
    if (isSame && !resend) return false;
    this.database
      .prepare('DELETE FROM estimates WHERE unit = ? AND time >= ? AND time < ?')
      .run(unit.id, scan.from_ms, scan.end_ms);
    const revision = again.revision + (isSame || isFirst ? 0 : 1);
    this.store(unit, { ...again, revision }, measured);
    return !isSame;
  }

  /** Whether an estimate that was made again is another than that which its scan has. */
  differs(unit: UnitDefinition, estimate: Estimate, scan: Span): boolean {
    return !this.heldAgainst(unit, estimate, scan).isSame;
  }

  private heldAgainst(unit: UnitDefinition, estimate: Estimate, { from_ms, end_ms }: Span) {
    const texts = this.database
      .prepare('SELECT json FROM estimates WHERE unit = ? AND time >= ? AND time < ?')
      .pluck()
      .all(unit.id, from_ms, end_ms) as string[];
    const former = texts.map((json) => JSON.parse(json) as Estimate);
    const told = former.find(({ dispatch }) => dispatch !== undefined)?.dispatch;
    const revision = Math.max(0, ...former.map((one) => one.revision));
    const again: Estimate = { ...estimate, revision, ...(told ? { dispatch: told } : {}) };
    const isSame = texts.length === 1 && texts[0] === JSON.stringify(again);
    return { again, isSame, isFirst: texts.length === 0 };
  }

  /** The greatest revision in a span of time; 0 where it has no estimate. */
  newestRevision(unit: string, { from_ms, end_ms }: Span): number {
    const revision = this.database
      .prepare(
        `SELECT max(json_extract(json, '$.revision')) FROM estimates
         WHERE unit = ? AND time >= ? AND time < ?`,
      )
      .pluck()
      .get(unit, from_ms, end_ms) as number | null;
    return revision ?? 0;
  }

  /** @returns false where the unit already has answers of this time */
  addDispatch(unit: string, time_ms: number, answers: readonly DispatchAnswer[]): boolean {
    return this.insert(
      'INSERT OR IGNORE INTO dispatch (seq, unit, time, json) VALUES (?, ?, ?, ?)',
      ...[unit, time_ms, JSON.stringify(answers)],
    );
  }

  /** What was told of hours at a time; null where nothing was. */
  dispatchAt(unit: string, time_ms: number): DispatchAnswer[] | null {
    const json = this.database
      .prepare('SELECT json FROM dispatch WHERE unit = ? AND time = ?')
      .pluck()
      .get(unit, time_ms) as string | undefined;
    return json === undefined ? null : (JSON.parse(json) as DispatchAnswer[]);
  }

  latest(unit: string): Estimate | null {
    return this.newest<Estimate>('estimates', unit)?.content ?? null;
  }

  /** The newest of a span of time; null where it has none. */
  newestUntil(unit: string, from_ms: number, to_ms: number): Estimate | null {
    const json = this.database
      .prepare(
        'SELECT json FROM estimates WHERE unit = ? AND time BETWEEN ? AND ? ORDER BY time DESC LIMIT 1',
      )
      .pluck()
      .get(unit, from_ms, to_ms) as string | undefined;
    return json === undefined ? null : (JSON.parse(json) as Estimate);
  }

  /** The estimate nearest to a time, at most `within_ms` from it, with what was measured then. */
  near(unit: string, time_ms: number, within_ms: number): EstimateThen | null {
    const select = 'SELECT time, json, layout, series FROM estimates WHERE unit = ? AND time';
    const before = this.database.prepare(`${select} BETWEEN ? AND ? ORDER BY time DESC LIMIT 1`);
    const after = this.database.prepare(`${select} BETWEEN ? AND ? ORDER BY time LIMIT 1`);
    const found = [
      before.get(unit, time_ms - within_ms, time_ms),
      after.get(unit, time_ms, time_ms + within_ms),
    ] as ((StoredRow & { json: string }) | undefined)[];
    const off = (row: StoredRow) => Math.abs(row.time - time_ms);
    const [nearest] = found.filter((row) => row !== undefined).sort((a, b) => off(a) - off(b));
    if (nearest === undefined) return null;
    const names = this.layouts.of(nearest.layout);
    const values = valuesOf(nearest.series);
    const measured = (name: keyof Measured) => {
      const value = values[names.indexOf(name)];
      return value === undefined || Number.isNaN(value) ? null : value;
    };
    return {
      estimate: JSON.parse(nearest.json) as Estimate,
      flow_kg_s: measured('flow_kg_s'),
      power_MW_el: measured('power_MW_el'),
    };
  }

  latestDispatch(unit: string): { time: string; answers: DispatchAnswer[] } | null {
    const found = this.newest<DispatchAnswer[]>('dispatch', unit);
    return found && { time: new Date(found.time).toISOString(), answers: found.content };
  }

  /** Estimates of a unit in a span of time, oldest first, at most `most`. */
  between(unit: string, from_ms: number, to_ms: number, most: number): Estimate[] {
    const rows = this.database
      .prepare(
        'SELECT json FROM estimates WHERE unit = ? AND time BETWEEN ? AND ? ORDER BY time LIMIT ?',
      )
      .pluck()
      .all(unit, from_ms, to_ms, most) as string[];
    return rows.map((json) => JSON.parse(json) as Estimate);
  }

  /**
   * Series of a unit over a span of time in at most `points` points, see thin.ts; few enough rows are
   * given as they are.
   *
   * @param names of series, without extremes; null: all
   */
  series(
    unit: string,
    from_ms: number,
    to_ms: number,
    points: number,
    names: readonly string[] | null = null,
  ): { points: ThinnedPoint[]; bucket_ms: number | null } {
    const wanted = names && new Set(names);
    const count = this.database
      .prepare(
        `SELECT count(*) FROM (SELECT 1 FROM estimates
           WHERE unit = ? AND time BETWEEN ? AND ? LIMIT ?)`,
      )
      .pluck();
    if ((count.get(unit, from_ms, to_ms, points + 1) as number) <= points) {
      const rows = this.rollups.parts(unit, from_ms, to_ms + 1, STORED);
      return { points: pointsOf(rows, wanted), bucket_ms: null };
    }
    const { bucket_ms, level } = stretchFor(from_ms, to_ms, points);
    const parts = this.rollups.parts(unit, from_ms, to_ms + 1, level, wanted);
    return { points: thin(parts, bucket_ms, wanted), bucket_ms };
  }

  /**
   * Some series of a unit as they were stored, oldest first: numbers as they are, words as their place
   * in `wordsOf`; NaN where a row has none.
   */
  *rows(
    unit: string,
    from_ms: number,
    to_ms: number,
    names: readonly string[],
  ): IterableIterator<{ time_ms: number; values: number[] }> {
    for (const row of this.rollups.parts(unit, from_ms, to_ms + 1, STORED)) {
      const values = names.map((name) => row.means[row.names.indexOf(name)] ?? Number.NaN);
      yield { time_ms: row.time_ms, values };
    }
  }

  /** Names that `series` may give for this unit. */
  names(unit: UnitDefinition): string[] {
    return seriesNames(unit).flatMap((name) =>
      wordsOf(name) ? [name] : [name, `${name}.min`, `${name}.max`],
    );
  }

  private newest<T>(table: string, unit: string): { time: number; content: T } | null {
    const row = this.database
      .prepare(`SELECT time, json FROM ${table} WHERE unit = ? ORDER BY time DESC LIMIT 1`)
      .get(unit) as { time: number; json: string } | undefined;
    return row ? { time: row.time, content: JSON.parse(row.json) as T } : null;
  }

  private store(unit: UnitDefinition, estimate: Estimate, measured: Measured) {
    const values = seriesValues(unit, estimate, measured);
    const layout = this.layouts.numberFor(unit);
    const isNew = this.insert(
      'INSERT OR IGNORE INTO estimates (seq, unit, time, json, layout, series) VALUES (?, ?, ?, ?, ?, ?)',
      ...[unit.id, Date.parse(estimate.time), JSON.stringify(estimate), layout],
      Buffer.from(values.buffer),
    );
    return { isNew, layout, values };
  }

  private insert(sql: string, ...values: unknown[]): boolean {
    const isNew = this.database.prepare(sql).run(this.sequence.next, ...values).changes > 0;
    if (isNew) this.sequence.next++;
    return isNew;
  }
}
