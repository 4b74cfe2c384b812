import type { StringDefinition } from '../definitions.js';
import { NUISANCE } from './priors.js';
import type { TuneBin } from './record.js';
import type { RunPlan, StringGuess } from './simulate.js';

/** What a string has beside the store's parameters; all but `flow` are nuisance. */
export interface StringState {
  flow: number;
  transfer: number;
  conductivity: number;
  /** Heights of the hats laid over the straight lines between the first readings [K]. */
  readonly hats: Float64Array;
}

/** One string of a store, made ready for the fit. */
export interface StringData {
  readonly string: StringDefinition;
  readonly positions_m: readonly number[];
  /** Index of the string's first thermocouple among the store's. */
  readonly first: number;
  /** Profile at the start by straight lines [K], and hats over it: cells x hats, row-major. */
  readonly base_K: Float64Array;
  readonly hats: Float64Array;
  /** Prior sigma of each hat [K]. */
  readonly hatSigma_K: Float64Array;
  /** Way of the front within the run so far, signed [m], per bin; run of each bin, from 0. */
  readonly way_m: Float64Array;
  readonly runOf: Int32Array;
  readonly runs: number;
  /** Knots of the group's wandering offset: index and weight of the later one, per bin. */
  readonly knot: Int32Array;
  readonly knotWeight: Float64Array;
  readonly knots: number;
  /** Whether each thermocouple is believed. */
  readonly used: boolean[];
  /** Whether this is the string beside the wall. */
  readonly rim: boolean;
}

/** Hats are laid this densely [m]: about the width of a steep front. */
const HAT_M = 0.3;
/** Sigma of a hat: least, and as a share of the step between the readings beside it. */
const HAT_LEAST_K = 3;
const HAT_SHARE = 0.25;
/** A first reading is looked for in so many bins. */
const FIRST_BINS = 3;

/** @param cells of the fit's profiles */
export function stringData(plan: RunPlan, k: number, first: number, cells: number): StringData {
  const { store, bins, s } = plan;
  const positions_m = plan.positions_m[k] as readonly number[];
  const { length_m, area_m2 } = store.store.bed;
  const dx = length_m / cells;
  const start = firstReadings(bins, s, first, positions_m);
  const base_K = new Float64Array(cells);
  for (let i = 0; i < cells; i++) base_K[i] = straight(start, (i + 0.5) * dx);
  const count = Math.max(2, Math.round(length_m / HAT_M) + 1);
  const gap = length_m / (count - 1);
  const hats = new Float64Array(cells * count);
  for (let i = 0; i < cells; i++) {
    for (let h = 0; h < count; h++) {
      hats[i * count + h] = Math.max(0, 1 - Math.abs((i + 0.5) * dx - h * gap) / gap);
    }
  }
  const hatSigma_K = Float64Array.from(
    { length: count },
    (_, h) => HAT_LEAST_K + HAT_SHARE * stepAround(start, h * gap),
  );
  const middle = store.tables.segments >> 1;
  const perKilogram =
    (store.tables.fluidHeatCapacity[middle] as number) /
    (store.tables.heatCapacity[middle] as number) /
    area_m2;
  const way_m = new Float64Array(bins.length);
  const runOf = new Int32Array(bins.length);
  const knot = new Int32Array(bins.length);
  const knotWeight = new Float64Array(bins.length);
  const zero = bins[0]?.run ?? 0;
  let way = 0;
  let time = 0;
  bins.forEach((bin, b) => {
    if (b > 0 && bin.run !== bins[b - 1]?.run) way = 0;
    way += bin.flow_kg_s * perKilogram * bin.dt_s;
    way_m[b] = way;
    runOf[b] = bin.run - zero;
    time += bin.dt_s;
    const place = time / NUISANCE.groupKnot_s;
    knot[b] = Math.floor(place);
    knotWeight[b] = place - Math.floor(place);
  });
  return {
    string: store.store.strings[k] as StringDefinition,
    positions_m,
    first,
    base_K,
    hats,
    hatSigma_K,
    way_m,
    runOf,
    runs: (runOf[bins.length - 1] ?? 0) + 1,
    knot,
    knotWeight,
    knots: (knot[bins.length - 1] ?? 0) + 2,
    used: positions_m.map(() => true),
    rim: k === plan.rings.outermost,
  };
}

/** A string as its first readings tell: no departures, no hats. */
export function startStringState(data: StringData): StringState {
  return {
    flow: 0,
    transfer: 0,
    conductivity: 0,
    hats: new Float64Array(data.hatSigma_K.length),
  };
}

/** The string's part of a run; with one hat raised by a kelvin where its index is given. */
export function stringGuess(data: StringData, state: StringState, raised = -1): StringGuess {
  const n = state.hats.length;
  const start_K = data.base_K.map((t, i) => {
    let sum = t;
    for (let h = 0; h < n; h++) {
      const height = (state.hats[h] as number) + (h === raised ? 1 : 0);
      sum += height * (data.hats[i * n + h] as number);
    }
    return sum;
  });
  return { flow: state.flow, transfer: state.transfer, conductivity: state.conductivity, start_K };
}

/** First reading of each thermocouple within the first bins; those without one are left out. */
function firstReadings(
  bins: readonly TuneBin[],
  s: number,
  first: number,
  positions_m: readonly number[],
): { x: number; t: number }[] {
  return positions_m.flatMap((x, j) => {
    for (const bin of bins.slice(0, FIRST_BINS)) {
      const t = bin.readings[s]?.[first + j] ?? Number.NaN;
      if (Number.isFinite(t)) return [{ x, t }];
    }
    return [];
  });
}

function straight(points: readonly { x: number; t: number }[], x: number): number {
  const after = points.findIndex((p) => p.x >= x);
  if (after === 0) return points[0]?.t as number;
  if (after < 0) return points[points.length - 1]?.t as number;
  const a = points[after - 1] as { x: number; t: number };
  const b = points[after] as { x: number; t: number };
  return a.t + ((b.t - a.t) * (x - a.x)) / (b.x - a.x);
}

/** Range of the readings beside a place and next to those [K]: what may hide between them. */
function stepAround(points: readonly { x: number; t: number }[], x: number): number {
  const after = points.findIndex((p) => p.x >= x);
  const i = after < 0 ? points.length - 1 : after;
  const near = points.slice(Math.max(0, i - 2), i + 2).map((p) => p.t);
  return Math.max(...near) - Math.min(...near);
}
