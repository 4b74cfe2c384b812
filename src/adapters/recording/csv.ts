/** A record that is not CSV after RFC 4180; `row` counts records from 1, the header included. */
export class CsvFault extends Error {
  constructor(
    readonly row: number,
    readonly what: string,
  ) {
    super(`row ${row}: ${what}`);
  }
}

/** No record of a recording comes near this; an unclosed quote must not swallow a whole file. */
const LONGEST_RECORD = 4 << 20;

function splitQuoted(record: string, row: number): string[] {
  const fields: string[] = [];
  let at = 0;
  for (;;) {
    if (record[at] !== '"') {
      const comma = record.indexOf(',', at);
      const field = comma < 0 ? record.slice(at) : record.slice(at, comma);
      if (field.includes('"'))
        throw new CsvFault(row, 'a quote inside a field that has none around it');
      fields.push(field);
      if (comma < 0) return fields;
      at = comma + 1;
      continue;
    }
    let field = '';
    at++;
    for (;;) {
      const quote = record.indexOf('"', at);
      if (quote < 0) throw new CsvFault(row, 'a quoted field that does not end');
      field += record.slice(at, quote);
      at = quote + 1;
      if (record[at] !== '"') break;
      field += '"';
      at++;
    }
    fields.push(field);
    if (at === record.length) return fields;
    if (record[at] !== ',') throw new CsvFault(row, 'text after the end of a quoted field');
    at++;
  }
}

/** One record and whether its line end was there: the last one of a cut file has none. */
export interface CsvRecord {
  readonly row: number;
  readonly fields: string[];
  readonly complete: boolean;
}

/**
 * Cuts a stream of text into records after RFC 4180: comma, quotes doubled inside quotes, line
 * breaks inside quotes, lines ended by CRLF or LF, a byte order mark in front. Blank lines are
 * skipped and counted. Text comes in pieces of any size.
 */
export class CsvParser {
  blankLines = 0;
  private rest = '';
  /** Lines of a record whose quotes are still open. */
  private open = '';
  private row = 0;
  private begun = false;

  /** Takes a piece in and gives the records that it completes. */
  *push(text: string): Generator<CsvRecord> {
    let piece = this.rest + text;
    if (!this.begun && piece.length > 0) {
      this.begun = true;
      if (piece.charCodeAt(0) === 0xfeff) piece = piece.slice(1);
    }
    let from = 0;
    for (;;) {
      const end = piece.indexOf('\n', from);
      if (end < 0) break;
      const line = piece.slice(from, end + 1);
      from = end + 1;
      const record = this.line(line, true);
      if (record) yield record;
    }
    this.rest = piece.slice(from);
    this.guard(this.rest.length);
  }

  /** The record that the end of the text leaves, if any. */
  *end(): Generator<CsvRecord> {
    const line = this.rest;
    this.rest = '';
    if (line === '' && this.open === '') return;
    const record = this.line(line, false);
    if (record) yield record;
    else if (this.open !== '') throw new CsvFault(this.row + 1, 'a quoted field that does not end');
  }

  private line(line: string, complete: boolean): CsvRecord | null {
    const whole = this.open + line;
    if (this.open !== '' || line.includes('"')) {
      let quotes = 0;
      for (let i = whole.indexOf('"'); i >= 0; i = whole.indexOf('"', i + 1)) quotes++;
      if (quotes % 2 === 1) {
        this.open = whole;
        this.guard(whole.length);
        return null;
      }
    }
    this.open = '';
    const record = whole.replace(/\r?\n$/, '');
    if (record.trim() === '') {
      this.blankLines++;
      return null;
    }
    this.row++;
    const fields = record.includes('"') ? splitQuoted(record, this.row) : record.split(',');
    return { row: this.row, fields, complete };
  }

  private guard(length: number): void {
    if (length <= LONGEST_RECORD) return;
    const what =
      this.open === ''
        ? 'no line end within four million characters'
        : 'a quoted field that does not end within four million characters';
    throw new CsvFault(this.row + 1, what);
  }
}
