import { createHash } from 'node:crypto';
import { deserialize, serialize } from 'node:v8';
import type { UnitDefinition } from '../../core/definitions.js';
import { shapeOf, type UnitShape } from '../../core/unitShape.js';
import type { Database } from './database.js';

/** Newest checkpoints kept of each unit. */
const KEEP = 3;

export interface Checkpoint {
  /** Source time of the last scan taken in [ms]. */
  readonly time_ms: number;
  /** Last journal entry taken in. */
  readonly journal_seq: number;
  /** What was saved; structured-cloneable. */
  readonly image: unknown;
}

export interface StoredCheckpoint extends Omit<Checkpoint, 'image'> {
  /** The image; throws where it is damaged. */
  load(): unknown;
}

/** A short print of what shapes a unit's state: one saved under another one does not fit as it is. */
export function fingerprint(unit: UnitDefinition): string {
  return printOf(shapeOf(unit));
}

/** Of the whole definition, as checkpoints had it before: those of an unchanged unit still fit. */
export function formerFingerprint(unit: UnitDefinition): string {
  return printOf(unit);
}

function printOf(content: object): string {
  return createHash('sha256').update(JSON.stringify(content)).digest('hex').slice(0, 16);
}

/** Saved states of units, as Node's structured clone format in a blob. */
export class Checkpoints {
  constructor(private readonly database: Database) {}

  add(unit: UnitDefinition, checkpoint: Checkpoint): void {
    this.addOf(unit, shapeOf(unit), checkpoint);
  }

  /** A state that was saved under a definition of another shape. */
  addOf(unit: { readonly id: string }, shape: UnitShape, checkpoint: Checkpoint): void {
    const { time_ms, journal_seq, image } = checkpoint;
    this.database.transaction(() => {
      this.database
        .prepare(
          `INSERT OR REPLACE INTO checkpoints (unit, time, journal_seq, fingerprint, image)
           VALUES (?, ?, ?, ?, ?)`,
        )
        .run(unit.id, time_ms, journal_seq, printOf(shape), serialize(image));
      this.database
        .prepare(
          `DELETE FROM checkpoints WHERE unit = ? AND time NOT IN
             (SELECT time FROM checkpoints WHERE unit = ? ORDER BY journal_seq DESC LIMIT ${KEEP})`,
        )
        .run(unit.id, unit.id);
    })();
  }

  /** Deletes all of a unit: they are of a state that was put aside. */
  clear(unit: string): void {
    this.database.prepare('DELETE FROM checkpoints WHERE unit = ?').run(unit);
  }

  /** Checkpoints of a unit, newest first, that were saved under a definition of the same shape. */
  list(unit: UnitDefinition): StoredCheckpoint[] {
    return this.select(unit, 'IN');
  }

  /** Those saved under another one, newest first. */
  ofOtherShape(unit: UnitDefinition): StoredCheckpoint[] {
    return this.select(unit, 'NOT IN');
  }

  private select(unit: UnitDefinition, which: 'IN' | 'NOT IN'): StoredCheckpoint[] {
    const rows = this.database
      .prepare(
        `SELECT time, journal_seq, image FROM checkpoints
         WHERE unit = ? AND fingerprint ${which} (?, ?) ORDER BY journal_seq DESC`,
      )
      .all(unit.id, fingerprint(unit), formerFingerprint(unit)) as {
      time: number;
      journal_seq: number;
      image: Buffer;
    }[];
    return rows.map((row) => ({
      time_ms: row.time,
      journal_seq: row.journal_seq,
      load: () => deserialize(row.image),
    }));
  }

  /** True where the unit has checkpoints, though perhaps of another definition. */
  hasAny(unit: string): boolean {
    return (
      this.database.prepare('SELECT 1 FROM checkpoints WHERE unit = ?').get(unit) !== undefined
    );
  }

  /** Journal entries up to this number are in the oldest checkpoint of every unit; 0 if one has none. */
  coveredSeq(units: readonly string[]): number {
    const oldest = this.database
      .prepare('SELECT min(journal_seq) FROM checkpoints WHERE unit = ?')
      .pluck();
    return Math.min(...units.map((unit) => (oldest.get(unit) as number | null) ?? 0));
  }
}
