import type { StoreModel } from '../track/storeTracker.js';

/**
 * Concentric rings of a bed for the fit, finer than the tracker's tubes: one per string, the
 * outermost string's cut into thinner ones towards the wall, so that heat lost there reaches its
 * string by conduction and no sooner.
 */
export interface Rings {
  /** String whose flow, factors and starting profile a ring has. */
  readonly string: Int32Array;
  /** Outer and middle radius [m]; share of the cross-section. */
  readonly edge_m: Float64Array;
  readonly middle_m: Float64Array;
  readonly share: Float64Array;
  /** Per string: its rings from the inside outwards, and its radius [m]. */
  readonly own: readonly (readonly number[])[];
  readonly radius_m: readonly number[];
  /** The outermost string. */
  readonly outermost: number;
}

/** Thickness of the ring at the wall over the bed's radius, and of each further one over the last. */
const FIRST = 0.04;
const GROWTH = 1.6;
const MOST = 6;

/** Lays the rings of a store out by its strings' radii and area shares. */
export function ringsOf(store: StoreModel): Rings {
  const { strings, bed } = store.store;
  const radius = bed.diameter_m / 2;
  const order = strings.map((_, k) => k).sort((a, b) => radiusOf(a) - radiusOf(b));
  function radiusOf(k: number): number {
    return strings[k]?.radius_m ?? 0;
  }
  const string: number[] = [];
  const edge: number[] = [];
  let area = 0;
  order.forEach((k, place) => {
    const from = radius * Math.sqrt(area);
    area += strings[k]?.area_share ?? 0;
    const to = place === order.length - 1 ? radius : radius * Math.sqrt(area);
    const edges = place === order.length - 1 ? towardsWall(from, to, radius) : [to];
    for (const one of edges) {
      string.push(k);
      edge.push(one);
    }
  });
  const middle = edge.map((to, r) => {
    const from = r === 0 ? 0 : (edge[r - 1] as number);
    return Math.sqrt((from * from + to * to) / 2);
  });
  return {
    string: Int32Array.from(string),
    edge_m: Float64Array.from(edge),
    middle_m: Float64Array.from(middle),
    share: Float64Array.from(edge, (to, r) => {
      const from = r === 0 ? 0 : (edge[r - 1] as number);
      return (to * to - from * from) / (radius * radius);
    }),
    own: strings.map((_, k) => string.flatMap((of, r) => (of === k ? [r] : []))),
    radius_m: strings.map((one) => one.radius_m),
    outermost: order[order.length - 1] as number,
  };
}

/**
 * The two of its rings that a string is read between, and the weight of the latter.
 */
export function placeOf(rings: Rings, k: number): { inner: number; outer: number; weight: number } {
  const own = rings.own[k] as readonly number[];
  const radius = rings.radius_m[k] as number;
  const after = own.findIndex((r) => (rings.middle_m[r] as number) >= radius);
  const last = own.length - 1;
  if (after === 0 || last === 0)
    return { inner: own[0] as number, outer: own[0] as number, weight: 0 };
  const to = after < 0 ? last : after;
  const a = rings.middle_m[own[to - 1] as number] as number;
  const b = rings.middle_m[own[to] as number] as number;
  const weight = Math.min(1, (radius - a) / (b - a));
  return { inner: own[to - 1] as number, outer: own[to] as number, weight };
}

/** Outer edges of the rings between an inner radius and the wall, from the inside outwards. */
function towardsWall(from: number, to: number, radius: number): number[] {
  const edges = [to];
  let thickness = FIRST * radius;
  let at = to;
  while (edges.length < MOST && at - thickness * (1 + GROWTH / 2) > from) {
    at -= thickness;
    edges.unshift(at);
    thickness *= GROWTH;
  }
  return edges;
}
