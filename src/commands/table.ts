/**
 * Rows as text in columns: words to the left, everything else to the right, two spaces between.
 * @throws RangeError where a row has another length than the header
 */
export function table(
  header: readonly string[],
  rows: readonly (readonly (string | number)[])[],
): string {
  for (const row of rows) {
    if (row.length !== header.length) {
      throw new RangeError(`each row must have ${header.length} cells, got ${row.length}`);
    }
  }
  const text = [header, ...rows].map((row) => row.map(String));
  const widths = header.map((_, i) => Math.max(...text.map((row) => row[i]?.length ?? 0)));
  const isNumber = header.map((_, i) => rows.every((row) => Number.isFinite(Number(row[i]))));
  const line = (row: readonly string[]) =>
    row
      .map((cell, i) => (isNumber[i] ? cell.padStart(widths[i] ?? 0) : cell.padEnd(widths[i] ?? 0)))
      .join('  ')
      .trimEnd();
  return text.map(line).join('\n');
}
