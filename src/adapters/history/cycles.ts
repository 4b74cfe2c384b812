import type { Mode } from '../../core/definitions.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import type { Database } from './database.js';
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
