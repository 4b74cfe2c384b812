import { type BedWork, bedSubstep, createBedWork, planSubsteps } from '../../bed/kernel.js';
import { type BedTables, temperatureAt } from '../../bed/tables.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import { type Stream, streamsOf } from '../../track/streams.js';
import { exchangeAtWall } from '../../track/wallExchange.js';
import { shareAround, type WallModel } from '../../track/wallZone.js';
import { type FinerWall, finerWall } from './finerWall.js';

/** What is varied, one thing at a time, to learn how readings of a rest depend on it. */
export const VARIANTS = ['as_configured', 'mantle', 'ends', 'conductivity'] as const;
export type Variant = (typeof VARIANTS)[number];

/** Losses are doubled, conductivity taken so many times. */
export const CONDUCTIVITY_STEP = 1.2;

/** A store's tables and wall with one thing varied. */
interface VariedStore {
  readonly tables: BedTables;
  readonly wall: WallModel | null;
  readonly mantle: number;
}

/** The beds of a store that stands: tubes, layers of the finer wall zone, and the wall's steel. Plain. */
export interface StandingBeds {
  readonly streams: Float64Array[];
  readonly steel_K: Float64Array | null;
}

const finer = new WeakMap<StoreModel, FinerWall>();
const varied = new WeakMap<StoreModel, Readonly<Record<Variant, VariedStore>>>();
const works = new Map<number, BedWork>();

function finerOf(model: StoreModel): FinerWall | null {
  if (model.wall === null) return null;
  const known =
    finer.get(model) ??
    finerWall(model.store.bed, model.tubes[model.wall.tube]?.string.radius_m ?? 0, model.wall);
  finer.set(model, known);
  return known;
}

function variantsOf(model: StoreModel): Readonly<Record<Variant, VariedStore>> {
  const known = varied.get(model);
  if (known !== undefined) return known;
  const { tables } = model;
  const wall = finerOf(model)?.wall ?? null;
  const { bed } = tables;
  const made: Record<Variant, VariedStore> = {
    as_configured: { tables, wall, mantle: 1 },
    mantle: {
      tables,
      wall: wall === null ? null : { ...wall, loss_W_m3K: 2 * wall.loss_W_m3K },
      mantle: 2,
    },
    // The ends' losses alone go by the tables' bed; the mantle's are given with each step.
    ends: {
      tables: { ...tables, bed: { ...bed, loss_factor: 2 * bed.loss_factor } },
      wall,
      mantle: 1,
    },
    conductivity: {
      tables: { ...tables, stagnant: tables.stagnant.map((k) => CONDUCTIVITY_STEP * k) },
      wall,
      mantle: 1,
    },
  };
  varied.set(model, made);
  return made;
}

/** Cells that are enough along a bed that stands: heat comes 0.3 m from the ends in a day of a cold store. */
const ENOUGH = 80;

/** Means of as many cells together as divide the bed evenly and leave enough. */
function merged(cells: Float64Array): Float64Array {
  let each = Math.max(1, Math.floor(cells.length / ENOUGH));
  while (cells.length % each !== 0) each--;
  return Float64Array.from({ length: cells.length / each }, (_, i) => {
    let sum = 0;
    for (let j = i * each; j < (i + 1) * each; j++) sum += cells[j] as number;
    return sum / each;
  });
}

/** A copy of the beds as they are estimated now, on cells that are enough. */
export function copyBeds(model: StoreModel, state: StoreState): StandingBeds {
  const streams = streamsOf(model, state);
  const steel = streams.at(-1)?.wall?.steel_K;
  const tubes = model.tubes.length;
  const pieces = finerOf(model)?.from ?? [];
  const beside = model.wall?.tube ?? 0;
  const order = [...model.tubes.keys(), ...pieces.map((l) => (l < 0 ? beside : tubes + l))];
  return {
    streams: order.map((i) => merged((streams[i] as Stream).enthalpy)),
    steel_K: steel === undefined ? null : merged(steel),
  };
}

/**
 * Beds that stand, over `dt_s`: conduction along every stream, losses at its ends and, where no wall
 * zone carries it, through the mantle; then the exchange of layers, steel and the tube beside them.
 *
 * @param beds changed in place
 */
export function standOn(
  model: StoreModel,
  variant: Variant,
  beds: StandingBeds,
  ambient_K: number,
  dt_s: number,
): void {
  const { tables, wall, mantle } = variantsOf(model)[variant];
  const { streams, steel_K } = beds;
  streams.forEach((enthalpy, k) => {
    const step = {
      massFlux_kg_m2s: 0,
      inlet_K: ambient_K,
      ambient_K,
      dt_s,
      heatTransferFactor: 1,
      wallLoss_W_m3K: mantle * (model.tubes[k]?.wallLoss_W_m3K ?? 0),
    };
    const cells = enthalpy.length;
    const work = works.get(cells) ?? createBedWork(cells);
    works.set(cells, work);
    const substeps = planSubsteps(tables, cells, step);
    const part = { ...step, dt_s: dt_s / substeps };
    for (let n = 0; n < substeps; n++) bedSubstep(tables, enthalpy, part, work);
  });
  if (wall === null || steel_K === null) return;
  const beside = streams[wall.tube] as Float64Array;
  const layers = streams.slice(model.tubes.length);
  const before = wall.ring.length > 1 ? beside.slice() : null;
  exchangeAtWall(wall, tables, layers, steel_K, beside, { massFlux_kg_m2s: 0, ambient_K, dt_s });
  if (before !== null) {
    const tubes = streams.slice(0, model.tubes.length).map((enthalpy) => ({ enthalpy }));
    shareAround(wall, tubes, before);
  }
}

/** Temperature of the rock at each thermocouple, by tube and sensor, and its slope along the bed. */
export function rockAt(
  model: StoreModel,
  beds: StandingBeds,
): { temperature_K: number[]; slope_K_m: number[] } {
  const temperature_K: number[] = [];
  const slope_K_m: number[] = [];
  model.tubes.forEach(({ string }, k) => {
    const bed = beds.streams[k] as Float64Array;
    const dx = model.store.bed.length_m / bed.length;
    for (const { position_m } of string.thermocouples) {
      const place = position_m / dx - 0.5;
      const cell = Math.min(bed.length - 2, Math.max(0, Math.floor(place)));
      const share = Math.min(1, Math.max(0, place - cell));
      const a = temperatureAt(model.tables, bed[cell] as number);
      const b = temperatureAt(model.tables, bed[cell + 1] as number);
      temperature_K.push(a + share * (b - a));
      slope_K_m.push((b - a) / dx);
    }
  });
  return { temperature_K, slope_K_m };
}
