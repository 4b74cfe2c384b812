import type { StoreDefinition } from '../lib/wire.js';

/**
 * Where things stand in the drawing of a store, in pixels. Both stores of a unit share one scale
 * and one ground line. On the left the bed in half section, from its centre line to its wall; on
 * the right, at the same heights, the temperature.
 */
export interface Frame {
  readonly width: number;
  readonly height: number;
  readonly pixels_per_m: number;
  readonly bed: {
    readonly left: number;
    readonly right: number;
    readonly top: number;
    readonly bottom: number;
  };
  readonly plot: { readonly left: number; readonly right: number };
  /** Height on the drawing of a distance from the charge inlet. */
  y(position_m: number): number;
  /** Distance from the centre line. */
  r(radius_m: number): number;
  /** Temperature, cut off at the edges of the plot. */
  t(temperature_degC: number): number;
  readonly range_degC: readonly [number, number];
}

const AXIS = 34;
const GAP = 16;
const RIGHT = 10;
const TOP = 30;
const BOTTOM = 44;
/** Greatest share of the width that the half section may take. */
const SECTION_SHARE = 0.4;

export interface Space {
  readonly width: number;
  /** Height for the tallest bed. */
  readonly bedHeight: number;
  /** Side by side: room above the lower bed, so that both stand on one line. */
  readonly beside: boolean;
}

/** Pixels per metre so that the tallest and the widest bed fit. */
export function scaleOf(
  stores: readonly StoreDefinition[],
  { width, bedHeight }: Omit<Space, 'beside'>,
): number {
  const tallest = Math.max(...stores.map((store) => store.length_m));
  const widest = Math.max(...stores.map((store) => store.diameter_m / 2));
  return Math.min(bedHeight / tallest, (SECTION_SHARE * (width - AXIS)) / widest);
}

export function frameOf(
  store: StoreDefinition,
  stores: readonly StoreDefinition[],
  space: Space,
): Frame {
  const pixels_per_m = scaleOf(stores, space);
  const lengths = (space.beside ? stores : [store]).map((one) => one.length_m);
  const tallest = Math.max(...lengths) * pixels_per_m;
  const height = TOP + tallest + BOTTOM;
  const bottom = TOP + tallest;
  const top = bottom - store.length_m * pixels_per_m;
  const left = AXIS;
  const right = left + (store.diameter_m / 2) * pixels_per_m;
  const plot = { left: right + GAP, right: space.width - RIGHT };

  const { reference_cold_degC: low, reference_hot_degC: high } = store;
  const margin = 0.09 * (high - low);
  const range_degC = [low - margin, high + margin] as const;
  const perDegree = (plot.right - plot.left) / (range_degC[1] - range_degC[0]);
  const fromTop = store.charge_inlet_at === 'top';
  return {
    width: space.width,
    height,
    pixels_per_m,
    bed: { left, right, top, bottom },
    plot,
    range_degC,
    y: (position_m) =>
      fromTop ? top + position_m * pixels_per_m : bottom - position_m * pixels_per_m,
    r: (radius_m) => left + radius_m * pixels_per_m,
    t: (temperature_degC) => {
      const x = plot.left + (temperature_degC - range_degC[0]) * perDegree;
      return Math.min(plot.right, Math.max(plot.left, x));
    },
  };
}

/** Round values within a range, about `count` of them. */
export function ticks(from: number, to: number, count: number): number[] {
  const rough = (to - from) / count;
  const power = 10 ** Math.floor(Math.log10(rough));
  const step = [1, 2, 2.5, 5, 10].map((m) => m * power).find((size) => size >= rough) ?? 10 * power;
  const first = Math.ceil(from / step - 1e-9);
  const last = Math.floor(to / step + 1e-9);
  return Array.from({ length: last - first + 1 }, (_, i) =>
    Number(((first + i) * step).toPrecision(12)),
  );
}

export interface Ring {
  readonly id: string;
  readonly inner_m: number;
  readonly outer_m: number;
  /** Where the string is drawn: at its radius, or in the middle where it lies outside its ring. */
  readonly string_m: number;
}

/** The stream tubes as rings of the bed's cross-section, from the strings' radii and area shares. */
export function ringsOf(store: StoreDefinition): Ring[] {
  const radius_m = store.diameter_m / 2;
  const ordered = [...store.strings].sort((a, b) => a.radius_m - b.radius_m);
  let share = 0;
  return ordered.map((string) => {
    const inner_m = radius_m * Math.sqrt(Math.min(1, share));
    share += string.area_share;
    const outer_m = radius_m * Math.sqrt(Math.min(1, share));
    const within = string.radius_m > inner_m && string.radius_m < outer_m;
    return {
      id: string.id,
      inner_m,
      outer_m,
      string_m: within ? string.radius_m : (inner_m + outer_m) / 2,
    };
  });
}
