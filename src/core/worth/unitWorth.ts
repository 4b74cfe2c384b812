import type { Mode, UnitDefinition } from '../definitions.js';
import type { RejectedSensor } from '../estimate.js';
import { unitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { type Course, cycleCourse } from './course.js';
import { presentCourse } from './presentCourse.js';
import { weighSensors } from './sensorWorth.js';
import type { StoreWorth } from './storeWorth.js';

/** What sigmas were followed along. */
export type WorthOver =
  | {
      readonly kind: 'day';
      readonly charge_h: number;
      readonly discharge_h: number;
      readonly stand_h: number;
    }
  | { readonly kind: 'now'; readonly mode: Mode; readonly hours: number }
  | { readonly kind: 'recording'; readonly recording: string; readonly covered_h: number };

/** What the thermocouples of a unit are worth. */
export interface UnitWorth {
  readonly unit: string;
  readonly over: WorthOver;
  /** Hours at rated power from full stores: turns a state of charge into hours [h]. */
  readonly full_hours: number;
  /** Counted as out of use. */
  readonly rejected: readonly RejectedSensor[];
  readonly stores: readonly StoreWorth[];
}

/** A course with what has to be said of it. */
export interface Weighing {
  readonly course: Course;
  readonly over: WorthOver;
  readonly rejected: readonly RejectedSensor[];
}

/** Over a settled day; see `cycleCourse`. */
export function dayWeighing(unit: UnitDefinition): Weighing {
  const { course, cycle } = cycleCourse(unitModel(unit));
  const seconds = course.steps
    .slice(course.weigh_from)
    .reduce((sum, step) => sum + (step.drives[0]?.dt_s ?? 0), 0);
  const charge_h = cycle.charge.hours;
  const discharge_h = cycle.discharge.hours;
  const stand_h = seconds / 3600 - charge_h - discharge_h;
  return { course, over: { kind: 'day', charge_h, discharge_h, stand_h }, rejected: [] };
}

/** Over the hours ahead of a state; null before every store has started. See `presentCourse`. */
export function presentWeighing(unit: UnitDefinition, state: UnitState): Weighing | null {
  const found = presentCourse(unitModel(unit), state);
  if (found === null) return null;
  const { course, mode, hours, rejected } = found;
  return { course, over: { kind: 'now', mode, hours }, rejected };
}

/**
 * Weighs stores of a unit one after another: yields the share done, returns the answer.
 *
 * @param stores indices of the stores
 * @param places along each string at which one more is tried; 0 = none
 */
export function* weighUnit(
  unit: UnitDefinition,
  { course, over, rejected }: Weighing,
  stores: readonly number[],
  places: number,
): Generator<number, UnitWorth> {
  const model = unitModel(unit);
  const out_of_use = new Set(rejected.map(({ id }) => id));
  const found: StoreWorth[] = [];
  for (const s of stores) {
    const store = model.stores[s];
    if (store === undefined) throw new RangeError(`store ${s}: not in unit ${unit.id}`);
    const run = weighSensors(store, s, course, { places, out_of_use });
    let next = run.next();
    while (!next.done) {
      yield (found.length + next.value) / stores.length;
      next = run.next();
    }
    found.push(next.value);
  }
  return { unit: unit.id, over, full_hours: model.fullHours(), rejected, stores: found };
}

/** Places along each string at which one thermocouple more is tried over a day. */
const DAY_PLACES = 10;

/**
 * What all thermocouples of a unit are worth: over the hours ahead of a state, or over a settled day
 * (null), then with what one more would gain. A generator, as `weighUnit`.
 *
 * @returns null before every store has started
 */
export function* unitWorth(
  unit: UnitDefinition,
  state: UnitState | null,
): Generator<number, UnitWorth | null> {
  const weighing = state === null ? dayWeighing(unit) : presentWeighing(unit, state);
  if (weighing === null) return null;
  const stores = unit.stores.map((_, s) => s);
  return yield* weighUnit(unit, weighing, stores, state === null ? DAY_PLACES : 0);
}
