import type { StringDefinition } from '../definitions.js';
import type { StoreModel } from '../track/storeTracker.js';
import { type StoreVariant, variantOf } from './storeVariant.js';
import { type WeighedTube, withOneMore, withoutSensors, withSensor } from './weighedTube.js';

/** What is tried, and what is there to begin with. */
export interface WorthOptions {
  /** Places along each string at which one more is tried; 0 = none. */
  readonly places: number;
  /** Thermocouples that are not read, by id. */
  readonly out_of_use: ReadonlySet<string>;
}

/** A store as it is and with each thing lost or added, side by side. */
export interface Variants {
  /** Every tube that is stepped beside the store's own. */
  readonly tubes: readonly { readonly k: number; readonly tube: WeighedTube }[];
  readonly all: readonly StoreVariant[];
  readonly asIs: StoreVariant;
  readonly asIsOf: readonly StoreVariant[];
  /** By id of the thermocouple. */
  readonly sensors: ReadonlyMap<string, StoreVariant>;
  readonly groups: ReadonlyMap<string, StoreVariant>;
  readonly strings: readonly StoreVariant[];
  readonly more: readonly (readonly { position_m: number; variant: StoreVariant }[])[];
}

/** All variants of a store, from what its tubes know now. */
export function makeVariants(
  store: StoreModel,
  base: readonly WeighedTube[],
  options: WorthOptions,
): Variants {
  const tubes: { k: number; tube: WeighedTube }[] = [];
  const all: StoreVariant[] = [];
  const known = new Map<string, WeighedTube>();
  const added = (k: number, tube: WeighedTube): WeighedTube => {
    tubes.push({ k, tube });
    return tube;
  };
  const variant = (of: ReadonlyMap<number, WeighedTube>): StoreVariant => {
    const made = variantOf(of);
    all.push(made);
    return made;
  };
  /** Cards and strings often take the same thermocouples: such a tube runs once. */
  const without = (k: number, lost: ReadonlySet<string>): WeighedTube => {
    const name = `${k} ${[...lost].join(' ')}`;
    const tube =
      known.get(name) ??
      added(
        k,
        withoutSensors(base[k] as WeighedTube, (id) => lost.has(id)),
      );
    known.set(name, tube);
    return tube;
  };
  const inUse = (string: StringDefinition): string[] =>
    string.thermocouples.map(({ id }) => id).filter((id) => !options.out_of_use.has(id));
  const strings = store.store.strings;
  const sensors = new Map<string, StoreVariant>();
  const groups = new Map<string, StoreVariant>();
  strings.forEach((string, k) => {
    for (const { id } of string.thermocouples) {
      const tube = options.out_of_use.has(id)
        ? added(k, withSensor(base[k] as WeighedTube, id))
        : without(k, new Set([id]));
      sensors.set(id, variant(new Map([[k, tube]])));
    }
  });
  for (const group of groupsOf(store)) {
    const touched = new Map<number, WeighedTube>();
    strings.forEach((string, k) => {
      const lost = string.thermocouples.filter((t) => t.group === group).map((t) => t.id);
      const read = lost.filter((id) => !options.out_of_use.has(id));
      if (read.length > 0) touched.set(k, without(k, new Set(read)));
    });
    if (touched.size > 0) groups.set(group, variant(touched));
  }
  return {
    tubes,
    all,
    asIs: variant(new Map()),
    asIsOf: base.map((tube, k) => variant(new Map([[k, tube]]))),
    sensors,
    groups,
    strings: strings.map((string, k) =>
      variant(new Map([[k, without(k, new Set(inUse(string)))]])),
    ),
    more: base.map((tube, k) =>
      placesOf(store, options).map((position_m) => ({
        position_m,
        variant: variant(new Map([[k, added(k, withOneMore(tube, position_m))]])),
      })),
    ),
  };
}

function groupsOf(store: StoreModel): string[] {
  const names = store.store.strings.flatMap((s) => s.thermocouples.map((t) => t.group));
  return [...new Set(names)].filter((name) => name !== null);
}

/** Middles of equal parts of the bed [m]. */
function placesOf(store: StoreModel, { places }: WorthOptions): number[] {
  const { length_m } = store.store.bed;
  return Array.from({ length: places }, (_, i) => ((i + 0.5) * length_m) / places);
}
