import { readFileSync } from 'node:fs';

/**
 * Rows of a table in fixtures/ as records of text: lines that start with # are its source, the
 * first other line names the columns, fields may be quoted.
 */
export function fixtureRows(file: string): Record<string, string>[] {
  const url = new URL(`../../fixtures/${file}`, import.meta.url);
  const lines = readFileSync(url, 'utf8')
    .split(/\r?\n/)
    .filter((line) => line !== '' && !line.startsWith('#'));
  const fieldsOf = (line: string): string[] =>
    [...line.matchAll(/(?:^|,)(?:"([^"]*)"|([^,]*))/g)].map((m) => m[1] ?? m[2] ?? '');
  const names = fieldsOf(lines[0] ?? '');
  return lines.slice(1).map((line) => {
    const fields = fieldsOf(line);
    if (fields.length !== names.length) {
      throw new Error(`${file}: ${fields.length} fields where ${names.length} are named: ${line}`);
    }
    return Object.fromEntries(names.map((name, i) => [name, fields[i] as string]));
  });
}

/** A field as a number; an empty or absent one is NaN. */
export function numberIn(row: Record<string, string>, column: string): number {
  const text = row[column];
  return text === undefined || text === '' ? Number.NaN : Number(text);
}
