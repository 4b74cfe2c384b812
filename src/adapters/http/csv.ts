import { spreadsheetField } from '../../core/report/spreadsheet.js';
import type { HistoryPoint } from './service.js';

/** What an answer about what lies ahead stands on: leading columns, the same in every row. */
export const STAND_COLUMNS = ['unit', 'time', 'age_s', 'valid_until', 'stale', 'quality'] as const;

export interface Stand {
  readonly unit: string;
  /** Source time of the estimate. */
  readonly time: string;
  readonly age_s: number | null;
  readonly valid_until: string;
  readonly stale: boolean;
  readonly quality: string;
}

/** The fields of `STAND_COLUMNS`; `stale` is true or false. */
export function standOf({ unit, time, age_s, valid_until, stale, quality }: Stand): HistoryPoint {
  return { unit, time, age_s, valid_until, stale: String(stale), quality };
}

/** RFC 4180: header row, CRLF, quotes where needed; null is an empty field, no text is a formula. */
export function toCsv(
  columns: readonly string[],
  rows: readonly Readonly<Record<string, number | string | null>>[],
): string {
  const lines = [columns.map(spreadsheetField).join(',')];
  for (const row of rows)
    lines.push(columns.map((column) => spreadsheetField(row[column])).join(','));
  return `${lines.join('\r\n')}\r\n`;
}

/** CSV where the query says so, or else the Accept header names it and not JSON. */
export function wantsCsv(format: 'json' | 'csv' | undefined, accept: string | undefined): boolean {
  if (format !== undefined) return format === 'csv';
  return /\btext\/csv\b/i.test(accept ?? '') && !/application\/json/i.test(accept ?? '');
}
