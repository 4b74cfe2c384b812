import type { UnitDefinition } from '../../core/definitions.js';
import { type Checkpoint, fingerprint, type StoredCheckpoint } from './checkpoints.js';
import type { Database } from './database.js';
import { packImage, unpackImage } from './thinImage.js';

/**
 * Saved states that late readings rewind to: the first of each stretch of source time, kept as long as
 * late readings are taken in, deflated. A restart uses those of `Checkpoints`, which are newer.
 */
export class RewindPoints {
  constructor(private readonly database: Database) {}

  /** Keeps a state, in place of all that are kept from after a time to the end of its stretch. */
  add(
    unit: UnitDefinition,
    { time_ms, journal_seq, image }: Checkpoint,
    every_ms: number,
    after_ms = time_ms - 1,
  ): void {
    this.forgetAfter(unit.id, after_ms, (Math.floor(time_ms / every_ms) + 1) * every_ms);
    this.database
      .prepare(
        `INSERT INTO rewind_points (unit, time, journal_seq, fingerprint, image)
         VALUES (?, ?, ?, ?, ?)`,
      )
      .run(unit.id, time_ms, journal_seq, fingerprint(unit), packImage(image));
  }

  /** Deletes what is of after a time and of before another. */
  forgetAfter(unit: string, after_ms: number, end_ms: number): void {
    this.database
      .prepare('DELETE FROM rewind_points WHERE unit = ? AND time > ? AND time < ?')
      .run(unit, after_ms, end_ms);
  }

  /** Deletes states that were saved within a span of the journal. */
  forgetSaved(unit: string, from_seq: number, through_seq: number): void {
    this.database
      .prepare('DELETE FROM rewind_points WHERE unit = ? AND journal_seq BETWEEN ? AND ?')
      .run(unit, from_seq, through_seq);
  }

  /** Whether a state is kept of the stretch that a time lies in, from before it or of it. */
  hasOneOf(unit: string, time_ms: number, every_ms: number): boolean {
    const from = Math.floor(time_ms / every_ms) * every_ms;
    const found = this.database
      .prepare('SELECT 1 FROM rewind_points WHERE unit = ? AND time BETWEEN ? AND ? LIMIT 1')
      .get(unit, from, time_ms);
    return found !== undefined;
  }

  /** States from before a time that fit the unit's definition, newest first. */
  before(unit: UnitDefinition, time_ms: number): StoredCheckpoint[] {
    const rows = this.database
      .prepare(
        `SELECT time, journal_seq FROM rewind_points
         WHERE unit = ? AND time < ? AND fingerprint = ? ORDER BY time DESC`,
      )
      .all(unit.id, time_ms, fingerprint(unit)) as { time: number; journal_seq: number }[];
    return rows.map(({ time, journal_seq }) => ({
      ...{ time_ms: time, journal_seq },
      load: () => this.image(unit.id, time),
    }));
  }

  /** Source time of the oldest state that fits the unit's definition [ms]; null where there is none. */
  oldest(unit: UnitDefinition): number | null {
    return this.database
      .prepare('SELECT min(time) FROM rewind_points WHERE unit = ? AND fingerprint = ?')
      .pluck()
      .get(unit.id, fingerprint(unit)) as number | null;
  }

  /** Deletes what is older than a time, and what is of no use since the definition is another one. */
  forget(unit: UnitDefinition, before_ms: number): void {
    this.database
      .prepare('DELETE FROM rewind_points WHERE unit = ? AND (time < ? OR fingerprint <> ?)')
      .run(unit.id, before_ms, fingerprint(unit));
  }

  private image(unit: string, time_ms: number): unknown {
    const packed = this.database
      .prepare('SELECT image FROM rewind_points WHERE unit = ? AND time = ?')
      .pluck()
      .get(unit, time_ms) as Buffer | undefined;
    if (packed === undefined) throw new RangeError(`no state is kept of ${time_ms} ms`);
    return unpackImage(packed);
  }
}
