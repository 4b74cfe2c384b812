import type { Mode, StringDefinition } from '../definitions.js';
import { type StoreModel, type StoreState, startStore } from '../track/storeTracker.js';
import type { TubeModel, TubeScratch } from '../track/tube.js';
import { followOrigin } from '../track/unseenFlow.js';
import { resetWall, stepWall } from '../track/wallZone.js';
import type { Course, CourseStep, TubeMean } from './course.js';
import { type Spread, spreadOf } from './spread.js';
import { type StoreVariant, storeSigmas, tallyVariant, variantOf } from './storeVariant.js';
import {
  stepWeighed,
  takeMean,
  type WeighedTube,
  weighedTube,
  withOneMore,
  withoutSensors,
  withSensor,
} from './weighedTube.js';

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

export interface SensorWorth extends Changed {
  readonly id: string;
  readonly string_id: string;
  readonly position_m: number;
  readonly group: string | null;
  /** False for one that is out of use: `store` is then with it repaired, and `rise` negative. */
  readonly in_use: boolean;
}

export interface GroupWorth extends Omit<Changed, 'string'> {
  readonly id: string;
  /** Of the string that it takes thermocouples of; null where there are several. */
  readonly string: Spread | null;
  readonly thermocouples: number;
  /** Strings of which it takes thermocouples. */
  readonly strings: readonly string[];
}

export interface StringWorth extends Changed {
  readonly id: string;
  readonly radius_m: number;
  readonly thermocouples: number;
  /** Of the string with all its thermocouples. */
  readonly all: Spread;
  /** One thermocouple more, by its place, ascending. */
  readonly one_more: readonly (Changed & { readonly position_m: number })[];
}

export interface StoreWorth {
  readonly store: string;
  /** With all thermocouples that are in use. */
  readonly all: Spread;
  /** Those in use first, the most precious first. */
  readonly sensors: readonly SensorWorth[];
  readonly groups: readonly GroupWorth[];
  readonly strings: readonly StringWorth[];
}

export interface WorthOptions {
  /** Places along each string at which one more is tried; 0 = none. */
  readonly places: number;
  /** Thermocouples that are not read, by id. */
  readonly out_of_use: ReadonlySet<string>;
}

/** Without readings sigmas are formed this often [s]. */
const LONGEST_UNWEIGHED_S = 900;

/**
 * What each thermocouple of a store is worth: the covariance recursion of its tubes along a course,
 * with all thermocouples until the loss, from then on once for each thing lost or added, all side by
 * side. Nothing is read: see `WeighedTube`. Only the tubes that a change touches run again, and the
 * store's sigmas are formed as the estimate forms them, with what the tubes share.
 *
 * A generator, so that whoever drains it can show progress and stop: yields the share done, returns
 * the answer.
 *
 * @param s index of the store in the course
 * @throws RangeError for a course that weighs nothing, or has no store `s`
 */
export function* weighSensors(
  store: StoreModel,
  s: number,
  course: Course,
  options: WorthOptions,
): Generator<number, StoreWorth> {
  const start = course.start[s];
  if (start === undefined) throw new RangeError(`store ${s}: not there`);
  const { steps, loss_at, weigh_from } = course;
  if (!(loss_at <= weigh_from && weigh_from < steps.length)) {
    throw new RangeError(`weigh_from = ${weigh_from}: expected ${loss_at} to ${steps.length - 1}`);
  }
  const known = course.states?.[s];
  const state = known === undefined ? freshState(store, start) : structuredClone(known);
  const base = store.tubes.map((tube, k): WeighedTube => {
    const own = state.tubes[k] as WeighedTube['state'];
    return weighedTube(tube, (id) => !options.out_of_use.has(id), own);
  });
  let variants: Variants | null = null;
  const total = workOf(store, course, options);
  let done = 0;
  let since_s = 0;
  for (let n = 0; n < steps.length; n++) {
    if (n === loss_at) variants = makeVariants(store, base, options);
    const step = steps[n] as CourseStep;
    const drive = step.drives[s] as CourseStep['drives'][number];
    for (const tube of base) stepWeighed(tube, drive, step.scans);
    moveMean(store, state, base, step, s);
    if (variants !== null) {
      for (const { k, tube } of variants.tubes) {
        stepWeighed(tube, drive, step.scans);
        takeMean(tube, state.tubes[k] as TubeMean, (store.tubes[k] as TubeModel).layout);
      }
    }
    followOrigin(store, state, false);
    done += base.length + (variants?.tubes.length ?? 0);
    if (n >= weigh_from && variants !== null) {
      since_s += drive.dt_s;
      // Between readings sigma hardly grows, and it costs as much to form as the step itself.
      if (step.scans > 0 || since_s >= LONGEST_UNWEIGHED_S || n + 1 === steps.length) {
        const compared = storeSigmas(store, state, new Map()).soc;
        const weight = { dt_s: since_s, mode: step.mode, compared };
        for (const variant of variants.all) tallyVariant(variant, store, state, weight);
        since_s = 0;
      }
    }
    yield done / total;
  }
  return answerOf(store, variants as Variants, options);
}

/** A store that knows nothing but stands where the course begins. */
function freshState(store: StoreModel, start: readonly Float64Array[]): StoreState {
  const state = startStore(store);
  state.started = true;
  state.tubes.forEach((tube, k) => {
    tube.enthalpy.set(start[k] as Float64Array);
  });
  if (store.wall !== null && state.wall !== null) {
    const beside = state.tubes[store.wall.tube] as WeighedTube['state'];
    resetWall(store.tables, state.wall, beside);
  }
  followOrigin(store, state, true);
  return state;
}

/** The mean of the tubes: as recorded, else the model's own, with the zone at the wall. */
function moveMean(
  store: StoreModel,
  state: StoreState,
  base: readonly WeighedTube[],
  step: CourseStep,
  s: number,
): void {
  const recorded = step.means?.[s];
  if (recorded !== undefined) {
    base.forEach((tube, k) => {
      takeMean(tube, recorded[k] as TubeMean, tube.model.layout);
    });
    return;
  }
  if (store.wall === null || state.wall === null) return;
  const { tube: k } = store.wall;
  const { model, state: tube } = base[k] as WeighedTube;
  const drive = step.drives[s] as CourseStep['drives'][number];
  stepWall(store.wall, model, tube, state.wall, drive, store.scratch[k] as TubeScratch);
}

interface Variants {
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

function makeVariants(
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

/** Steps of tubes that a course takes, for progress: about right, a shared tube counts twice. */
function workOf(store: StoreModel, course: Course, options: WorthOptions): number {
  const { length } = course.steps;
  const sensors = store.channels.flat().length;
  const strings = store.tubes.length;
  const beside = sensors + strings * (options.places + 1);
  return strings * length + beside * (length - course.loss_at);
}

function answerOf(store: StoreModel, variants: Variants, options: WorthOptions): StoreWorth {
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
