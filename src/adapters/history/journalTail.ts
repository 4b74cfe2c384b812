import type { JournalEntry } from './journalEntry.js';

/** Entries that are kept at most; half of them go at a time. */
const MOST = 8192;

/**
 * The newest entries of the journal as they were written, in memory: who follows it does not have to read
 * them back. They are those of the file, to the last bit, and only what was committed is here.
 */
export class JournalTail {
  /** Without a gap in their numbers. */
  private entries: JournalEntry[] = [];

  add(entry: JournalEntry): void {
    const newest = this.entries.at(-1);
    if (newest !== undefined && entry.seq !== newest.seq + 1) this.entries = [];
    this.entries.push(entry);
    if (this.entries.length > MOST) this.entries = this.entries.slice(MOST / 2);
  }

  /** Entries behind a number, at most so many; null where the first of them is not here. */
  behind(seq: number, most: number): JournalEntry[] | null {
    const oldest = this.entries[0];
    if (oldest === undefined || seq + 1 < oldest.seq) return null;
    const from = seq + 1 - oldest.seq;
    return this.entries.slice(from, from + most);
  }

  clear(): void {
    this.entries = [];
  }
}
