import type { StoreModel } from '../track/storeTracker.js';
import type { TuneRecord } from './record.js';

/** What a recording has that a store's parameters need to be seen. */
export interface Evidence {
  readonly standing_h: number;
  /** Standing with a steep front at a thermocouple [h]. */
  readonly steep_h: number;
  /** Way of the fronts, both directions together [m]. */
  readonly way_m: number;
  /** Distance of the outermost string from the wall, and how far heat reaches meanwhile [m]. */
  readonly toWall_m: number;
  readonly reach_m: number;
}

/** A step between neighbours of so much of the span is a steep front. */
const STEEP = 0.2;

/**
 * @param s index of the store in the bins
 */
export function evidenceOf(store: StoreModel, record: TuneRecord, s: number): Evidence {
  const { bed, strings, reference_hot_K, reference_cold_K } = store.store;
  const { tables } = store;
  const middle = tables.segments >> 1;
  const capacity = tables.heatCapacity[middle] as number;
  const speed = (tables.fluidHeatCapacity[middle] as number) / capacity / bed.area_m2;
  const least = STEEP * (reference_hot_K - reference_cold_K);
  let standing = 0;
  let steep = 0;
  let way = 0;
  let total = 0;
  for (const bin of record.bins) {
    total += bin.dt_s;
    way += Math.abs(bin.flow_kg_s) * speed * bin.dt_s;
    if (bin.flow_kg_s !== 0) continue;
    standing += bin.dt_s;
    if (steepest(bin.readings[s] as Float64Array, store) >= least) steep += bin.dt_s;
  }
  const diffusivity = (tables.stagnant[middle] as number) / capacity;
  return {
    standing_h: standing / 3600,
    steep_h: steep / 3600,
    way_m: way,
    toWall_m: bed.diameter_m / 2 - Math.max(...strings.map((string) => string.radius_m)),
    reach_m: 2 * Math.sqrt(diffusivity * total),
  };
}

/** Largest difference between neighbours of a string [K]. */
function steepest(readings: Float64Array, store: StoreModel): number {
  let most = 0;
  let n = 0;
  for (const string of store.store.strings) {
    string.thermocouples.forEach((_, j) => {
      if (j > 0) {
        const step = Math.abs((readings[n + j] as number) - (readings[n + j - 1] as number));
        if (step > most) most = step;
      }
    });
    n += string.thermocouples.length;
  }
  return most;
}
