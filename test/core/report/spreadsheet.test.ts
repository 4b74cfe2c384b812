import { describe, expect, it } from 'vitest';
import { toCsv } from '../../../src/adapters/http/csv.js';
import { csvOf, tabsOf } from '../../../src/adapters/page/lib/cells.js';
import { CsvParser } from '../../../src/adapters/recording/csv.js';
import { spreadsheetField } from '../../../src/core/report/spreadsheet.js';

const FORMULAS = [
  '=1+1',
  '+cmd',
  '-cmd',
  '-2+3',
  '@SUM(A1)',
  '\t=1',
  '\r=1',
  '\n=1',
  '  =1',
  '\u00a0=1',
  '\u0000=1',
  '\uff1d1+1',
  '=HYPERLINK("http://x","y")',
];
const NUMBERS = ['-5', '+5', '-0.25', '-.5', '-1e-9', '5.', '1.5'];
const WORDS = ['u1', '2026-01-01T00:00:00Z', "it's", 'a=b', 'a,"b"', 'two\nlines', '', 'x - y'];

/** What a spreadsheet finds in the only field of a row. */
function cellOf(text: string): string {
  const parser = new CsvParser();
  const rows = [...parser.push(text), ...parser.end()].map(({ fields }) => fields);
  return rows[0]?.[1] ?? '';
}

describe('a field for a spreadsheet', () => {
  it('is never taken for a formula, whatever a text begins with', () => {
    for (const text of FORMULAS) {
      const cell = cellOf(`a,${spreadsheetField(text)},b\r\n`);
      expect(cell).toBe(`'${text}`);
      // The page's own, as a file and for the clipboard.
      expect(csvOf([['a', text, 'b']])).toBe(`a,${spreadsheetField(text)},b`);
      expect(tabsOf([['a', text, 'b']]).split('\t')).toHaveLength(3);
      expect(tabsOf([['a', text, 'b']]).split('\t')[1]).toMatch(/^'/);
    }
  });

  it('keeps numbers with their signs, and every other text as it is', () => {
    for (const number of [-5, -0.25, -1e-9, 7, 0, -0]) {
      expect(spreadsheetField(number)).toBe(String(number));
    }
    for (const text of [...NUMBERS, ...WORDS]) {
      expect(cellOf(`a,${spreadsheetField(text)},b\r\n`)).toBe(text);
      expect(csvOf([['a', text, 'b']])).toBe(`a,${spreadsheetField(text)},b`);
    }
    expect([null, undefined, true].map(spreadsheetField)).toEqual(['', '', 'true']);
  });

  it('is what answers over HTTP have', () => {
    const rows = [{ no: -1.5, words: '=cmd' }];
    expect(toCsv(['no', 'words'], rows)).toBe("no,words\r\n-1.5,'=cmd\r\n");
  });
});
