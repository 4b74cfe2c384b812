import { LineWriter } from './lines.js';

/** A number or a word; null and NaN leave the field empty. */
export type RecordedField = number | string | null;

function csvField(value: RecordedField): string {
  if (value === null || (typeof value === 'number' && !Number.isFinite(value))) return '';
  const text = String(value);
  return /[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}

/**
 * Writes a recording after RFC 4180: the column `time` as ISO 8601 UTC, then one column per channel
 * in its raw unit. Numbers are written so that reading them gives the same number again.
 */
export class RecordingWriter {
  private readonly out: LineWriter;

  private constructor(
    path: string,
    private readonly columns: readonly string[],
  ) {
    this.out = new LineWriter(path);
  }

  static async open(path: string, columns: readonly string[]): Promise<RecordingWriter> {
    const writer = new RecordingWriter(path, columns);
    await writer.out.write(`${['time', ...columns].map(csvField).join(',')}\r`);
    return writer;
  }

  get rows(): number {
    return this.out.lines - 1;
  }

  /** @throws RangeError where `fields` has another length than the columns. */
  async write(time_ms: number, fields: ArrayLike<RecordedField>): Promise<void> {
    if (fields.length !== this.columns.length) {
      throw new RangeError(`fields must have ${this.columns.length} entries, got ${fields.length}`);
    }
    let line = new Date(time_ms).toISOString();
    for (let i = 0; i < fields.length; i++) line += `,${csvField(fields[i] ?? null)}`;
    await this.out.write(`${line}\r`);
  }

  close(): Promise<void> {
    return this.out.close();
  }
}
