import type { ChartColumns } from '../lib/series.js';
import type { IndicatorCourse, Run, WatchHistory } from './wire.js';

/** Columns of charts over weeks: seconds since 1970, then one per line; null breaks a line. */

/** Times further apart than this many spacings have a gap between. */
const GAP = 2;

type Cell = number | null | undefined;

/** Lines over the times of a history, broken where nothing was stored. */
export function courseColumns(
  { times, every_s }: Pick<WatchHistory, 'times' | 'every_s'>,
  lines: readonly (readonly (number | null)[])[],
): ChartColumns {
  const seconds: number[] = [];
  const columns: Cell[][] = lines.map(() => []);
  times.forEach((time, i) => {
    const now = Date.parse(time) / 1000;
    const before = seconds.at(-1);
    if (before !== undefined && now - before > GAP * every_s) {
      seconds.push((before + now) / 2);
      for (const column of columns) column.push(null);
    }
    seconds.push(now);
    lines.forEach((line, k) => {
      columns[k]!.push(line[i] ?? null);
    });
  });
  return [seconds, ...columns];
}

const plus = (values: readonly (number | null)[], sigmas: readonly (number | null)[], by: number) =>
  values.map((value, i) => {
    const sigma = sigmas[i];
    return value === null || sigma === null || sigma === undefined ? null : value + by * sigma;
  });

/** Value, two sigmas above and below, healthy, limit. */
export function indicatorColumns(
  history: Pick<WatchHistory, 'times' | 'every_s'>,
  { value, sigma, healthy, limit }: IndicatorCourse,
): ChartColumns {
  const lines = [value, plus(value, sigma, 2), plus(value, sigma, -2), healthy, limit];
  return courseColumns(history, lines);
}

/**
 * Each string over its own healthy value, so that one line is healthy for all and two are the limits,
 * which lie as far above as below.
 */
export function stringColumns(
  history: Pick<WatchHistory, 'times' | 'every_s'>,
  courses: readonly IndicatorCourse[],
): ChartColumns {
  const lines = courses.map(({ value, healthy }) =>
    value.map((one, i) => {
      const own = healthy[i];
      return one === null || !own ? null : one / own;
    }),
  );
  const apart = history.times.map((_, i) => {
    const { limit, healthy } = courses[0] ?? { limit: [], healthy: [] };
    const [l, h] = [limit[i], healthy[i]];
    return l === null || l === undefined || !h ? null : Math.abs(l / h - 1);
  });
  const one = apart.map((by) => (by === null ? null : 1));
  return courseColumns(history, [...lines, one, plus(one, apart, 1), plus(one, apart, -1)]);
}

/** Runs tile time: more than this between two of them was not recorded [s]. */
const RUN_GAP_S = 3600;

/** A figure of each run at its end, one line per kind of run. */
export function runColumns(
  runs: readonly Run[],
  kinds: readonly Run['kind'][],
  figure: (run: Run) => number | null,
): ChartColumns {
  const seconds: number[] = [];
  const columns: Cell[][] = kinds.map(() => []);
  let before_s: number | null = null;
  for (const run of runs) {
    const from_s = Date.parse(run.from) / 1000;
    if (before_s !== null && from_s - before_s > RUN_GAP_S) {
      seconds.push((before_s + from_s) / 2);
      for (const column of columns) column.push(null);
    }
    before_s = Date.parse(run.to) / 1000;
    const value = figure(run);
    if (value === null || !kinds.includes(run.kind)) continue;
    seconds.push(before_s);
    kinds.forEach((kind, k) => {
      columns[k]!.push(kind === run.kind ? value : undefined);
    });
  }
  return [seconds, ...columns];
}

/** The last known value of each line at or before a place of the columns. */
export function lastKnown(data: ChartColumns, at: number): (number | null)[] {
  const [, ...lines] = data;
  return lines.map((line) => line[at] ?? null);
}
