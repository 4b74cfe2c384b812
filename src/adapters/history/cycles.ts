import type { Mode } from '../../core/definitions.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import type { Database } from './database.js';
import type { Span } from './estimates.js';
import type { Sequence } from './sequence.js';

/** Runs that are over: charges, stands and discharges by unit and beginning. */
export class Cycles {
  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
  ) {}

  /**
   * Enters a run. One that is known stays as it was first entered, as after a restart that works the
   * journal off again; so does one within a known run, which an estimator started afresh amid it tells.
   * @returns false where it is known
   */
  add(run: CycleRecord): boolean {
    const { unit, kind, no } = run;
    const span = { unit, from: Date.parse(run.from), to: Date.parse(run.to) };
    const known = this.database
      .prepare('SELECT 1 FROM cycles WHERE unit = @unit AND "from" <= @from AND time >= @to')
      .get(span);
    if (known) return false;
    const { changes } = this.database
      .prepare(
        `INSERT OR IGNORE INTO cycles (seq, unit, "from", time, kind, no, json)
         VALUES (@seq, @unit, @from, @to, @kind, @no, @json)`,
      )
      .run({ ...span, seq: this.sequence.next, kind, no, json: JSON.stringify(run) });
    if (changes === 0) return false;
    this.sequence.next++;
    return true;
  }

  /**
   * Puts a run that was told again, from a state of before its end, in the place of those that it
   * overlaps.
   */
  revise(run: CycleRecord): void {
    const { unit, kind, no } = run;
    const span = { unit, from: Date.parse(run.from), to: Date.parse(run.to) };
    this.database
      .prepare('DELETE FROM cycles WHERE unit = @unit AND "from" < @to AND time > @from')
      .run(span);
    this.database
      .prepare(
        `INSERT OR REPLACE INTO cycles (seq, unit, "from", time, kind, no, json)
         VALUES (@seq, @unit, @from, @to, @kind, @no, @json)`,
      )
      .run({ ...span, seq: this.sequence.next++, kind, no, json: JSON.stringify(run) });
  }

  /** Deletes runs that ended in a span of time, but for those with one of these beginnings. */
  forget(unit: string, { from_ms, end_ms }: Span, but: ReadonlySet<number>): void {
    const ended = this.database
      .prepare('SELECT "from" FROM cycles WHERE unit = ? AND time >= ? AND time < ?')
      .pluck()
      .all(unit, from_ms, end_ms) as number[];
    const remove = this.database.prepare('DELETE FROM cycles WHERE unit = ? AND "from" = ?');
    for (const from of ended) if (!but.has(from)) remove.run(unit, from);
  }

  /** Runs that lie in a span of time or reach into it, the newest `most` of them, oldest first. */
  between(
    unit: string,
    from_ms: number,
    to_ms: number,
    kind: Mode | undefined,
    most: number,
  ): CycleRecord[] {
    const rows = this.database
      .prepare(
        `SELECT json FROM cycles WHERE unit = @unit AND time >= @from_ms AND "from" <= @to_ms
           AND (@kind IS NULL OR kind = @kind) ORDER BY "from" DESC LIMIT @most`,
      )
      .pluck()
      .all({ unit, from_ms, to_ms, kind: kind ?? null, most }) as string[];
    return rows.reverse().map((json) => JSON.parse(json) as CycleRecord);
  }
}
