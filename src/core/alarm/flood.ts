/** Rates are counted over ten minutes [ms]. */
export const WINDOW_MS = 600_000;
/** A flood begins with more than so many alarms in ten minutes... */
const BEGINS_ABOVE = 10;
/** ...and ends once there are fewer than so many. */
const ENDS_BELOW = 5;

export interface Flood {
  /** Time of the first alarm of the ten minutes that began it, and when it ended [ms]. */
  readonly from_ms: number;
  /** null: not over at the end of the span. */
  readonly to_ms: number | null;
  readonly count: number;
  /** Most in any ten minutes. */
  readonly most_in_10_min: number;
}

export interface FloodCount {
  readonly floods: readonly Flood[];
  /** Time of the span spent in floods [ms]. */
  readonly in_flood_ms: number;
  /** Most in any ten minutes that end within the span. */
  readonly most: number;
}

/**
 * Floods among alarms: more than ten in ten minutes begin one, fewer than five in ten minutes end it
 * (ISA-18.2). The ten minutes slide, so that no alarm falls between two fixed ones.
 *
 * @param times_ms of the alarms, ascending; those of ten minutes before the span make its beginning right
 * @throws RangeError for times that do not ascend
 */
export function countFloods(
  times_ms: readonly number[],
  from_ms: number,
  to_ms: number,
): FloodCount {
  const floods: { from_ms: number; to_ms: number | null; count: number; most_in_10_min: number }[] =
    [];
  let open: (typeof floods)[number] | null = null;
  let first = 0;
  let most = 0;
  times_ms.forEach((time, i) => {
    if (i > 0 && time < (times_ms[i - 1] as number))
      throw new RangeError(`times must ascend, got ${time} after ${times_ms[i - 1]}`);
    if (open) open = endBefore(open, times_ms, i, time);
    while (time - (times_ms[first] as number) >= WINDOW_MS) first++;
    const count = i - first + 1;
    if (time >= from_ms && time <= to_ms) most = Math.max(most, count);
    if (open) {
      open.count++;
      open.most_in_10_min = Math.max(open.most_in_10_min, count);
    } else if (count > BEGINS_ABOVE) {
      open = { from_ms: times_ms[first] as number, to_ms: null, count, most_in_10_min: count };
      floods.push(open);
    }
  });
  if (open) endBefore(open, times_ms, times_ms.length, to_ms);
  const own = floods.filter((flood) => flood.to_ms === null || flood.to_ms > from_ms);
  const in_flood_ms = own.reduce((sum, flood) => {
    return (
      sum + Math.max(0, Math.min(flood.to_ms ?? to_ms, to_ms) - Math.max(flood.from_ms, from_ms))
    );
  }, 0);
  return { floods: own, in_flood_ms, most };
}

/**
 * Ends a flood where the count falls below five before the alarm `next` (or the time `now_ms`): that
 * is when the fifth last alarm before it grows ten minutes old.
 */
function endBefore<F extends { to_ms: number | null }>(
  flood: F,
  times_ms: readonly number[],
  next: number,
  now_ms: number,
): F | null {
  const fifthLast = times_ms[next - ENDS_BELOW];
  if (fifthLast === undefined) return flood;
  const end = fifthLast + WINDOW_MS;
  if (end > now_ms) return flood;
  flood.to_ms = end;
  return null;
}
