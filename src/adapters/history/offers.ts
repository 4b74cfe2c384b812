import { deflateSync, inflateSync } from 'node:zlib';
import type { OffersAsk } from '../../core/plan/offerAsk.js';
import { type KeptOffers, summaryOf } from '../../core/plan/offerSummary.js';
import type { AnsweredOffers } from '../../core/plan/offerTable.js';
import type { Database } from './database.js';

interface SummaryRow {
  no: number;
  asked: number;
  time: number;
  summary: string;
}

/** Newest tables that are kept of a unit, and the bytes that they may take together. */
export const MOST_KEPT = { tables: 10_000, bytes: 200e6 };

/**
 * Answered offer tables. What was once offered stays as it was: a trigger of the database refuses to
 * change a row; retention alone removes some, oldest first.
 */
export class Offers {
  constructor(private readonly database: Database) {}

  /** @returns the number under which it is kept */
  add(
    unit: string,
    asked_ms: number,
    time_ms: number,
    asked: OffersAsk,
    answer: AnsweredOffers,
  ): number {
    const summary = JSON.stringify({ asked, offers: answer.offers.map(summaryOf) });
    const content = deflateSync(JSON.stringify(answer));
    // What was sold on its strength does not come back: a power cut may not undo it.
    this.database.pragma('synchronous = FULL');
    try {
      const { lastInsertRowid } = this.database
        .prepare('INSERT INTO offers (unit, asked, time, summary, content) VALUES (?, ?, ?, ?, ?)')
        .run(unit, Math.round(asked_ms), time_ms, summary, content);
      return Number(lastInsertRowid);
    } finally {
      this.database.pragma('synchronous = NORMAL');
    }
  }

  /**
   * Of a unit and a span of asking, newest first, at most `most`.
   *
   * @param below only tables with a lower number, to go on from the last one had
   */
  between(
    unit: string,
    from_ms: number,
    to_ms: number,
    most: number,
    below = Number.MAX_SAFE_INTEGER,
  ): KeptOffers[] {
    const rows = this.database
      .prepare(
        `SELECT no, asked, time, summary FROM offers
         WHERE unit = ? AND asked BETWEEN ? AND ? AND no < ? ORDER BY no DESC LIMIT ?`,
      )
      .all(unit, from_ms, to_ms, below, most) as SummaryRow[];
    return rows.map(({ no, asked: asked_ms, time: time_ms, summary }) => ({
      ...{ no, asked_ms, time_ms },
      ...(JSON.parse(summary) as Pick<KeptOffers, 'asked' | 'offers'>),
    }));
  }

  /** A table as it was answered; null where none has this number. */
  answer(unit: string, no: number): AnsweredOffers | null {
    const content = this.database
      .prepare('SELECT content FROM offers WHERE unit = ? AND no = ?')
      .pluck()
      .get(unit, no) as Buffer | undefined;
    return content === undefined
      ? null
      : (JSON.parse(inflateSync(content).toString()) as AnsweredOffers);
  }
}
