import type { Fault, WrittenBlock } from './scheduleAsk.js';

/** Columns of a schedule written as CSV, in any order; `power_MW_el` may be left out or empty. */
export const SCHEDULE_COLUMNS = ['from', 'to', 'mode', 'power_MW_el'] as const;

/** Digits of a number in CSV: what floats add beyond them is noise. */
const DIGITS = 9;

/** A number as it stands in CSV, to 9 significant digits; anything else as it is. */
export function csvValue<T>(value: T): T | number {
  return typeof value === 'number' && Number.isFinite(value)
    ? Number(value.toPrecision(DIGITS))
    : value;
}

/** Name of a block's field in a CSV: its row, the header being row 1. */
export function csvPath(rows: readonly number[]): (index: number, field: string) => string {
  return (index, field) => `row ${rows[index]} ${field}`;
}

/**
 * Blocks of a schedule written as CSV after RFC 4180: a header that names the columns, comma, quotes
 * doubled inside quotes, CRLF or LF; a byte order mark is passed over, so are blank lines.
 *
 * @returns the blocks as written with the row of each (the header is row 1), or what is wrong
 */
export function readScheduleCsv(
  text: string,
):
  | { readonly blocks: readonly WrittenBlock[]; readonly rows: readonly number[] }
  | { readonly faults: readonly Fault[] } {
  const records = recordsOf(text.replace(/^\ufeff/, ''));
  if ('fault' in records) return { faults: [records.fault] };
  const [header, ...body] = records.rows;
  const names = (header?.fields ?? []).map((name) => name.trim());
  const faults: Fault[] = [];
  const known: readonly string[] = SCHEDULE_COLUMNS;
  const expected = `the columns ${SCHEDULE_COLUMNS.join(',')}`;
  const strange = names.filter((name, i) => !known.includes(name) || names.indexOf(name) !== i);
  const missing = ['from', 'to', 'mode'].filter((name) => !names.includes(name));
  if (strange.length > 0 || missing.length > 0) {
    return { faults: [{ field: 'row 1', value: names.join(','), expected }] };
  }
  for (const { row, fields } of body) {
    if (fields.length === names.length) continue;
    const value = fields.join(',');
    faults.push({ field: `row ${row}`, value, expected: `${names.length} fields, as the header` });
  }
  if (faults.length > 0) return { faults };
  return {
    rows: body.map(({ row }) => row),
    blocks: body.map(({ fields }) =>
      Object.fromEntries(names.map((name, i) => [name, (fields[i] as string).trim()])),
    ),
  };
}

interface CsvRow {
  readonly row: number;
  readonly fields: readonly string[];
}

/** All records of a text. A field in quotes may hold commas, line ends and doubled quotes. */
function recordsOf(text: string): { rows: CsvRow[] } | { fault: Fault } {
  const rows: CsvRow[] = [];
  let fields: string[] = [];
  let row = 1;
  let at = 0;
  const refuse = (value: string, expected: string) => ({
    fault: { field: `row ${row}`, value: value.slice(0, 60), expected },
  });
  while (at < text.length) {
    let field = '';
    if (text[at] === '"') {
      const begin = at;
      at++;
      for (;;) {
        const quote = text.indexOf('"', at);
        if (quote < 0) return refuse(text.slice(begin), 'a quoted field that ends');
        field += text.slice(at, quote);
        at = quote + 1;
        if (text[at] !== '"') break;
        field += '"';
        at++;
      }
      if (at < text.length && !/^(,|\r?\n)/.test(text.slice(at, at + 2))) {
        return refuse(text.slice(begin), 'a comma or the end of the line after a quoted field');
      }
    } else {
      const rest = /[,\n]/g;
      rest.lastIndex = at;
      const end = rest.exec(text)?.index ?? text.length;
      field = text.slice(at, end).replace(/\r$/, '');
      if (field.includes('"')) return refuse(field, 'quotes around a field that holds one');
      at = end;
    }
    fields.push(field);
    if (text[at] === ',') {
      at++;
      if (at < text.length) continue;
      fields.push('');
    }
    if (text[at] === '\r') at++;
    at++;
    if (fields.length > 1 || fields[0]?.trim() !== '') rows.push({ row, fields });
    fields = [];
    row++;
  }
  return { rows };
}
