import type { JournalEntry } from '../adapters/history/journal.js';
import type { UnitRunner } from './unitRunner.js';

/** Journal entries read at a time. */
export const PAGE = 512;
/** Entries that wait in memory: of one unit, which is then read again later, and of all. */
const MOST_OWN = 4096;
const MOST_HELD = 100_000;
/** With more entries than this a unit is behind: it is flooded, or brings what was held back. */
const IN_STEP = PAGE / 2;

/** A unit and what of the journal waits for it. */
export class UnitLine {
  /** In the order of the journal; those before `at` are taken. */
  private waiting: JournalEntry[] = [];
  private at = 0;
  /** Number of the newest entry that was put here. */
  newest = 0;
  /** Entries behind that one that were passed over, as too many waited. */
  passed = 0;
  /** May have closed scans, to be worked off before the next entry. */
  mayStep = true;

  constructor(readonly runner: UnitRunner) {}

  get length(): number {
    return this.waiting.length - this.at;
  }

  put(entry: JournalEntry): void {
    this.waiting.push(entry);
    this.newest = entry.seq;
  }

  take(): JournalEntry | undefined {
    const entry = this.waiting[this.at];
    if (entry === undefined) return undefined;
    this.at++;
    if (this.at === this.waiting.length) {
      this.waiting = [];
      this.at = 0;
    }
    return entry;
  }
}

/**
 * Hands the journal out to the units, each of which gets its own entries in their order. What comes
 * out of a unit is a function of these alone, so that none has to wait for another: of one that is
 * flooded, or brings a day at once, the journal is read past and later again.
 */
export class Feed {
  readonly lines: readonly UnitLine[];
  private readonly byUnit: ReadonlyMap<string, UnitLine>;
  /** Second reading of what was passed over: behind this number; null where nothing was. */
  private again: number | null = null;
  private held = 0;

  /**
   * @param head number of the entry behind which to begin
   * @param read entries behind a number, oldest first; empty where there are none, or none can be read
   * @param stray an entry of a unit that there is not
   */
  constructor(
    runners: readonly UnitRunner[],
    private head: number,
    private readonly read: (seq: number, most: number) => readonly JournalEntry[],
    private readonly stray: (entry: JournalEntry) => void,
  ) {
    this.lines = runners.map((runner) => new UnitLine(runner));
    this.byUnit = new Map(this.lines.map((line) => [line.runner.unit.id, line]));
  }

  /** Number up to which the journal was handed out, or passed over. */
  get seq(): number {
    return this.head;
  }

  /** Entries that are handed out or passed over and not taken. */
  get waiting(): number {
    return this.lines.reduce((sum, { passed }) => sum + passed, this.held);
  }

  /** Whether a unit that has something to do is not far behind: it is only waiting for its turn. */
  get isAnyInStep(): boolean {
    return this.lines.some(
      ({ mayStep, length, passed }) => passed === 0 && length < IN_STEP && (mayStep || length > 0),
    );
  }

  /** Reads on where a unit may have something to do by it; false where nothing was read. */
  fill(last: number): boolean {
    if (this.again !== null && this.isRoom()) return this.fillAgain();
    const hungry = this.lines.some((line) => line.passed === 0 && line.length === 0);
    if (this.head >= last || (this.held >= PAGE && !(hungry && this.held < MOST_HELD)))
      return false;
    const entries = this.read(this.head, PAGE);
    for (const entry of entries) this.hand(entry);
    return entries.length > 0;
  }

  take(line: UnitLine): JournalEntry | undefined {
    const entry = line.take();
    if (entry) this.held--;
    return entry;
  }

  private hand(entry: JournalEntry): void {
    const { seq } = entry;
    const before = this.head;
    this.head = seq;
    const line = this.byUnit.get(entry.unit);
    // A mark of no unit says that numbers were left out.
    if (!line && entry.unit !== '') this.stray(entry);
    if (!line) return;
    // A replay begins at the oldest state: what others have already is not for them.
    if (seq > line.runner.seq) this.give(line, entry, before);
  }

  private give(line: UnitLine, entry: JournalEntry, before: number): void {
    if (line.passed === 0 && line.length < MOST_OWN) {
      line.put(entry);
      this.held++;
      return;
    }
    if (line.passed === 0) this.again = Math.min(this.again ?? before, before);
    line.passed++;
  }

  /** Whether every unit of which entries were passed over can take more. */
  private isRoom(): boolean {
    return this.lines.every((line) => line.passed === 0 || line.length < MOST_OWN - PAGE);
  }

  private fillAgain(): boolean {
    const entries = this.read(this.again!, PAGE);
    for (const entry of entries) {
      if (entry.seq > this.head) break;
      this.again = entry.seq;
      const line = this.byUnit.get(entry.unit);
      if (!line || line.passed === 0 || entry.seq <= line.newest) continue;
      line.put(entry);
      line.passed--;
      this.held++;
    }
    if (this.lines.every(({ passed }) => passed === 0)) this.again = null;
    return entries.length > 0;
  }
}
