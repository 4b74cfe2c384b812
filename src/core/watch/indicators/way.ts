import type { StoreModel } from '../../track/storeTracker.js';

/** Way that a store's front has gone since the last value. Plain. */
export interface WayState {
  /** Of the twin's front at the last scan, and since the last value [m]. */
  travelled_m: number;
  way_m: number;
}

/**
 * Way since the last value [m], by the twin's, which counts anew where a front has left it.
 *
 * @param state changed in place
 */
export function wayOf(state: WayState, travelled_m: number): number {
  const before = state.travelled_m;
  state.way_m += travelled_m >= before ? travelled_m - before : travelled_m;
  state.travelled_m = travelled_m;
  return state.way_m;
}

/** Mean distance of the thermocouples on the string that has most [m]. */
export function pitchOf({ store, tubes }: StoreModel): number {
  const most = Math.max(...tubes.map(({ string }) => string.thermocouples.length));
  return store.bed.length_m / Math.max(1, most);
}
