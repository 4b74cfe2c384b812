import { hasExtremes, wordsOf } from './series.js';

/** One stored row: a time and the values of `names`. */
export interface SeriesRow {
  readonly time_ms: number;
  readonly names: readonly string[];
  readonly values: Float64Array;
}

export interface ThinnedPoint {
  readonly time: string;
  readonly [series: string]: number | string | null;
}

interface Sum {
  count: number;
  sum: number;
  least: number;
  greatest: number;
  last: number;
}

/**
 * At most `points` points over [from_ms, to_ms], one per stretch of equal length that has rows:
 * numbers as the mean of the stretch, words as the last one, and for series with extremes
 * `NAME.min` and `NAME.max`. Few enough rows are given as they are. A point's time is that of the
 * last row in it.
 * @param count how many rows there are
 */
export function thin(
  rows: Iterable<SeriesRow>,
  count: number,
  from_ms: number,
  to_ms: number,
  points: number,
): ThinnedPoint[] {
  const span_ms = Math.max(1, to_ms - from_ms);
  const found: ThinnedPoint[] = [];
  let sums = new Map<string, Sum>();
  let stretch = -1;
  let time_ms = 0;
  let ordinal = 0;
  for (const row of rows) {
    const place =
      count <= points
        ? ordinal++
        : Math.min(points - 1, Math.floor(((row.time_ms - from_ms) / span_ms) * points));
    if (place !== stretch && sums.size > 0) {
      found.push(pointOf(time_ms, sums));
      sums = new Map();
    }
    stretch = place;
    time_ms = row.time_ms;
    addRow(sums, row);
  }
  if (sums.size > 0) found.push(pointOf(time_ms, sums));
  return found;
}

function addRow(sums: Map<string, Sum>, row: SeriesRow): void {
  row.names.forEach((name, i) => {
    const value = row.values[i]!;
    const sum = sums.get(name) ?? {
      ...{ count: 0, sum: 0, last: Number.NaN },
      ...{ least: Number.POSITIVE_INFINITY, greatest: Number.NEGATIVE_INFINITY },
    };
    sums.set(name, sum);
    if (!Number.isFinite(value)) return;
    sum.count++;
    sum.sum += value;
    sum.last = value;
    sum.least = Math.min(sum.least, value);
    sum.greatest = Math.max(sum.greatest, value);
  });
}

function pointOf(time_ms: number, sums: ReadonlyMap<string, Sum>): ThinnedPoint {
  const point: Record<string, number | string | null> & { time: string } = {
    time: new Date(time_ms).toISOString(),
  };
  for (const [name, sum] of sums) {
    const words = wordsOf(name);
    const isEmpty = sum.count === 0;
    if (words) point[name] = isEmpty ? null : (words[sum.last] ?? null);
    else if (sum.count === 1) point[name] = sum.last;
    else point[name] = isEmpty ? null : sum.sum / sum.count;
    if (!hasExtremes(name)) continue;
    point[`${name}.min`] = isEmpty ? null : sum.least;
    point[`${name}.max`] = isEmpty ? null : sum.greatest;
  }
  return point;
}
