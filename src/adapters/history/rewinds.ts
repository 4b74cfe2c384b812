import type { RewindRecord } from '../../core/scan/rewindRecord.js';
import type { Database } from './database.js';
import type { Sequence } from './sequence.js';

/** What rewinds have changed, and what the time-series database has to forget because of them. */
export class Rewinds {
  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
  ) {}

  add(record: RewindRecord): void {
    this.database
      .prepare('INSERT INTO rewinds (unit, "from", time, json) VALUES (?, ?, ?, ?)')
      .run(
        ...[record.unit, Date.parse(record.from), Date.parse(record.to)],
        JSON.stringify(record),
      );
  }

  /** Those whose scans lie in a span of time or reach into it, newest first, at most `most`. */
  between(unit: string, from_ms: number, to_ms: number, most: number): RewindRecord[] {
    const rows = this.database
      .prepare(
        `SELECT json FROM rewinds WHERE unit = ? AND time >= ? AND "from" <= ?
         ORDER BY no DESC LIMIT ?`,
      )
      .pluck()
      .all(unit, from_ms, to_ms, most) as string[];
    return rows.map((json) => JSON.parse(json) as RewindRecord);
  }

  latest(unit: string): RewindRecord | null {
    return this.between(unit, 0, Number.MAX_SAFE_INTEGER, 1)[0] ?? null;
  }

  /**
   * Notes that what the time-series database has of a unit's scans in a span is void; what holds there
   * is entered behind it.
   *
   * @param again false: what comes there is told for the first time, not once more
   */
  withdraw(unit: string, from_ms: number, to_ms: number, again = true): void {
    const [from, to] = [from_ms, to_ms].map((time_ms) => new Date(time_ms).toISOString());
    this.database
      .prepare('INSERT INTO withdrawals (seq, unit, time, json) VALUES (?, ?, ?, ?)')
      .run(
        this.sequence.next++,
        unit,
        to_ms,
        JSON.stringify({ from, to, ...(again ? {} : { again }) }),
      );
  }

  /** All that was withdrawn of a unit's scans, to be told again. */
  withdrawn(unit: string): { readonly from_ms: number; readonly to_ms: number }[] {
    const rows = this.database
      .prepare('SELECT json FROM withdrawals WHERE unit = ?')
      .pluck()
      .all(unit) as string[];
    return rows.flatMap((json) => {
      const { from, to, again } = JSON.parse(json) as { from: string; to: string; again?: false };
      return again === false ? [] : [{ from_ms: Date.parse(from), to_ms: Date.parse(to) }];
    });
  }
}
