import type { Mode } from '../definitions.js';
import type { StoreModel } from '../track/storeTracker.js';
import { type Spread, spreadOf } from './spread.js';
import type { StoreVariant } from './storeVariant.js';
import type { Variants, WorthOptions } from './variants.js';

/** What a change of the thermocouples does. */
export interface Changed {
  /** Of the store, and of the string that it stands on, with the change. */
  readonly store: Spread;
  readonly string: Spread;
  /** Root-mean-square sigma of the store's state of charge over that without the change, less 1. */
  readonly rise: number;
  /** What the unit does when the change tells most; null where it never tells. */
  readonly most_in: Mode | null;
}

/** What one thermocouple is worth: `Changed` is by its loss. */
export interface SensorWorth extends Changed {
  readonly id: string;
  readonly string_id: string;
  readonly position_m: number;
  readonly group: string | null;
  /** False for one that is out of use: `store` is then with it repaired, and `rise` negative. */
  readonly in_use: boolean;
}

/** What is lost with a card or cold junction: all thermocouples of a group at once. */
export interface GroupWorth extends Omit<Changed, 'string'> {
  readonly id: string;
  /** Of the string that it takes thermocouples of; null where there are several. */
  readonly string: Spread | null;
  readonly thermocouples: number;
  /** Strings of which it takes thermocouples. */
  readonly strings: readonly string[];
}

/** What a whole string is worth, and what one thermocouple more on it would be. */
export interface StringWorth extends Changed {
  readonly id: string;
  readonly radius_m: number;
  readonly thermocouples: number;
  /** Of the string with all its thermocouples. */
  readonly all: Spread;
  /** One thermocouple more, by its place, ascending. */
  readonly one_more: readonly (Changed & { readonly position_m: number })[];
}

/** What the thermocouples of one store are worth; sigmas over the time that was weighed. */
export interface StoreWorth {
  readonly store: string;
  /** With all thermocouples that are in use. */
  readonly all: Spread;
  /** Those in use first, the most precious first. */
  readonly sensors: readonly SensorWorth[];
  readonly groups: readonly GroupWorth[];
  readonly strings: readonly StringWorth[];
}

/** Reads the answer off the tallies of all variants. */
export function answerOf(store: StoreModel, variants: Variants, options: WorthOptions): StoreWorth {
  const all = spreadOf(variants.asIs.store);
  const changed = (variant: StoreVariant): Changed => {
    const spread = spreadOf(variant.store);
    return {
      store: spread,
      string: spreadOf(variant.string),
      rise: all.soc_sigma_rms > 0 ? spread.soc_sigma_rms / all.soc_sigma_rms - 1 : 0,
      most_in: variant.store.rise_in,
    };
  };
  const sensors = store.store.strings.flatMap((string) =>
    string.thermocouples.map(
      ({ id, position_m, group }): SensorWorth => ({
        id,
        string_id: string.id,
        position_m,
        group,
        in_use: !options.out_of_use.has(id),
        ...changed(variants.sensors.get(id) as StoreVariant),
      }),
    ),
  );
  return {
    store: store.store.id,
    all,
    // In use before out of use; then the loss that costs, or the repair that gains, the most.
    sensors: sensors.sort((a, b) =>
      a.in_use !== b.in_use ? (a.in_use ? -1 : 1) : a.in_use ? b.rise - a.rise : a.rise - b.rise,
    ),
    groups: [...variants.groups].map(([id, variant]): GroupWorth => {
      const { string, ...rest } = changed(variant);
      const of = store.store.strings.filter((t) => t.thermocouples.some((c) => c.group === id));
      const count = of.flatMap((t) => t.thermocouples).filter((c) => c.group === id).length;
      const strings = of.map((t) => t.id);
      const only = strings.length === 1 ? string : null;
      return { id, thermocouples: count, strings, string: only, ...rest };
    }),
    strings: store.store.strings.map(
      (string, k): StringWorth => ({
        id: string.id,
        radius_m: string.radius_m,
        thermocouples: string.thermocouples.length,
        all: spreadOf((variants.asIsOf[k] as StoreVariant).string),
        ...changed(variants.strings[k] as StoreVariant),
        one_more: (variants.more[k] ?? []).map(({ position_m, variant }) => ({
          position_m,
          ...changed(variant),
        })),
      }),
    ),
  };
}
