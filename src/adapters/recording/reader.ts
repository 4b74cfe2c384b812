import { createReadStream } from 'node:fs';
import { rawToSi, voltageFinish } from '../../core/scan/convert.js';
import { type HoldState, hold, startHold } from '../../core/scan/hold.js';
import type { Scan } from '../../core/scan/scan.js';
import { fileReasonOf, RockhourError } from '../../errors.js';
import { type Columns, type RecordedUnit, readHeader } from './columns.js';
import { CsvFault, CsvParser, type CsvRecord } from './csv.js';
import { parseField } from './fields.js';
import { parseTime } from './time.js';

/** What a recording held besides readings; nothing of it is passed over in silence. */
export interface RecordingCounts {
  bytes: number;
  /** Rows with a time, repeated ones included. */
  rows: number;
  /** Rows replaced by a later one of the same time. */
  repeated: number;
  /** Fields with text where a number belongs, and where the first of them stand. */
  text: number;
  textExamples: string[];
  /** Rows with fewer or more fields than the header. */
  shortRows: number;
  longRows: number;
  blankLines: number;
  /** Values carried on for channels that report by exception. */
  held: number;
  unknownColumns: readonly string[];
  absentChannels: readonly string[];
}

interface Row {
  readonly row: number;
  readonly time_ms: number;
  readonly values: Float64Array;
  readonly heard: Uint8Array;
}

export interface RecordingOptions {
  /** Channel ids of other units of the site: their columns are no surprise. */
  readonly otherChannels?: ReadonlySet<string>;
  /** Bytes per piece of the file; for tests. */
  readonly piece_bytes?: number;
}

/** Reads a recording as scans of one unit, piece by piece: memory does not grow with the file. */
export class RecordingReader {
  readonly counts: RecordingCounts = {
    bytes: 0,
    rows: 0,
    repeated: 0,
    text: 0,
    textExamples: [],
    shortRows: 0,
    longRows: 0,
    blankLines: 0,
    held: 0,
    unknownColumns: [],
    absentChannels: [],
  };
  private columns: Columns | null = null;
  /** The newest row waits, as the next one may be of the same time and then replaces it. */
  private waiting: Row | null = null;
  private readonly toSi: readonly ((raw: number) => number)[];
  private readonly finishVoltages: ((values: Float64Array) => void) | null;
  private readonly holdState: HoldState;

  constructor(
    private readonly path: string,
    private readonly unit: RecordedUnit,
    private readonly options: RecordingOptions = {},
  ) {
    this.toSi = unit.channels.map(rawToSi);
    this.finishVoltages = voltageFinish(unit);
    this.holdState = startHold(unit);
  }

  /**
   * The scans, in batches as the file comes in. Rows before a fault are handed out before it is
   * thrown.
   * @throws RockhourError RECORDING_*
   */
  async *batches(): AsyncGenerator<Scan[]> {
    const parser = new CsvParser();
    // Not fatal: a stray byte of a foreign alphabet in a comment column harms nothing.
    const decoder = new TextDecoder('utf-8', { ignoreBOM: true });
    for await (const piece of this.pieces()) {
      const first = this.counts.bytes === 0;
      this.counts.bytes += piece.length;
      if (first) this.refuseUtf16(piece);
      yield* this.batch(parser.push(decoder.decode(piece, { stream: true })));
      this.counts.blankLines = parser.blankLines;
    }
    yield* this.batch(parser.push(decoder.decode()));
    yield* this.batch(parser.end());
    this.counts.blankLines = parser.blankLines;
    if (this.columns === null) {
      throw new RockhourError('RECORDING_MALFORMED', `${this.path} is empty`, {
        advice: 'A recording has a header with the column time and the channel ids.',
      });
    }
    if (this.waiting !== null) yield [this.finish(this.waiting)];
    this.waiting = null;
  }

  private async *pieces(): AsyncGenerator<Buffer> {
    const stream = createReadStream(this.path, {
      highWaterMark: this.options.piece_bytes ?? 256 * 1024,
    });
    try {
      for await (const piece of stream) yield piece as Buffer;
    } catch (error) {
      throw new RockhourError(
        'RECORDING_UNREADABLE',
        `the recording ${this.path || '""'} cannot be read: ${fileReasonOf(error)}`,
        { cause: error },
      );
    } finally {
      stream.destroy();
    }
  }

  private refuseUtf16(piece: Buffer): void {
    const mark = piece.subarray(0, 2).toString('hex');
    if (mark !== 'fffe' && mark !== 'feff') return;
    throw new RockhourError('RECORDING_MALFORMED', `${this.path} is UTF-16 text`, {
      advice: 'Save it as UTF-8.',
    });
  }

  private *batch(records: Generator<CsvRecord>): Generator<Scan[]> {
    const scans: Scan[] = [];
    try {
      for (const record of records) {
        if (this.columns === null) this.header(record);
        else {
          const scan = this.take(this.columns, record);
          if (scan !== null) scans.push(scan);
        }
      }
    } catch (error) {
      // What came before the fault is sound.
      if (this.waiting !== null) scans.push(this.finish(this.waiting));
      this.waiting = null;
      if (scans.length > 0) yield scans;
      if (!(error instanceof CsvFault)) throw error;
      throw new RockhourError('RECORDING_MALFORMED', `${this.path}, ${error.message}`, {
        cause: error,
      });
    }
    if (scans.length > 0) yield scans;
  }

  private header(record: CsvRecord): void {
    const others = this.options.otherChannels ?? new Set();
    this.columns = readHeader(record.fields, this.unit, others, this.path);
    this.counts.unknownColumns = this.columns.unknown;
    this.counts.absentChannels = this.columns.absent;
  }

  /** Takes a row in; gives the one before it as a scan, unless this one replaces it. */
  private take(columns: Columns, record: CsvRecord): Scan | null {
    const row = this.read(columns, record);
    this.counts.rows++;
    const before = this.waiting;
    if (before !== null && row.time_ms < before.time_ms) {
      throw new RockhourError(
        'RECORDING_TIME_BACK',
        `${this.path}, row ${row.row}: time runs back, from ${new Date(before.time_ms).toISOString()} ` +
          `in row ${before.row} to ${new Date(row.time_ms).toISOString()}`,
      );
    }
    this.waiting = row;
    if (before === null) return null;
    if (row.time_ms === before.time_ms) {
      this.counts.repeated++;
      return null;
    }
    return this.finish(before);
  }

  private read(columns: Columns, { row, fields, complete }: CsvRecord): Row {
    if (fields.length > columns.count) this.counts.longRows++;
    let usable = fields.length;
    if (fields.length < columns.count) {
      this.counts.shortRows++;
      // The last field of a file that was cut off may have lost digits.
      if (!complete) usable--;
    }
    const timeText = columns.time < usable ? (fields[columns.time] as string) : '';
    const time_ms = parseTime(timeText);
    if (Number.isNaN(time_ms)) {
      throw new RockhourError(
        'RECORDING_MALFORMED',
        `${this.path}, row ${row}: the time ${JSON.stringify(timeText)} is neither ISO 8601 with ` +
          'an offset (2025-03-01T06:00:00Z) nor seconds',
      );
    }
    const values = new Float64Array(this.unit.channels.length).fill(Number.NaN);
    const heard = new Uint8Array(values.length);
    for (let i = 0; i < Math.min(usable, columns.count); i++) {
      const index = columns.channel[i] as number;
      const channel = index < 0 ? undefined : this.unit.channels[index];
      if (channel === undefined) continue;
      const field = parseField(fields[i] as string, channel.role);
      if (field.kind === 'text') this.noteText(row, channel.id, fields[i] as string);
      if (field.kind === 'empty') continue;
      heard[index] = 1;
      values[index] = (this.toSi[index] as (raw: number) => number)(field.value);
    }
    return { row, time_ms, values, heard };
  }

  private noteText(row: number, column: string, text: string): void {
    this.counts.text++;
    if (this.counts.textExamples.length >= 3) return;
    const shown = text.length > 40 ? `${text.slice(0, 40)}...` : text;
    this.counts.textExamples.push(`row ${row}, ${column}: ${JSON.stringify(shown)}`);
  }

  private finish({ time_ms, values, heard }: Row): Scan {
    const held = hold(this.unit, this.holdState, time_ms, values, heard);
    for (const one of held) this.counts.held += one;
    this.finishVoltages?.(values);
    return { time_ms, values, held };
  }
}
