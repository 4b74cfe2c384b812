/** One front of a profile: the 0.5 crossing and half the distance of the 16 % and 84 % crossings. */
export interface TruthFront {
  readonly position_m: number;
  readonly width_m: number | null;
}

/**
 * Fronts of theta(x) = (T - Tc)/(Th - Tc) by straight lines between cell centres. A swing of less
 * than a tenth of the range is no front. The width is null where a crossing lies outside the bed
 * or behind the next 0.5 crossing.
 */
export function frontsOf(
  T: ArrayLike<number>,
  dx_m: number,
  cold_K: number,
  hot_K: number,
): TruthFront[] {
  const n = T.length;
  const theta = (i: number) => (T[i]! - cold_K) / (hot_K - cold_K);
  const crossings: number[] = [];
  for (let i = 0; i < n - 1; i++) {
    if (theta(i) - 0.5 === 0 || (theta(i) - 0.5) * (theta(i + 1) - 0.5) < 0) crossings.push(i);
  }
  const fronts: TruthFront[] = [];
  for (let f = 0; f < crossings.length; f++) {
    const at = crossings[f]!;
    const first = f > 0 ? crossings[f - 1]! + 1 : 0;
    const last = f < crossings.length - 1 ? crossings[f + 1]! : n - 1;
    const rising = theta(at + 1) > theta(at);
    let low = Infinity;
    let high = -Infinity;
    for (let i = first; i <= last; i++) {
      low = Math.min(low, theta(i));
      high = Math.max(high, theta(i));
    }
    if (high - low < 0.1) continue;
    const before = crossing(theta, at, first, rising ? 0.16 : 0.84, -1);
    const after = crossing(theta, at, last, rising ? 0.84 : 0.16, 1);
    const half = at + (0.5 - theta(at)) / (theta(at + 1) - theta(at));
    fronts.push({
      position_m: (half + 0.5) * dx_m,
      width_m: before === null || after === null ? null : ((after - before) * dx_m) / 2,
    });
  }
  return fronts;
}

function crossing(
  theta: (i: number) => number,
  from: number,
  to: number,
  level: number,
  way: 1 | -1,
): number | null {
  for (let i = way > 0 ? from : from + 1; i !== to; i += way) {
    const a = theta(i);
    const b = theta(i + way);
    if ((a - level) * (b - level) <= 0 && a !== b) return i + (way * (level - a)) / (b - a);
  }
  return null;
}
