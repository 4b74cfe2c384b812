import type { History, UnitDefinition } from './wire.js';

/** Columns of a chart: seconds since 1970, then one per series; null breaks a line, undefined not. */
export type ChartColumns = [number[], ...(number | null | undefined)[][]];

/** More than this many times the usual distance between two points is a gap. */
const GAP = 2.5;

/** Names of the stored hours at the configured power nearest to the rated one: p90, p50, p10. */
export function hoursColumns(
  definition: Pick<UnitDefinition, 'hours_at_MW_el' | 'rated_power_MW_el'>,
): { power_MW: number; columns: [string, string, string] } | null {
  const rated = definition.rated_power_MW_el;
  const [power_MW] = [...definition.hours_at_MW_el].sort(
    (a, b) => Math.abs(a - rated) - Math.abs(b - rated),
  );
  if (power_MW === undefined) return null;
  const name = (level: string) => `hours_${level}_at_${power_MW}_MW`;
  return { power_MW, columns: [name('p90'), name('p50'), name('p10')] };
}

function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[Math.floor(sorted.length / 2)] ?? Number.POSITIVE_INFINITY;
}

function distances(times: readonly number[]): number[] {
  return times.slice(1).map((time, i) => time - times[i]!);
}

/** Breaks the line where values are missing for longer than usual; joins it over the usual ones. */
function joined(times: readonly number[], values: readonly (number | null)[]) {
  const known = values.flatMap((value, i) => (value === null ? [] : [i]));
  const usual = median(distances(known.map((i) => times[i]!)));
  const result: (number | null | undefined)[] = [...values];
  for (const [k, right] of known.slice(1).entries()) {
    const left = known[k]!;
    if (times[right]! - times[left]! > GAP * usual) continue;
    result.fill(undefined, left + 1, right);
  }
  return result;
}

/**
 * The rows of a history as columns. Hours are worked out only every so often, so their points are
 * joined; where nothing was stored at all, as while the daemon was down, the line is broken, since
 * a straight one would claim what nobody knows.
 */
export function chartColumns(
  history: Pick<History, 'rows'>,
  columns: readonly string[],
  scale: number,
): ChartColumns {
  const seconds = history.rows.map((row) => Date.parse(String(row.time)) / 1000);
  const usual = median(distances(seconds));
  const times: number[] = [];
  const rows: (History['rows'][number] | null)[] = [];
  for (const [i, row] of history.rows.entries()) {
    const before = seconds[i - 1];
    if (before !== undefined && seconds[i]! - before > GAP * usual) {
      times.push((before + seconds[i]!) / 2);
      rows.push(null);
    }
    times.push(seconds[i]!);
    rows.push(row);
  }
  const values = columns.map((column) =>
    joined(
      times,
      rows.map((row) => {
        const value = row?.[column];
        return typeof value === 'number' ? value * scale : null;
      }),
    ),
  );
  return [times, ...values];
}
