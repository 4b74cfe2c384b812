/** 0 good, 1 uncertain, 2 bad; 9 marks that a scan was closed at its deadline. */
export const JOURNAL_QUALITY = { good: 0, uncertain: 1, bad: 2 } as const;
export type ReadingQuality = keyof typeof JOURNAL_QUALITY;
export const CLOSE_MARK = 9;
/** Marks that numbers were left out before it: those of a damaged journal may have been used. */
export const LEFT_OUT_MARK = 7;

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

/** All scans of the unit up to this index were closed here; no unit: numbers were left out. */
export interface CloseEntry {
  readonly kind: 'close';
  readonly seq: number;
  readonly unit: string;
  readonly scan_index: number;
  readonly arrival_ms: number;
}

export type JournalEntry = ReadingEntry | CloseEntry;

/** A row of the table `entries`. */
export interface JournalRow {
  readonly seq: number;
  readonly source: number;
  readonly time: number;
  readonly arrival: number;
  readonly value: number | null;
  readonly quality: number;
}

export function entryOf(
  row: JournalRow,
  { unit, channel }: { readonly unit: string; readonly channel: string },
): JournalEntry {
  const { seq, time, arrival, quality } = row;
  if (quality === CLOSE_MARK || quality === LEFT_OUT_MARK) {
    return { kind: 'close', seq, unit, scan_index: time, arrival_ms: arrival };
  }
  const value = row.value ?? Number.NaN;
  const stated = quality === 0 ? 'good' : quality === 1 ? 'uncertain' : 'bad';
  return makeReading(seq, unit, channel, time, arrival, value, stated);
}

/** A reading as it will be read back: the file knows no negative zero. */
export function readingEntry(seq: number, reading: JournalReading): ReadingEntry {
  const { unit, channel, time_ms, arrival_ms, value, quality } = reading;
  return makeReading(seq, unit, channel, time_ms + 0, arrival_ms + 0, value + 0, quality);
}

/** Tens of thousands are made a second: one literal of one shape, several times as fast as spreads. */
function makeReading(
  seq: number,
  unit: string,
  channel: string,
  time_ms: number,
  arrival_ms: number,
  value: number,
  quality: ReadingQuality,
): ReadingEntry {
  return { kind: 'reading', seq, unit, channel, time_ms, arrival_ms, value, quality };
}
