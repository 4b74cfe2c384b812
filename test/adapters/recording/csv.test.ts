import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CsvFault, CsvParser } from '../../../src/adapters/recording/csv.js';

function parse(text: string, piece = text.length || 1): string[][] {
  const parser = new CsvParser();
  const rows: string[][] = [];
  for (let i = 0; i < text.length; i += piece) {
    for (const { fields } of parser.push(text.slice(i, i + piece))) rows.push(fields);
  }
  for (const { fields } of parser.end()) rows.push(fields);
  return rows;
}

function quote(field: string): string {
  return /[",\r\n]/.test(field) ? `"${field.replaceAll('"', '""')}"` : field;
}

describe('CSV after RFC 4180', () => {
  it.each([
    ['LF', 'a,b\n1,2\n'],
    ['CRLF', 'a,b\r\n1,2\r\n'],
    ['no line end at the end', 'a,b\n1,2'],
    ['a byte order mark', '\ufeffa,b\n1,2\n'],
    ['quotes around everything', '"a","b"\r\n"1","2"\r\n'],
    ['blank lines', 'a,b\n\n1,2\n \r\n\n'],
  ])('reads %s alike', (_, text) => {
    expect(parse(text)).toEqual([
      ['a', 'b'],
      ['1', '2'],
    ]);
  });

  it('reads commas, quotes and line breaks inside quotes, and empty fields', () => {
    expect(parse('"a,b","say ""so""","two\r\nlines",\n,,,')).toEqual([
      ['a,b', 'say "so"', 'two\r\nlines', ''],
      ['', '', '', ''],
    ]);
  });

  it('gives back what was written, however the text is cut into pieces', () => {
    const field = fc.string({ unit: fc.constantFrom('a', '1', ',', '"', '\n', '\r', ' ', '.') });
    const rows = fc.array(fc.array(field, { minLength: 2, maxLength: 4 }), { maxLength: 6 });
    fc.assert(
      fc.property(
        rows,
        fc.integer({ min: 1, max: 9 }),
        fc.constantFrom('\n', '\r\n'),
        (all, piece, end) => {
          const text = all.map((row) => row.map(quote).join(',') + end).join('');
          // Two fields at least, so that no record looks like a blank line.
          expect(parse(text, piece)).toEqual(all);
        },
      ),
      { seed: 4180 },
    );
  });

  it.each([
    ['a quoted field that does not end', 'a,b\n1,"2\n3,4\n', 2],
    ['text after the end of a quoted field', 'a,b\n"1"x,2\n', 2],
    ['a quote inside a field', 'a,b\n1,2\n1"",2\n', 3],
  ])('names the row of %s', (what, text, row) => {
    let fault: unknown;
    try {
      parse(text);
    } catch (error) {
      fault = error;
    }
    expect(fault).toBeInstanceOf(CsvFault);
    expect((fault as CsvFault).row).toBe(row);
    expect((fault as CsvFault).what).toContain(what);
  });

  it('does not swallow a file after an unclosed quote', () => {
    const parser = new CsvParser();
    const push = () => {
      for (let i = 0; i < 1000; i++)
        for (const _ of parser.push(`"${'x'.repeat(10_000)}\n`.slice(i > 0 ? 1 : 0)));
    };
    expect(push).toThrow(/does not end within/);
  });
});
