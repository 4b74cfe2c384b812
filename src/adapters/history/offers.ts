import { deflateSync, inflateSync } from 'node:zlib';
import type { Database } from './database.js';

/** An offer table as it was answered. */
export interface KeptOffers {
  /** Its number, never given twice. */
  readonly no: number;
  readonly unit: string;
  /** When it was asked for, and the source time of the estimate it stands on [ms since 1970]. */
  readonly asked_ms: number;
  readonly time_ms: number;
  /** What was asked and what was answered, both as they went over the wire. */
  readonly asked: unknown;
  readonly answer: unknown;
}

interface Row {
  no: number;
  unit: string;
  asked: number;
  time: number;
  content: Buffer;
}

/** Newest tables that are kept of a unit; each takes some tens of kB. */
export const MOST_KEPT = 10_000;

/**
 * Answered offer tables. What was once offered stays as it was: a trigger of the database refuses to
 * change a row; retention alone removes some, oldest first.
 */
export class Offers {
  constructor(private readonly database: Database) {}

  /** @returns the number under which it is kept */
  add({ unit, asked_ms, time_ms, asked, answer }: Omit<KeptOffers, 'no'>): number {
    const content = deflateSync(JSON.stringify({ asked, answer }));
    // What was sold on its strength does not come back: a power cut may not undo it.
    this.database.pragma('synchronous = FULL');
    try {
      const { lastInsertRowid } = this.database
        .prepare('INSERT INTO offers (unit, asked, time, content) VALUES (?, ?, ?, ?)')
        .run(unit, asked_ms, time_ms, content);
      return Number(lastInsertRowid);
    } finally {
      this.database.pragma('synchronous = NORMAL');
    }
  }

  /** Of a unit and a span of asking, newest first, at most `most`. */
  between(unit: string, from_ms: number, to_ms: number, most: number): KeptOffers[] {
    const rows = this.database
      .prepare(
        `SELECT no, unit, asked, time, content FROM offers
         WHERE unit = ? AND asked BETWEEN ? AND ? ORDER BY no DESC LIMIT ?`,
      )
      .all(unit, from_ms, to_ms, most) as Row[];
    return rows.map(kept);
  }

  one(unit: string, no: number): KeptOffers | null {
    const row = this.database
      .prepare('SELECT no, unit, asked, time, content FROM offers WHERE unit = ? AND no = ?')
      .get(unit, no) as Row | undefined;
    return row === undefined ? null : kept(row);
  }
}

function kept({ no, unit, asked: asked_ms, time: time_ms, content }: Row): KeptOffers {
  const { asked, answer } = JSON.parse(inflateSync(content).toString()) as {
    asked: unknown;
    answer: unknown;
  };
  return { no, unit, asked_ms, time_ms, asked, answer };
}
