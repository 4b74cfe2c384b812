export type Cell = string | number | boolean | null | undefined;

const NUMBER = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;
const FORMULA = /^(?:[\s\0]*[=+\-@\uff1d\uff0b\uff0d\uff20]|[\t\r\n])/;

/** A text that a spreadsheet would take for a formula gets an apostrophe, as in the daemon's own CSV. */
const plain = (value: Cell): string => {
  if (value === null || value === undefined) return '';
  if (typeof value === 'number') return String(Number(value.toPrecision(9)));
  const text = String(value);
  return FORMULA.test(text) && !NUMBER.test(text) ? `'${text}` : text;
};

const quoted = (text: string): string =>
  /[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;

/** RFC 4180. */
export const csvOf = (rows: readonly (readonly Cell[])[]): string =>
  rows.map((row) => row.map((cell) => quoted(plain(cell))).join(',')).join('\r\n');

/** Tabs between the fields: a spreadsheet takes it as cells, so that a text may have none. */
export const tabsOf = (rows: readonly (readonly Cell[])[]): string =>
  rows
    .map((row) => row.map((cell) => plain(cell).replace(/[\t\r\n]+/g, ' ')).join('\t'))
    .join('\n');
