import { enthalpyAt } from '../../../src/core/bed/tables.js';
import type { StoreModel } from '../../../src/core/track/storeTracker.js';
import type { TubeDrive } from '../../../src/core/track/tube.js';
import type { Course, CourseStep } from '../../../src/core/worth/course.js';
import { weighSensors } from '../../../src/core/worth/sensorWorth.js';
import type { StoreWorth } from '../../../src/core/worth/storeWorth.js';
import type { WorthOptions } from '../../../src/core/worth/variants.js';

/** S-shaped front at a share of the bed's length in every tube [J/m3]. */
export function frontAt(store: StoreModel, middle: number, width = 0.1): Float64Array[] {
  const { reference_hot_K: hot, reference_cold_K: cold } = store.store;
  return store.tubes.map(({ layout: { cells } }) =>
    Float64Array.from({ length: cells }, (_, i) => {
      const step = 0.5 - 0.5 * Math.tanh(((i + 0.5) / cells - middle) / width);
      return enthalpyAt(store.tables, cold + (hot - cold) * step);
    }),
  );
}

/** A course of one store through some drives, each with a scan at its end. */
export function courseThrough(
  start: readonly Float64Array[],
  drives: readonly TubeDrive[],
  { loss_at = 0, weigh_from = 0 } = {},
): Course {
  const steps = drives.map((drive): CourseStep => {
    const flux = drive.massFlux_kg_m2s;
    const mode = flux > 0 ? 'charge' : flux < 0 ? 'discharge' : 'stand';
    return { mode, drives: [drive], scans: 1 };
  });
  return { steps, loss_at, weigh_from, start: [start] };
}

export function weighed(
  store: StoreModel,
  course: Course,
  options: Partial<WorthOptions> = {},
): StoreWorth {
  const run = weighSensors(store, 0, course, { places: 0, out_of_use: new Set(), ...options });
  let next = run.next();
  while (!next.done) next = run.next();
  return next.value;
}
