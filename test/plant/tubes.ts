import type { Bed } from './bed.js';
import type { StoreGeometry } from './geometry.js';

/** How the rings of a bed lie in the tubes of its strings. */
export interface RingLayout {
  /** Share of the cross-section of each ring, from the axis outwards. */
  readonly shares: readonly number[];
  /** Rings of the tube of each string, in the order of the strings; none for a string without area. */
  readonly ringsOf: readonly (readonly number[])[];
}

const RINGS_AT_LEAST = 6;
/**
 * Layers at the wall, from the wall inwards, as shares of the bed's radius: heat penetrates some
 * 0.3 m from a wall within half a cycle, and the steel's heat comes from there. With rings of equal
 * area alone the lag of the front at the wall came out at half of what 25 rings give.
 */
const WALL_LAYERS = [0.02, 0.04, 0.06, 0.08] as const;

/**
 * Tubes are laid out from the axis outwards in the order of the strings' radii, each with its share
 * of the area, and cut into rings of equal area: two or more each, and at least six together. The
 * outermost has thin layers at the wall besides.
 */
export function layOutRings(store: StoreGeometry): RingLayout {
  const order = store.strings
    .map((_, s) => s)
    .filter((s) => store.strings[s]!.area_share > 0)
    .sort((a, b) => store.strings[a]!.radius_m - store.strings[b]!.radius_m);
  const layers = WALL_LAYERS.length;
  const each = Math.max(2, Math.ceil((RINGS_AT_LEAST - layers + 1) / order.length));
  const shares: number[] = [];
  const ringsOf: number[][] = store.strings.map(() => []);
  order.forEach((s, place) => {
    const share = store.strings[s]!.area_share;
    const own: number[] = place === order.length - 1 ? wallLayers(share) : [];
    const rest = share - own.reduce((sum, layer) => sum + layer, 0);
    const count = own.length > 0 ? each - 1 : each;
    for (let i = 0; i < count; i++) own.unshift(rest / count);
    for (const ring of own) {
      ringsOf[s]!.push(shares.length);
      shares.push(ring);
    }
  });
  return { shares, ringsOf };
}

/** Area shares of the layers at the wall, the outermost last, in a tube of this share. */
function wallLayers(share: number): number[] {
  const thickness = 1 - Math.sqrt(1 - share);
  const total = WALL_LAYERS.reduce((sum, layer) => sum + layer, 0);
  const scale = Math.min(1, thickness / 2 / total);
  const shares: number[] = [];
  let outer = 1;
  for (const layer of WALL_LAYERS) {
    const inner = outer - scale * layer;
    shares.unshift(outer * outer - inner * inner);
    outer = inner;
  }
  return shares;
}

/** Area-mean temperature over some rings, cell by cell [K]; NaN for none. */
export function meanProfile(bed: Bed, rings: readonly number[]): Float64Array {
  const { cells, ring_shares } = bed.p;
  const profile = new Float64Array(cells);
  const total = rings.reduce((sum, r) => sum + ring_shares[r]!, 0);
  if (total === 0) return profile.fill(Number.NaN);
  for (const r of rings) {
    const weight = ring_shares[r]! / total;
    for (let i = 0; i < cells; i++) profile[i] = profile[i]! + weight * bed.mean[r * cells + i]!;
  }
  return profile;
}

/** Flow factor of each tube: share of the flow over share of the area; NaN without area. */
export function tubeFlow(bed: Bed, layout: RingLayout): number[] {
  return layout.ringsOf.map((rings) => {
    const area = rings.reduce((sum, r) => sum + layout.shares[r]!, 0);
    return rings.reduce((sum, r) => sum + layout.shares[r]! * bed.ringFlow[r]!, 0) / area;
  });
}

/**
 * Ring flows when the tube of one string takes `factor` times its flow and the others together
 * lose as much, each in proportion; `base` are the ring flows before.
 */
export function channelled(
  base: readonly number[],
  layout: RingLayout,
  string: number,
  factor: number,
): number[] {
  const own = new Set(layout.ringsOf[string]!);
  let inside = 0;
  let all = 0;
  base.forEach((flow, r) => {
    all += flow * layout.shares[r]!;
    if (own.has(r)) inside += flow * layout.shares[r]!;
  });
  const rest = (all - factor * inside) / (all - inside);
  if (!(rest > 0)) throw new RangeError(`factor ${factor} leaves no flow for the other tubes`);
  return base.map((flow, r) => flow * (own.has(r) ? factor : rest));
}
