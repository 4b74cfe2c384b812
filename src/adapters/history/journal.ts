import type { Statement } from 'better-sqlite3';
import { LEAST_DATE_MS } from '../../core/scan/assemble.js';
import { reasonOf } from '../../errors.js';
import { type Database, emptyBytes, openDatabase, storeFailure } from './database.js';
import {
  CLOSE_MARK,
  entryOf,
  JOURNAL_QUALITY,
  type JournalEntry,
  type JournalReading,
  type JournalRow,
  LEFT_OUT_MARK,
  readingEntry,
} from './journalEntry.js';
import { JournalSources } from './journalSources.js';
import { JournalTail } from './journalTail.js';
import { isDamage, moveAside, type SetAside, takeOverRows, wasOurs } from './setAside.js';
import { commitsBehindBreak } from './walCheck.js';

export type {
  JournalEntry,
  JournalReading,
  ReadingEntry,
  ReadingQuality,
} from './journalEntry.js';

/** More numbers than a journal can have given since what is known of it [entries]. */
const LEFT_OUT = 2 ** 24;
/** Newest entries of a damaged journal that are taken over: hours or days of a plant. */
const MOST_TAKEN_OVER = 1_000_000;

/** Rows that are written by one statement: half as dear as one by one. */
const TOGETHER = 32;
const COLUMNS = 'INSERT INTO entries (seq, source, time, arrival, value, quality) VALUES';
const ONE = '(?, ?, ?, ?, ?, ?)';
const FIELDS = 6;

export const JOURNAL_SCHEMA = [
  `CREATE TABLE sources (
     no INTEGER PRIMARY KEY, unit TEXT NOT NULL, channel TEXT NOT NULL, UNIQUE (unit, channel));
   -- time: source time in ms, or the scan index of a close mark; value: SI, NULL for a bad reading.
   CREATE TABLE entries (
     seq INTEGER PRIMARY KEY, source INTEGER NOT NULL, time INTEGER NOT NULL,
     arrival INTEGER NOT NULL, value REAL, quality INTEGER NOT NULL);`,
];

/** Stands for the unit itself as the source of its close marks. */
const UNIT_ITSELF = '';

/**
 * Readings in the order of their arrival, on the disk before they are acknowledged, and the marks
 * that say when a scan was closed by the clock: scans are made from what stands here and from
 * nothing else, so that a restart or a replay makes the same scans again.
 *
 * Entries are numbered from 1 on, without gaps but where a damaged journal was set aside; numbers are
 * never used twice.
 */
export class Journal {
  private database: Database | null = null;
  private insert!: Statement;
  private insertTogether!: Statement;
  private select!: Statement;
  private selectUnit!: Statement;
  private last = 0;
  private sources!: JournalSources;
  private readonly tail = new JournalTail();

  /**
   * @param reach number of the newest entry that anything else remembers
   * @param setAside told where the file was damaged and a fresh one has been begun
   */
  constructor(
    private readonly file: string,
    private readonly reach: () => number = () => 0,
    private readonly setAside: (what: SetAside) => void = () => undefined,
  ) {}

  /** @throws RockhourError STORE_FAILED; not where it was damaged: it is set aside then */
  start(): void {
    if (this.database) return;
    // Before SQLite itself looks at it: it would throw the rest away.
    const behind = commitsBehindBreak(`${this.file}-wal`);
    // One alone a power cut leaves, of a commit that nobody was told of.
    if (behind > 1 && wasOurs(this.file, 'entries')) {
      const what = Number.isFinite(behind) ? `${behind} commits or more` : 'all commits';
      this.renew(new Error(`its write-ahead log is broken: ${what} in it cannot be read`));
      return;
    }
    try {
      this.open(openDatabase(this.file, 'full', JOURNAL_SCHEMA));
    } catch (thrown) {
      if (!isDamage(thrown) || !wasOurs(this.file, 'entries')) throw thrown;
      this.renew(thrown);
      return;
    }
    const [last, reach] = [this.last, this.reach()];
    // The newest is never deleted. Numbers given once more would be taken for worked off.
    if (reach > last) {
      this.renew(new Error(`it ends with entry ${last}, where ${reach} had been worked off`));
    }
  }

  private open(database: Database): void {
    this.database = database;
    this.tail.clear();
    this.insert = database.prepare(`${COLUMNS} ${ONE}`);
    this.insertTogether = database.prepare(
      `${COLUMNS} ${new Array(TOGETHER).fill(ONE).join(', ')}`,
    );
    this.select = database.prepare('SELECT * FROM entries WHERE seq > ? ORDER BY seq LIMIT ?');
    // The plus keeps the walk to the numbers' own order.
    this.selectUnit = database.prepare(
      `SELECT * FROM entries WHERE seq > ? AND seq <= ?
       AND +source IN (SELECT no FROM sources WHERE unit = ?) ORDER BY seq`,
    );
    this.sources = new JournalSources(database);
    this.last = this.first('SELECT max(seq) AS n FROM entries') ?? 0;
  }

  /**
   * Sets the damaged file aside and goes on with a fresh one that has what could still be read, behind
   * numbers that were left out.
   */
  private renew(thrown: unknown): void {
    const { last } = this;
    this.stop();
    const kept = moveAside(this.file);
    const fresh = openDatabase(this.file, 'full', JOURNAL_SCHEMA);
    const rows = fresh.transaction(() =>
      takeOverRows(kept, fresh, [
        { table: 'sources', key: 'no', most: MOST_TAKEN_OVER },
        { table: 'entries', key: 'seq', most: MOST_TAKEN_OVER },
      ]),
    )();
    // What lost its source cannot be told any more.
    fresh.exec('DELETE FROM entries WHERE source NOT IN (SELECT no FROM sources)');
    this.open(fresh);
    const given = Math.max(this.last, last, this.reach());
    const lost = countMissing(fresh, given);
    this.last = given;
    if (this.last > 0) {
      const seq = this.last + LEFT_OUT;
      const source = this.sources.numberOf(UNIT_ITSELF, UNIT_ITSELF);
      this.insert.run(seq, source, 0, Date.now(), null, LEFT_OUT_MARK);
      this.last = seq;
    }
    this.setAside({ kept, reason: reasonOf(thrown), rows, lost });
  }

  /** Once more on a fresh file where this one is damaged. */
  private mended<T>(act: () => T): T {
    try {
      return act();
    } catch (thrown) {
      if (!isDamage(thrown)) throw thrown;
      this.renew(thrown);
      return act();
    }
  }

  stop(): void {
    this.tail.clear();
    this.database?.close();
    this.database = null;
  }

  /** Empty pages within the file, which are written to before it grows [bytes]. */
  get emptyBytes(): number {
    return this.mended(() => emptyBytes(this.opened()));
  }

  /** Number of the newest entry, 0 before the first. */
  get lastSeq(): number {
    return this.last;
  }

  /**
   * Writes readings in one synced transaction: when it returns, they are on the disk.
   * @returns the number of the newest entry
   */
  append(readings: readonly JournalReading[]): number {
    const begin = this.last + 1;
    return this.commit(readings.map((reading, i) => readingEntry(begin + i, reading)));
  }

  /** Notes that all scans of a unit up to `scan_index` are closed from here on. */
  appendClose(unit: string, scan_index: number, arrival_ms: number): number {
    return this.appendCloses([{ unit, scan_index }], arrival_ms);
  }

  /** The same of several units, in one synced transaction. */
  appendCloses(
    marks: readonly { readonly unit: string; readonly scan_index: number }[],
    arrival_ms: number,
  ): number {
    const begin = this.last + 1;
    return this.commit(
      marks.map(({ unit, scan_index }, i) => {
        return { kind: 'close', seq: begin + i, unit, scan_index, arrival_ms };
      }),
    );
  }

  /** Entries after `seq`, oldest first, at most `most`. */
  read(seq: number, most: number): JournalEntry[] {
    const known = this.tail.behind(seq, most);
    if (known) return known;
    try {
      const rows = this.mended(() => this.select.all(seq, most) as JournalRow[]);
      return rows.map((row) => entryOf(row, this.sources.nameOf(row.source)));
    } catch (thrown) {
      throw storeFailure(`reading the journal ${this.file}`, thrown);
    }
  }

  /**
   * Entries of one unit behind `seq` and up to `through_seq`, oldest first, of a piece of the journal.
   *
   * @returns them, and the number up to which the journal was looked through
   */
  readUnit(
    unit: string,
    seq: number,
    through_seq: number,
    most: number,
  ): { entries: JournalEntry[]; seq: number } {
    try {
      const end = Math.min(through_seq, seq + most);
      const rows = this.mended(() => this.selectUnit.all(seq, end, unit) as JournalRow[]);
      const entries = rows.map((row) => entryOf(row, this.sources.nameOf(row.source)));
      return { entries, seq: end };
    } catch (thrown) {
      throw storeFailure(`reading the journal ${this.file}`, thrown);
    }
  }

  /** One entry; undefined where it is no more. */
  at(seq: number): JournalEntry | undefined {
    return this.read(seq - 1, 1).find((entry) => entry.seq === seq);
  }

  /** Number of the last entry that arrived before this time, 0 where there is none. */
  seqBefore(arrival_ms: number): number {
    return this.mended(() => this.findBefore(arrival_ms));
  }

  private findBefore(arrival_ms: number): number {
    // Arrival times follow the numbers but for a clock that was set: no index is worth its writes.
    let low = (this.first('SELECT min(seq) AS n FROM entries') ?? 1) - 1;
    let high = this.last;
    // Of the newest entry up to a number: some numbers may have been left out, and what came while this
    // machine's clock had lost its date would look older than all.
    const at = this.opened()
      .prepare(
        'SELECT arrival FROM entries WHERE seq <= ? AND arrival >= ? ORDER BY seq DESC LIMIT 1',
      )
      .pluck();
    const dated_ms = arrival_ms > LEAST_DATE_MS ? LEAST_DATE_MS : Number.MIN_SAFE_INTEGER;
    while (low < high) {
      const middle = Math.ceil((low + high) / 2);
      const came_ms = at.get(middle, dated_ms) as number | undefined;
      if (came_ms !== undefined && came_ms < arrival_ms) low = middle;
      else high = middle - 1;
    }
    return low;
  }

  /**
   * Deletes entries up to `seq`, so many at most, and never the newest, whose number is the memory
   * of all before.
   */
  forget(seq: number, most = 100_000): number {
    try {
      const end = Math.min(seq, this.last - 1);
      this.tail.clear();
      const sql =
        'DELETE FROM entries WHERE seq IN (SELECT seq FROM entries WHERE seq <= ? ORDER BY seq LIMIT ?)';
      return this.mended(() => this.opened().prepare(sql).run(end, most).changes);
    } catch (thrown) {
      throw storeFailure(`thinning the journal ${this.file}`, thrown);
    }
  }

  private commit(entries: readonly JournalEntry[]): number {
    if (entries.length === 0) return this.last;
    let known = this.sources.count;
    let shift = 0;
    try {
      this.mended(() => {
        known = this.sources.count;
        // On a fresh file, after damage, numbers go on behind those that were left out.
        shift = this.last + 1 - entries[0]!.seq;
        this.opened().transaction(() => this.insertAll(entries, shift))();
      });
    } catch (thrown) {
      this.sources.forgetBehind(known);
      throw storeFailure(`writing to the journal ${this.file}`, thrown);
    }
    this.last += entries.length;
    for (const entry of entries) {
      this.tail.add(shift === 0 ? entry : { ...entry, seq: entry.seq + shift });
    }
    return this.last;
  }

  private insertAll(entries: readonly JournalEntry[], shift: number): void {
    const whole = entries.length - (entries.length % TOGETHER);
    const values: unknown[] = [];
    for (let i = 0; i < whole; i += TOGETHER) {
      for (let j = 0; j < TOGETHER; j++) this.put(entries[i + j]!, shift, values, j * FIELDS);
      this.insertTogether.run(values);
    }
    values.length = FIELDS;
    for (let i = whole; i < entries.length; i++) {
      this.put(entries[i]!, shift, values, 0);
      this.insert.run(values);
    }
  }

  /** The fields of an entry into a row's place from `at` on. */
  private put(entry: JournalEntry, shift: number, values: unknown[], at: number): void {
    values[at] = entry.seq + shift;
    values[at + 3] = entry.arrival_ms;
    if (entry.kind === 'close') {
      values[at + 1] = this.sources.numberOf(entry.unit, UNIT_ITSELF);
      values[at + 2] = entry.scan_index;
      values[at + 4] = null;
      values[at + 5] = CLOSE_MARK;
      return;
    }
    values[at + 1] = this.sources.numberOf(entry.unit, entry.channel);
    values[at + 2] = entry.time_ms;
    values[at + 4] = Number.isNaN(entry.value) ? null : entry.value;
    values[at + 5] = JOURNAL_QUALITY[entry.quality];
  }

  private opened(): Database {
    if (!this.database) throw new RangeError('journal must be started, got one that is not');
    return this.database;
  }

  private first(sql: string): number | null {
    return this.opened().prepare(sql).pluck().get() as number | null;
  }
}

/**
 * Numbers up to one that was given out that no entry has, behind the oldest there is: lost ones. Those
 * that were left out before a mark were never given out.
 */
function countMissing(database: Database, given: number): number {
  const sql = `SELECT coalesce(sum(gap), 0) AS gaps, max(seq) AS last FROM (
      SELECT seq, iif(quality = ${LEFT_OUT_MARK}, 0, seq - 1 - lag(seq) OVER (ORDER BY seq)) AS gap
      FROM entries)`;
  const { gaps, last } = database.prepare(sql).get() as { gaps: number; last: number | null };
  return last === null ? given : gaps + given - last;
}
