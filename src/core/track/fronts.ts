import type { FrontReason } from '../estimate.js';

/** Levels of theta whose half distance is the width: plus and minus one sigma of an erf front. */
const LEVEL_LOW = 0.16;
const LEVEL_HIGH = 0.84;
/** A front spans at least this share of the range between the references. */
const SPAN_MIN = 0.1;

/** Where the straight line between two cells passes a level: x[index] + weight (x[index+1] - x[index]). */
export interface Crossing {
  readonly index: number;
  /** 0..1 */
  readonly weight: number;
  readonly x_m: number;
  /** dT/dx of that straight line [K/m]. */
  readonly slope_K_m: number;
}

export interface FoundFront {
  /** theta = 0.5 [m]. */
  readonly position_m: number;
  /** Half the distance between the 16 % and 84 % crossings [m]; null where one is not in the bed. */
  readonly width_m: number | null;
  /** Share of the range between the references that the front spans. */
  readonly span: number;
  readonly crossing50: Crossing;
  readonly crossing16: Crossing | null;
  readonly crossing84: Crossing | null;
  /** dT/dx at the position [K/m]. */
  readonly slope_K_m: number;
}

export interface Fronts {
  /** Ordered by x. */
  readonly fronts: FoundFront[];
  /** Why there is none; null where there is one. */
  readonly reason: FrontReason | null;
}

/**
 * The thermal fronts of one profile.
 *
 * theta = (T - Tc)/(Th - Tc), with straight lines between the points. The profile is cut at its
 * turning points, where a turn counts once it has gone back by a tenth of the range; every piece
 * that passes theta = 0.5 is a front. So a wobble is none, and each front spans a tenth or more.
 * Where a wobble passes 0.5 several times inside one piece, its steepest passage in the piece's own
 * sense is the position. The 16 % and 84 % crossings are the nearest ones to either side inside the
 * piece; where the piece ends before (at the bed's end or at a turn) the width is null. Nothing is
 * extrapolated beyond the first and last point.
 *
 * @param x_m positions, ascending [m]
 * @param temperature_K one per position, finite [K]
 * @param reference_hot_K Th of the configuration [K]
 * @param reference_cold_K Tc of the configuration, below Th [K]
 * @returns fronts by x, or none with a reason: `uniform` where the whole profile spans less than a
 *   tenth of the range, else `no_half_crossing`
 * @throws RangeError on unequal lengths, a temperature that is not finite, or Th not above Tc
 */
export function findFronts(
  x_m: Float64Array,
  temperature_K: Float64Array,
  reference_hot_K: number,
  reference_cold_K: number,
): Fronts {
  const range = reference_hot_K - reference_cold_K;
  if (!(range > 0))
    throw new RangeError(`reference_hot_K ${reference_hot_K} is not above ${reference_cold_K}`);
  if (x_m.length !== temperature_K.length)
    throw new RangeError(`temperature_K has ${temperature_K.length} points, x_m ${x_m.length}`);

  const turns = turningPoints(temperature_K, SPAN_MIN * range);
  const fronts: FoundFront[] = [];
  for (let k = 0; k + 1 < turns.length; k++) {
    const first = turns[k]!;
    const last = turns[k + 1]!;
    const falls = temperature_K[first]! > temperature_K[last]!;
    const half = reference_cold_K + 0.5 * range;
    const middle = steepest(x_m, temperature_K, half, first, last, falls);
    if (middle === null) continue;
    const at = middle.index;
    const low = reference_cold_K + LEVEL_LOW * range;
    const high = reference_cold_K + LEVEL_HIGH * range;
    const upstream = nearest(x_m, temperature_K, falls ? high : low, at, first, falls);
    const downstream = nearest(x_m, temperature_K, falls ? low : high, at, last, falls);
    fronts.push({
      position_m: middle.x_m,
      width_m:
        upstream !== null && downstream !== null ? (downstream.x_m - upstream.x_m) / 2 : null,
      span: Math.abs(temperature_K[last]! - temperature_K[first]!) / range,
      crossing50: middle,
      crossing16: falls ? downstream : upstream,
      crossing84: falls ? upstream : downstream,
      slope_K_m: middle.slope_K_m,
    });
  }
  if (fronts.length > 0) return { fronts, reason: null };
  return { fronts, reason: turns.length < 2 ? 'uniform' : 'no_half_crossing' };
}

/**
 * Indices of the extremes that bound the pieces along which the values go by at least `step`;
 * none where the whole profile spans less.
 */
function turningPoints(values: Float64Array, step: number): number[] {
  const turns: number[] = [];
  let low = 0;
  let high = 0;
  let sense: 'open' | 'rising' | 'falling' = 'open';
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!;
    if (!Number.isFinite(value)) throw new RangeError(`temperature_K[${i}] is ${value}`);
    if (sense !== 'falling' && value > values[high]!) high = i;
    if (sense !== 'rising' && value < values[low]!) low = i;
    if (sense !== 'falling' && values[high]! - value >= step) {
      turns.push(high);
      sense = 'falling';
      low = i;
    } else if (sense !== 'rising' && value - values[low]! >= step) {
      turns.push(low);
      sense = 'rising';
      high = i;
    }
  }
  if (sense !== 'open') turns.push(sense === 'rising' ? high : low);
  return turns;
}

function crossingAt(
  x: Float64Array,
  T: Float64Array,
  level: number,
  i: number,
  falls: boolean,
): Crossing | null {
  const a = T[i]!;
  const b = T[i + 1]!;
  if (falls ? !(a >= level && b < level) : !(a < level && b >= level)) return null;
  const weight = (level - a) / (b - a);
  const dx = x[i + 1]! - x[i]!;
  if (!(dx > 0)) throw new RangeError(`x_m[${i + 1}] ${x[i + 1]} is not above ${x[i]}`);
  return { index: i, weight, x_m: x[i]! + weight * dx, slope_K_m: (b - a) / dx };
}

function steepest(
  x: Float64Array,
  T: Float64Array,
  level: number,
  first: number,
  last: number,
  falls: boolean,
): Crossing | null {
  let found: Crossing | null = null;
  for (let i = first; i < last; i++) {
    const next = crossingAt(x, T, level, i, falls);
    if (next && (!found || Math.abs(next.slope_K_m) > Math.abs(found.slope_K_m))) found = next;
  }
  return found;
}

/** First crossing met on the way from interval `from` to the end of the piece at point `to`. */
function nearest(
  x: Float64Array,
  T: Float64Array,
  level: number,
  from: number,
  to: number,
  falls: boolean,
): Crossing | null {
  const step = to > from ? 1 : -1;
  const end = step > 0 ? to : to - 1;
  for (let i = from; i !== end; i += step) {
    const found = crossingAt(x, T, level, i, falls);
    if (found) return found;
  }
  return null;
}
