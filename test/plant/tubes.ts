import type { Bed } from './bed.js';
import type { StoreGeometry } from './geometry.js';

/**
 * Share of each ring in the tube of each string: tubes are laid out from the axis outwards in the
 * order of the strings' radii, each with its share of the area; rings have equal areas.
 * Row-major, strings x rings; each ring's column sums to 1.
 */
export function ringShares(store: StoreGeometry, rings: number): Float64Array {
  const shares = new Float64Array(store.strings.length * rings);
  const order = store.strings
    .map((_, s) => s)
    .sort((a, b) => store.strings[a]!.radius_m - store.strings[b]!.radius_m);
  let from = 0;
  for (const s of order) {
    const to = from + store.strings[s]!.area_share * rings;
    for (let r = 0; r < rings; r++) {
      shares[s * rings + r] = Math.max(0, Math.min(to, r + 1) - Math.max(from, r));
    }
    from = to;
  }
  return shares;
}

/** Mean temperature over the given shares of the rings, cell by cell [K]. */
export function meanProfile(bed: Bed, ringWeights: ArrayLike<number>): Float64Array {
  const { rings, cells } = bed.p;
  const profile = new Float64Array(cells);
  let total = 0;
  for (let r = 0; r < rings; r++) total += ringWeights[r]!;
  for (let r = 0; r < rings; r++) {
    const weight = ringWeights[r]! / total;
    if (weight === 0) continue;
    for (let i = 0; i < cells; i++) profile[i] = profile[i]! + weight * bed.mean[r * cells + i]!;
  }
  return profile;
}

/** Flow factor of each tube: share of the flow over share of the area. */
export function tubeFlow(bed: Bed, shares: Float64Array, strings: number): number[] {
  const { rings } = bed.p;
  return Array.from({ length: strings }, (_, s) => {
    let flow = 0;
    let area = 0;
    for (let r = 0; r < rings; r++) {
      flow += shares[s * rings + r]! * bed.ringFlow[r]!;
      area += shares[s * rings + r]!;
    }
    return flow / area;
  });
}

/**
 * Ring flows when the tube of one string takes `factor` times its flow and the other tubes together
 * lose as much, each in proportion; `base` are the ring flows before.
 */
export function channelled(
  base: readonly number[],
  shares: Float64Array,
  string: number,
  factor: number,
): number[] {
  const rings = base.length;
  let inside = 0;
  let all = 0;
  for (let r = 0; r < rings; r++) {
    inside += shares[string * rings + r]! * base[r]!;
    all += base[r]!;
  }
  const rest = (all - factor * inside) / (all - inside);
  if (!(rest > 0)) throw new RangeError(`factor ${factor} leaves no flow for the other tubes`);
  return base.map((f, r) => {
    const share = shares[string * rings + r]!;
    return f * (share * factor + (1 - share) * rest);
  });
}
