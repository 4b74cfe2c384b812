import type { UnitDefinition } from '../../core/definitions.js';
import type { DispatchAnswer, Estimate, ProfileView } from '../../core/estimate.js';
import type { Database } from './database.js';
import type { Sequence } from './sequence.js';
import { hasExtremes, type Measured, seriesNames, seriesValues } from './series.js';
import { type SeriesRow, type ThinnedPoint, thin } from './thin.js';

/** Spacing of the profiles that are kept [ms]; the newest is held by the daemon itself. */
const PROFILE_EVERY_MS = 600_000;

interface StoredRow {
  time: number;
  layout: number;
  series: Buffer;
}

/** Estimates, dispatch answers and profiles by unit and time. A time once written stays as it is. */
export class Estimates {
  private readonly layouts = new Map<number, readonly string[]>();
  private readonly layoutOfUnit = new Map<string, number>();
  private readonly profileDue = new Map<string, number>();

  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
  ) {
    const rows = database.prepare('SELECT no, names FROM layouts').all();
    for (const row of rows as { no: number; names: string }[]) {
      this.layouts.set(row.no, JSON.parse(row.names) as string[]);
    }
  }

  /** @returns false where the unit already has an estimate of this time */
  add(unit: UnitDefinition, estimate: Estimate, measured: Measured): boolean {
    const time_ms = Date.parse(estimate.time);
    const values = seriesValues(unit, estimate, measured);
    const isNew = this.insert(
      'INSERT OR IGNORE INTO estimates (seq, unit, time, json, layout, series) VALUES (?, ?, ?, ?, ?, ?)',
      ...[unit.id, time_ms, JSON.stringify(estimate), this.layout(unit)],
      Buffer.from(values.buffer),
    );
    if (estimate.dispatch) this.addDispatch(unit.id, time_ms, estimate.dispatch);
    return isNew;
  }

  /** @returns false where the unit already has answers of this time */
  addDispatch(unit: string, time_ms: number, answers: readonly DispatchAnswer[]): boolean {
    return this.insert(
      'INSERT OR IGNORE INTO dispatch (seq, unit, time, json) VALUES (?, ?, ?, ?)',
      ...[unit, time_ms, JSON.stringify(answers)],
    );
  }

  /** Keeps a profile every 10 minutes of source time; with `always` this one in any case. */
  addProfile(profile: ProfileView, always = false): void {
    const time_ms = Date.parse(profile.time);
    const due_ms = this.profileDue.get(profile.unit) ?? Number.NEGATIVE_INFINITY;
    if (!always && time_ms < due_ms) return;
    const stretch = Math.floor(time_ms / PROFILE_EVERY_MS) + 1;
    this.profileDue.set(profile.unit, stretch * PROFILE_EVERY_MS);
    this.database
      .prepare('INSERT OR REPLACE INTO profiles (unit, time, json) VALUES (?, ?, ?)')
      .run(profile.unit, time_ms, JSON.stringify(profile));
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

  /** The profile that was kept nearest to a time, at most `within_ms` from it. */
  profileNear(unit: string, time_ms: number, within_ms: number): ProfileView | null {
    const json = this.database
      .prepare(
        `SELECT json FROM profiles WHERE unit = @unit AND time BETWEEN @from AND @to
         ORDER BY abs(time - @time_ms) LIMIT 1`,
      )
      .pluck()
      .get({ unit, time_ms, from: time_ms - within_ms, to: time_ms + within_ms }) as
      | string
      | undefined;
    return json === undefined ? null : (JSON.parse(json) as ProfileView);
  }

  latestProfile(unit: string): ProfileView | null {
    return this.newest<ProfileView>('profiles', unit)?.content ?? null;
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

  /** The series of a unit, thinned to at most `points` points; see thin.ts. */
  series(unit: string, from_ms: number, to_ms: number, points: number): ThinnedPoint[] {
    const where = 'FROM estimates WHERE unit = ? AND time BETWEEN ? AND ?';
    const count = this.database.prepare(`SELECT count(*) ${where}`).pluck();
    const select = this.database.prepare(`SELECT time, layout, series ${where} ORDER BY time`);
    const rows = select.iterate(unit, from_ms, to_ms) as IterableIterator<StoredRow>;
    const many = count.get(unit, from_ms, to_ms) as number;
    return thin(this.decode(rows), many, from_ms, to_ms, points);
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
    const select = this.database.prepare(
      'SELECT time, layout, series FROM estimates WHERE unit = ? AND time BETWEEN ? AND ? ORDER BY time',
    );
    const rows = select.iterate(unit, from_ms, to_ms) as IterableIterator<StoredRow>;
    for (const row of this.decode(rows)) {
      const values = names.map((name) => row.values[row.names.indexOf(name)] ?? Number.NaN);
      yield { time_ms: row.time_ms, values };
    }
  }

  /** Names that `series` may give for this unit. */
  names(unit: UnitDefinition): string[] {
    return seriesNames(unit).flatMap((name) =>
      hasExtremes(name) ? [name, `${name}.min`, `${name}.max`] : [name],
    );
  }

  private *decode(rows: Iterable<StoredRow>): IterableIterator<SeriesRow> {
    for (const row of rows) {
      // SQLite's buffers are not aligned to eight bytes.
      const bytes = Uint8Array.prototype.slice.call(row.series);
      const values = new Float64Array(bytes.buffer, bytes.byteOffset, bytes.byteLength / 8);
      yield { time_ms: row.time, names: this.layouts.get(row.layout) ?? [], values };
    }
  }

  private newest<T>(table: string, unit: string): { time: number; content: T } | null {
    const row = this.database
      .prepare(`SELECT time, json FROM ${table} WHERE unit = ? ORDER BY time DESC LIMIT 1`)
      .get(unit) as { time: number; json: string } | undefined;
    return row ? { time: row.time, content: JSON.parse(row.json) as T } : null;
  }

  private insert(sql: string, ...values: unknown[]): boolean {
    const isNew = this.database.prepare(sql).run(this.sequence.next, ...values).changes > 0;
    if (isNew) this.sequence.next++;
    return isNew;
  }

  private layout(unit: UnitDefinition): number {
    const known = this.layoutOfUnit.get(unit.id);
    if (known !== undefined) return known;
    const names = JSON.stringify(seriesNames(unit));
    this.database.prepare('INSERT OR IGNORE INTO layouts (names) VALUES (?)').run(names);
    const no = this.database.prepare('SELECT no FROM layouts WHERE names = ?').pluck().get(names);
    this.layouts.set(no as number, JSON.parse(names) as string[]);
    this.layoutOfUnit.set(unit.id, no as number);
    return no as number;
  }
}
