import type { JournalEntry } from '../adapters/history/journal.js';

/** Sources that come further ahead at once than this may be of clocks that were set wrong [ms]. */
export const LEAST_LEAD_MS = 3_600_000;

/** A stretch of the journal that came by clocks that were ahead, and was put aside. */
export interface Stretch {
  /** Its first entry, the first that came by the right clocks, and that by which it was found. */
  readonly from_seq: number;
  readonly back_seq: number;
  readonly through_seq: number;
  /** Newest source time before it [ms]; null: the unit was begun anew. */
  readonly before_ms: number | null;
  /** Source time of the first scan of the state that was left, where the unit was begun anew [ms]. */
  readonly begun_ms: number | null;
  /** How far ahead it came, and where the machine's clock stood when it was found [ms]. */
  readonly ahead_ms: number;
  readonly found_ms: number;
}

/** Whether something of the journal, reading or mark, is of a stretch. */
export function isOfStretch(stretch: Stretch, entry: JournalEntry): boolean {
  const { from_seq, back_seq, through_seq, before_ms, found_ms } = stretch;
  if (entry.seq < from_seq || entry.seq > through_seq) return false;
  if (entry.kind === 'close') return true;
  if (entry.seq < back_seq) return entry.time_ms > (before_ms ?? Number.NEGATIVE_INFINITY);
  return entry.time_ms > found_ms + LEAST_LEAD_MS;
}

/**
 * Source time behind which nothing holds that was told by clocks that were ahead [ms]. What was told
 * before the state that was left had begun is none of it.
 */
export function voidAfter({ before_ms, begun_ms, found_ms }: Stretch): number {
  return before_ms ?? Math.max(found_ms + LEAST_LEAD_MS, (begun_ms ?? found_ms) - 1);
}

/** For log and health. */
export function returnWords({ before_ms, ahead_ms, found_ms }: Stretch): string {
  const [ahead, found] = [ahead_ms, found_ms].map((ms) => new Date(ms).toISOString());
  const from =
    before_ms === null
      ? 'begun anew, as no state of before is there'
      : `gone back to the state of ${new Date(before_ms).toISOString()}`;
  return `clocks were ahead, at ${ahead}, and are right again, at ${found}: ${from}`;
}
