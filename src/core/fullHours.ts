import type { UnitDefinition } from './definitions.js';
import { centralHours } from './dispatch/hours.js';
import type { Machine } from './machine/machine.js';
import { type StoreModel, startStore } from './track/storeTracker.js';
import { setTubeTemperatures, type TubeState } from './track/tube.js';
import { resetWall } from './track/wallZone.js';

/** Kinds of units whose hours are remembered: a fleet is built to few designs. */
const MOST_KINDS = 8;

const known: { readonly key: string; readonly hours: number }[] = [];
const numbers = new WeakMap<object, number>();
let numbered = 0;

/**
 * Hours at rated power from stores that stand at their charged reference throughout. It is a rollout
 * of the whole store and costs as much as ten scans, so it is made when it is first asked for, and once
 * for units that differ in nothing but their names.
 */
export function fullHoursOf(
  unit: UnitDefinition,
  machine: Machine,
  models: readonly StoreModel[],
): () => number {
  let hours: number | null = null;
  return () => {
    hours ??= remembered(unit, () => hoursWhenFull(unit, machine, models));
    return hours;
  };
}

function remembered(unit: UnitDefinition, make: () => number): number {
  const key = keyOf(unit);
  const alike = known.find((one) => one.key === key);
  if (alike) return alike.hours;
  const hours = make();
  known.push({ key, hours });
  if (known.length > MOST_KINDS) known.shift();
  return hours;
}

/** Alike for units that are; properties of rock and gas, which are functions, are told apart by who they are. */
function keyOf(unit: UnitDefinition): string {
  return JSON.stringify({ ...unit, id: '', name: '' }, (_, value: unknown) => {
    // JSON has null for each of them.
    if (typeof value === 'number' && !Number.isFinite(value)) return String(value);
    const isOpaque =
      typeof value === 'object' &&
      value !== null &&
      Object.values(value).some((one) => typeof one === 'function');
    return isOpaque ? `#${numberOf(value)}` : value;
  });
}

function numberOf(one: object): number {
  const number = numbers.get(one) ?? ++numbered;
  numbers.set(one, number);
  return number;
}

function hoursWhenFull(
  unit: UnitDefinition,
  machine: Machine,
  models: readonly StoreModel[],
): number {
  const states = models.map((model) => {
    const state = startStore(model);
    const { kind, reference_hot_K, reference_cold_K } = model.store;
    model.tubes.forEach((tube, k) => {
      const full = kind === 'hot' ? reference_hot_K : reference_cold_K;
      const profile = new Float64Array(tube.layout.cells).fill(full);
      setTubeTemperatures(tube, state.tubes[k] as TubeState, profile);
    });
    if (model.wall !== null && state.wall !== null) {
      resetWall(model.tables, state.wall, state.tubes[model.wall.tube] as TubeState);
    }
    return state;
  });
  const input = {
    unit,
    machine,
    models,
    states,
    plenum_K: models.map(() => Number.NaN),
    calibration: null,
    ambient_K: unit.ambient_K,
  };
  return centralHours(input, unit.rated_power_W).hours;
}
