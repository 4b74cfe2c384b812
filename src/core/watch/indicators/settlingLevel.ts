import type { StoreEnd } from '../../definitions.js';
import type { StoreModel } from '../../track/storeTracker.js';
import { type Entry, startEntry } from './settlingEntry.js';
import { type Followed, startFollowed } from './shown.js';

/** So many of the topmost thermocouples of each string are tested. */
const TESTED = 2;

/** A thermocouple near the top, followed by itself. Plain, as is all of the level. */
export interface Top {
  readonly tube: number;
  readonly sensor: number;
  /** The topmost of its string. */
  readonly first: boolean;
  readonly followed: Followed;
  sum_K: number;
  count: number;
  /** Reading, gas and rock that changes are counted from [K]; null = none. */
  from: {
    readonly stood_s: number;
    readonly read_K: number;
    readonly gas_K: number;
    readonly rock_K: number;
  } | null;
}

/** What is remembered of the level of one store's bed: of the rest that runs, and of all tests. */
export interface Level {
  stood_s: number;
  mean_s: number;
  scans: number;
  gas_K: number;
  /** Tubes as they were when the rest began, marched on by themselves [J/m3]. */
  beds: Float64Array[] | null;
  readonly tops: Top[];
  /** Test of all topmost thermocouples together: a bed mostly sinks as a whole. */
  readonly whole: Followed;
  readonly entry: Entry;
}

/** End of a store that is its top. */
export const topEnd = ({ store }: StoreModel): StoreEnd =>
  store.charge_inlet_at === 'top' ? 'charge_inlet' : 'discharge_inlet';

/** Depth of a position below the bed's top [m]. */
const depthOf = ({ store }: StoreModel, position_m: number): number =>
  store.charge_inlet_at === 'top' ? position_m : store.bed.length_m - position_m;

/** Sensors of a string from the top down, with their depths. */
export function fromTop(model: StoreModel, k: number): { sensor: number; depth_m: number }[] {
  const { string } = model.tubes[k] as StoreModel['tubes'][number];
  return string.thermocouples
    .map(({ position_m }, sensor) => ({ sensor, depth_m: depthOf(model, position_m) }))
    .sort((a, b) => a.depth_m - b.depth_m);
}

/** A level of which nothing is known. */
export function startLevel(model: StoreModel): Level {
  const tops = model.tubes.flatMap((_, tube) =>
    fromTop(model, tube)
      .slice(0, TESTED)
      .map(
        ({ sensor }, i): Top => ({
          tube,
          sensor,
          first: i === 0,
          followed: startFollowed(),
          sum_K: 0,
          count: 0,
          from: null,
        }),
      ),
  );
  return { ...noRest(), tops, whole: startFollowed(), entry: startEntry(tops) };
}

const noRest = (): Omit<Level, 'tops' | 'whole' | 'entry'> => ({
  stood_s: 0,
  mean_s: 0,
  scans: 0,
  gas_K: 0,
  beds: null,
});

/** Forgets a rest that is over. */
export function restart(level: Level): void {
  Object.assign(level, noRest());
  for (const top of level.tops) {
    Object.assign(top, { sum_K: 0, count: 0, from: null });
  }
}
