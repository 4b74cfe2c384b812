import { wordsOf } from './series.js';

/**
 * Some rows of a unit as one: a stored row, where all four lists are its values, or many rolled up.
 * Values of a series of words are the last of them.
 */
export interface SeriesPart {
  /** Of the last row in it. */
  readonly time_ms: number;
  readonly names: readonly string[];
  /** How many finite values each series has; null: a single row. */
  readonly counts: ArrayLike<number> | null;
  /** NaN where a series has no finite value. */
  readonly means: ArrayLike<number>;
  readonly least: ArrayLike<number>;
  readonly greatest: ArrayLike<number>;
}

export interface ThinnedPoint {
  readonly time: string;
  readonly [series: string]: number | string | null;
}

/** A stored row. */
export function partOf(
  time_ms: number,
  names: readonly string[],
  values: ArrayLike<number>,
): SeriesPart {
  return { time_ms, names, counts: null, means: values, least: values, greatest: values };
}

/** Many values of one series as one. */
export interface Sum {
  count: number;
  mean: number;
  least: number;
  greatest: number;
}

export const NONE: Readonly<Sum> = {
  count: 0,
  mean: Number.NaN,
  least: Number.NaN,
  greatest: Number.NaN,
};

/** Takes series `i` of a part, which is the later one, into a sum of the series of this name. */
export function addToSum(sum: Sum, name: string, part: SeriesPart, i: number): void {
  const mean = part.means[i]!;
  const count = part.counts === null ? Number(Number.isFinite(mean)) : part.counts[i]!;
  if (count === 0 || !Number.isFinite(mean)) return;
  const before = sum.count;
  sum.count += count;
  const isFirst = before === 0 || wordsOf(name) !== undefined;
  sum.mean = isFirst ? mean : sum.mean + ((mean - sum.mean) * count) / sum.count;
  sum.least = before === 0 ? part.least[i]! : Math.min(sum.least, part.least[i]!);
  sum.greatest = before === 0 ? part.greatest[i]! : Math.max(sum.greatest, part.greatest[i]!);
}

/** Rows as they were stored, as points of the series named that they have. */
export function pointsOf(
  rows: Iterable<SeriesPart>,
  wanted: ReadonlySet<string> | null,
): ThinnedPoint[] {
  return [...rows].map((row) => {
    const sums = new Map<string, Sum>();
    take(sums, row, wanted);
    return pointOf(row.time_ms, sums, false);
  });
}

/**
 * A point per stretch of time that has rows, each beginning at a whole multiple of `bucket_ms` since
 * 1970: numbers as the mean of its rows with the extremes of them as `NAME.min` and `NAME.max`, words
 * as the last one. A point's time is that of the last row in it.
 *
 * @param parts oldest first
 * @param wanted series to be given; null: all
 */
export function thin(
  parts: Iterable<SeriesPart>,
  bucket_ms: number,
  wanted: ReadonlySet<string> | null,
): ThinnedPoint[] {
  const found: ThinnedPoint[] = [];
  let sums = new Map<string, Sum>();
  let stretch = Number.NaN;
  let time_ms = 0;
  for (const part of parts) {
    const place = Math.floor(part.time_ms / bucket_ms);
    if (place !== stretch && sums.size > 0) {
      found.push(pointOf(time_ms, sums, true));
      sums = new Map();
    }
    stretch = place;
    time_ms = part.time_ms;
    take(sums, part, wanted);
  }
  if (sums.size > 0) found.push(pointOf(time_ms, sums, true));
  return found;
}

function take(sums: Map<string, Sum>, part: SeriesPart, wanted: ReadonlySet<string> | null): void {
  part.names.forEach((name, i) => {
    if (wanted !== null && !wanted.has(name)) return;
    let sum = sums.get(name);
    if (sum === undefined) {
      sum = { ...NONE };
      sums.set(name, sum);
    }
    addToSum(sum, name, part, i);
  });
}

function pointOf(
  time_ms: number,
  sums: ReadonlyMap<string, Sum>,
  withExtremes: boolean,
): ThinnedPoint {
  const point: Record<string, number | string | null> & { time: string } = {
    time: new Date(time_ms).toISOString(),
  };
  for (const [name, { count, mean, least, greatest }] of sums) {
    const words = wordsOf(name);
    const isEmpty = count === 0;
    if (words) point[name] = isEmpty ? null : (words[mean] ?? null);
    else point[name] = isEmpty ? null : mean;
    if (words || !withExtremes) continue;
    point[`${name}.min`] = isEmpty ? null : least;
    point[`${name}.max`] = isEmpty ? null : greatest;
  }
  return point;
}
