import type { UnitDefinition } from './definitions.js';

/**
 * What of a unit's definition shapes its state, as texts to be compared: by part, so that an edit costs
 * no more than what it touches. Functions (material laws) do not print, their names and ranges do.
 */
export interface UnitShape {
  /** Each store with its bed, strings and thermocouples, by id. */
  readonly stores: Readonly<Record<string, string>>;
  readonly machine: string;
  /** Rated power and hours, in which the energy lost is told. */
  readonly rating: string;
  /** Channels, scan period and whatever else is in a definition. */
  readonly rest: string;
}

/**
 * The shape of a unit. Names, limits, outages, connection, watch rules, asked powers, the assumed ambient
 * and the estimator's priors are not in it: a state saved under others of these is as good as before.
 */
export function shapeOf(unit: UnitDefinition): UnitShape {
  const { name, ambient_K, limits, watch, hours_at_W, hours_every_s, ...shaping } = unit;
  const { stores, machine, rated_power_W, rated_hours, estimator, ...others } = shaping;
  const { cells } = { ...estimator };
  return {
    stores: Object.fromEntries(
      stores.map((store) => [store.id, JSON.stringify({ ...store, cells })]),
    ),
    machine: JSON.stringify(machine),
    rating: JSON.stringify({ rated_power_W, rated_hours }),
    // The order of the stores is that of the state's arrays.
    rest: JSON.stringify({ ...others, stores: stores.map(({ id }) => id) }),
  };
}
