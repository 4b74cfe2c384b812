import type { Database } from './database.js';

/** A reading that came when its scan was closed: its source time, and where it stands in the journal. */
export interface LateReading {
  readonly time_ms: number;
  readonly seq: number;
}

/** What waits of a unit: how many, and the oldest source time of them [ms]. */
export interface LateWaiting {
  readonly count: number;
  readonly oldest_ms: number;
}

/**
 * Which entries of the journal came late, by unit and source time. Those up to a number of the journal
 * are in the unit's state, the others wait for a rewind. All stay as long as there are states from
 * before them, since whoever goes on from such a state needs them again.
 */
export class LateReadings {
  constructor(private readonly database: Database) {}

  /** Enters readings; those that are known, as after a restart, stay as they are. */
  add(unit: string, readings: readonly LateReading[]): void {
    const insert = this.database.prepare(
      'INSERT OR IGNORE INTO late_readings (unit, time, seq) VALUES (?, ?, ?)',
    );
    for (const { time_ms, seq } of readings) insert.run(unit, time_ms, seq);
  }

  has(unit: string, { time_ms, seq }: LateReading): boolean {
    const found = this.database
      .prepare('SELECT 1 FROM late_readings WHERE unit = ? AND time = ? AND seq = ?')
      .get(unit, time_ms, seq);
    return found !== undefined;
  }

  /** What waits, of entries up to a number of the journal; null where nothing does. */
  waiting(unit: string, through_seq = Number.MAX_SAFE_INTEGER): LateWaiting | null {
    const { count, oldest_ms } = this.database
      .prepare(
        `SELECT count(*) AS count, min(time) AS oldest_ms FROM late_readings
         WHERE unit = ? AND seq > ? AND seq <= ?`,
      )
      .get(unit, this.taken(unit), through_seq) as LateWaiting;
    return count === 0 ? null : { count, oldest_ms };
  }

  /** Those that wait behind a number of the journal, in its order, at most `most`. */
  waitingAfter(unit: string, seq: number, through_seq: number, most: number): LateReading[] {
    return this.database
      .prepare(
        `SELECT time AS time_ms, seq FROM late_readings
         WHERE unit = ? AND seq > ? AND seq <= ? ORDER BY seq LIMIT ?`,
      )
      .all(unit, Math.max(seq, this.taken(unit)), through_seq, most) as LateReading[];
  }

  /** In order of source time behind a reading, those up to a number of the journal, at most `most`. */
  after(
    unit: string,
    { time_ms, seq }: LateReading,
    through_seq: number,
    most: number,
  ): LateReading[] {
    return this.database
      .prepare(
        `SELECT time AS time_ms, seq FROM late_readings
         WHERE unit = ? AND (time, seq) > (?, ?) AND seq <= ? ORDER BY time, seq LIMIT ?`,
      )
      .all(unit, time_ms, seq, through_seq, most) as LateReading[];
  }

  /** How many of before a time came behind a number of the journal. */
  countBefore(unit: string, time_ms: number, after_seq: number): number {
    return this.database
      .prepare('SELECT count(*) FROM late_readings WHERE unit = ? AND time < ? AND seq > ?')
      .pluck()
      .get(unit, time_ms, after_seq) as number;
  }

  /** Readings that are of no use. */
  drop(unit: string, readings: readonly LateReading[]): void {
    const remove = this.database.prepare(
      'DELETE FROM late_readings WHERE unit = ? AND time = ? AND seq = ?',
    );
    for (const { time_ms, seq } of readings) remove.run(unit, time_ms, seq);
  }

  /** Up to this number of the journal they are in the state, or found of no use. */
  taken(unit: string): number {
    const value = this.database.prepare('SELECT value FROM cursors WHERE name = ?').pluck();
    return (value.get(nameOf(unit)) as number | undefined) ?? 0;
  }

  take(unit: string, through_seq: number): void {
    this.database
      .prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)')
      .run(nameOf(unit), through_seq);
  }

  /** A state was put back that has entries up to a number: what came late since then waits again. */
  waitAgain(unit: string, after_seq: number): void {
    if (this.taken(unit) > after_seq) this.take(unit, after_seq);
  }

  /** Deletes those of before a time. @returns how many of them had waited in vain */
  forget(unit: string, before_ms: number): number {
    const waited = this.database
      .prepare('SELECT count(*) FROM late_readings WHERE unit = ? AND time < ? AND seq > ?')
      .pluck()
      .get(unit, before_ms, this.taken(unit)) as number;
    this.database
      .prepare('DELETE FROM late_readings WHERE unit = ? AND time < ?')
      .run(unit, before_ms);
    return waited;
  }
}

function nameOf(unit: string): string {
  return `late readings of ${unit}`;
}
