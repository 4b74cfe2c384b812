import type { Statement } from 'better-sqlite3';
import { reasonOf } from '../../errors.js';
import { type Database, emptyBytes, openDatabase, storeFailure } from './database.js';
import { isDamage, moveAside, type SetAside, takeOverRows, wasOurs } from './setAside.js';

/** 0 good, 1 uncertain, 2 bad; 9 marks that a scan was closed at its deadline. */
export const JOURNAL_QUALITY = { good: 0, uncertain: 1, bad: 2 } as const;
export type ReadingQuality = keyof typeof JOURNAL_QUALITY;
const CLOSE_MARK = 9;
/** Marks that numbers were left out before it: those of a damaged journal may have been used. */
const LEFT_OUT_MARK = 7;
/** More numbers than a journal can have given since what is known of it [entries]. */
const LEFT_OUT = 2 ** 24;
/** Newest entries of a damaged journal that are taken over: hours or days of a plant. */
const MOST_TAKEN_OVER = 1_000_000;

/** A reading on its way into the journal; `value` in SI units (mV as it is), NaN = none. */
export interface JournalReading {
  readonly unit: string;
  readonly channel: string;
  readonly time_ms: number;
  readonly arrival_ms: number;
  readonly value: number;
  readonly quality: ReadingQuality;
}

export type ReadingEntry = { readonly kind: 'reading'; readonly seq: number } & JournalReading;

export type JournalEntry =
  | ReadingEntry
  /** All scans of the unit up to this index were closed here; no unit: numbers were left out. */
  | {
      readonly kind: 'close';
      readonly seq: number;
      readonly unit: string;
      readonly scan_index: number;
      readonly arrival_ms: number;
    };

interface Row {
  seq: number;
  source: number;
  time: number;
  arrival: number;
  value: number | null;
  quality: number;
}

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
  private select!: Statement;
  private selectUnit!: Statement;
  private last = 0;
  private readonly numbers = new Map<string, number>();
  private readonly names = new Map<number, { unit: string; channel: string }>();

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
    try {
      this.open(openDatabase(this.file, 'full', JOURNAL_SCHEMA));
    } catch (thrown) {
      if (!isDamage(thrown) || !wasOurs(this.file, 'entries')) throw thrown;
      this.renew(thrown);
    }
  }

  private open(database: Database): void {
    this.database = database;
    this.numbers.clear();
    this.names.clear();
    this.insert = database.prepare(
      'INSERT INTO entries (seq, source, time, arrival, value, quality) VALUES (?, ?, ?, ?, ?, ?)',
    );
    this.select = database.prepare('SELECT * FROM entries WHERE seq > ? ORDER BY seq LIMIT ?');
    // The plus keeps the walk to the numbers' own order.
    this.selectUnit = database.prepare(
      `SELECT * FROM entries WHERE seq > ? AND seq <= ?
       AND +source IN (SELECT no FROM sources WHERE unit = ?) ORDER BY seq`,
    );
    const sources = database.prepare('SELECT no, unit, channel FROM sources').all();
    for (const row of sources as { no: number; unit: string; channel: string }[]) {
      this.numbers.set(key(row.unit, row.channel), row.no);
      this.names.set(row.no, row);
    }
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
    this.last = Math.max(this.last, last, this.reach());
    if (this.last > 0) {
      const seq = this.last + LEFT_OUT;
      const source = this.sourceNumber(UNIT_ITSELF, UNIT_ITSELF);
      this.insert.run(seq, source, 0, Date.now(), null, LEFT_OUT_MARK);
      this.last = seq;
    }
    this.setAside({ kept, reason: reasonOf(thrown), rows });
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
    this.database?.close();
    this.database = null;
  }

  /** Empty pages within the file, which are written to before it grows [bytes]. */
  get emptyBytes(): number {
    return emptyBytes(this.opened());
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
    return this.commit(readings.length, (seq, i) => {
      const reading = readings[i]!;
      const value = Number.isNaN(reading.value) ? null : reading.value;
      this.insert.run(
        seq,
        this.sourceNumber(reading.unit, reading.channel),
        reading.time_ms,
        reading.arrival_ms,
        value,
        JOURNAL_QUALITY[reading.quality],
      );
    });
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
    return this.commit(marks.length, (seq, i) => {
      const { unit, scan_index } = marks[i]!;
      const source = this.sourceNumber(unit, UNIT_ITSELF);
      this.insert.run(seq, source, scan_index, arrival_ms, null, CLOSE_MARK);
    });
  }

  /** Entries after `seq`, oldest first, at most `most`. */
  read(seq: number, most: number): JournalEntry[] {
    try {
      const rows = this.mended(() => this.select.all(seq, most) as Row[]);
      return rows.map((row) => this.entry(row));
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
      const rows = this.mended(() => this.selectUnit.all(seq, end, unit) as Row[]);
      return { entries: rows.map((row) => this.entry(row)), seq: end };
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
    // Arrival times follow the numbers but for a clock that was set: no index is worth its writes.
    let low = (this.first('SELECT min(seq) AS n FROM entries') ?? 1) - 1;
    let high = this.last;
    // Of the newest entry up to a number: some numbers may have been left out.
    const at = this.opened()
      .prepare('SELECT arrival FROM entries WHERE seq <= ? ORDER BY seq DESC LIMIT 1')
      .pluck();
    while (low < high) {
      const middle = Math.ceil((low + high) / 2);
      if ((at.get(middle) as number) < arrival_ms) low = middle;
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
      return this.opened()
        .prepare(
          'DELETE FROM entries WHERE seq IN (SELECT seq FROM entries WHERE seq <= ? ORDER BY seq LIMIT ?)',
        )
        .run(end, most).changes;
    } catch (thrown) {
      throw storeFailure(`thinning the journal ${this.file}`, thrown);
    }
  }

  private commit(count: number, write: (seq: number, i: number) => void): number {
    if (count === 0) return this.last;
    let known = this.names.size;
    try {
      this.mended(() => {
        known = this.names.size;
        this.opened().transaction(() => {
          for (let i = 0; i < count; i++) write(this.last + 1 + i, i);
        })();
      });
    } catch (thrown) {
      this.forgetSources(known);
      throw storeFailure(`writing to the journal ${this.file}`, thrown);
    }
    this.last += count;
    return this.last;
  }

  private sourceNumber(unit: string, channel: string): number {
    const known = this.numbers.get(key(unit, channel));
    if (known !== undefined) return known;
    const no = Math.max(0, ...this.names.keys()) + 1;
    this.opened()
      .prepare('INSERT INTO sources (no, unit, channel) VALUES (?, ?, ?)')
      .run(no, unit, channel);
    this.numbers.set(key(unit, channel), no);
    this.names.set(no, { unit, channel });
    return no;
  }

  /** A transaction that failed took the sources it had named with it. */
  private forgetSources(known: number): void {
    for (const [no, name] of [...this.names].slice(known)) {
      this.names.delete(no);
      this.numbers.delete(key(name.unit, name.channel));
    }
  }

  private entry(row: Row): JournalEntry {
    const name = this.names.get(row.source)!;
    if (row.quality === CLOSE_MARK || row.quality === LEFT_OUT_MARK) {
      return {
        kind: 'close',
        seq: row.seq,
        unit: name.unit,
        scan_index: row.time,
        arrival_ms: row.arrival,
      };
    }
    return {
      kind: 'reading',
      seq: row.seq,
      unit: name.unit,
      channel: name.channel,
      time_ms: row.time,
      arrival_ms: row.arrival,
      value: row.value ?? Number.NaN,
      quality: row.quality === 0 ? 'good' : row.quality === 1 ? 'uncertain' : 'bad',
    };
  }

  private opened(): Database {
    if (!this.database) throw new RangeError('journal must be started, got one that is not');
    return this.database;
  }

  private first(sql: string): number | null {
    return this.opened().prepare(sql).pluck().get() as number | null;
  }
}

function key(unit: string, channel: string): string {
  return `${unit}\n${channel}`;
}
