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

/**
 * Takes series `i` of a part into a sum of the series of this name.
 *
 * @param isLater whether the part's last row is the newest so far: of words the last counts
 */
export function addToSum(
  sum: Sum,
  name: string,
  part: SeriesPart,
  i: number,
  isLater = true,
): void {
  const mean = part.means[i]!;
  const count = part.counts === null ? Number(Number.isFinite(mean)) : part.counts[i]!;
  if (count === 0 || !Number.isFinite(mean)) return;
  const before = sum.count;
  sum.count += count;
  if (before === 0) sum.mean = mean;
  else if (wordsOf(name) === undefined) sum.mean += ((mean - sum.mean) * count) / sum.count;
  else if (isLater) sum.mean = mean;
  sum.least = before === 0 ? part.least[i]! : Math.min(sum.least, part.least[i]!);
  sum.greatest = before === 0 ? part.greatest[i]! : Math.max(sum.greatest, part.greatest[i]!);
}

/** Rows as they were stored, as points of the series wanted that they have. */
export function pointsOf(
  rows: Iterable<SeriesPart>,
  wanted: ReadonlySet<string> | null,
): ThinnedPoint[] {
  const stretch = new Stretch(wanted);
  const found: ThinnedPoint[] = [];
  for (const row of rows) {
    stretch.take(row);
    found.push(pointOf(row.time_ms, stretch.end(), false));
  }
  return found;
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
  const stretch = new Stretch(wanted);
  let place = Number.NaN;
  let time_ms = 0;
  for (const part of parts) {
    const own = Math.floor(part.time_ms / bucket_ms);
    if (own !== place && !Number.isNaN(place)) found.push(pointOf(time_ms, stretch.end(), true));
    place = own;
    time_ms = part.time_ms;
    stretch.take(part);
  }
  if (!Number.isNaN(place)) found.push(pointOf(time_ms, stretch.end(), true));
  return found;
}

/** Sums by series over some parts, most of which have the same series in the same places. */
class Stretch {
  private sums = new Map<string, Sum>();
  private names: readonly string[] | null = null;
  private places: { readonly i: number; readonly name: string; readonly sum: Sum }[] = [];

  constructor(private readonly wanted: ReadonlySet<string> | null) {}

  take(part: SeriesPart): void {
    if (part.names !== this.names) this.look(part.names);
    for (const { i, name, sum } of this.places) addToSum(sum, name, part, i);
  }

  /** The sums so far; the next part begins new ones. */
  end(): ReadonlyMap<string, Sum> {
    const { sums } = this;
    this.sums = new Map();
    this.names = null;
    return sums;
  }

  private look(names: readonly string[]): void {
    this.names = names;
    this.places = names.flatMap((name, i) => {
      if (this.wanted?.has(name) === false) return [];
      const sum = this.sums.get(name) ?? { ...NONE };
      this.sums.set(name, sum);
      return [{ i, name, sum }];
    });
  }
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
