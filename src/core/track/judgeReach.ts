import { temperatureAt } from '../bed/tables.js';
import { isBelieved, type SensorMemory } from './judgeMemory.js';
import type { Candidate, JudgeWork } from './judgeWork.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeModel, TubeState } from './tube.js';

/**
 * A front between two thermocouples is known through the bed model alone, and what that lacks moves it
 * by a share of the way that no other thermocouple has seen.
 */
const UNSEEN_SHARE = 1 / 20;

/** Within this share of the bed's length of the next thermocouple the profile is seen. */
const SEEN_SHARE = 1 / 10;

/** Of that reach, what a place may have taken up for good: one sigma of an even spread, and less. */
const OWN_SHARE = 1 / 4;

/**
 * How far the profile at a thermocouple may stand from where it is estimated, for want of others that
 * see it there [m]:
 *
 *   r = (d - L/10)/20, not below 0,
 *
 * d the way along the bed to the nearest other thermocouple of the store that is believed and reads, L
 * the bed's length, which also stands for d where there is none. Share and limit are chosen on the finer
 * plant, no source.
 */
export function unseenReach(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  c: Candidate,
): number {
  const { length_m } = model.store.bed;
  let nearest = length_m;
  for (const other of work.candidates) {
    if (other === c || !Number.isFinite(other.value_K)) continue;
    if (!isBelieved(state.sensors[other.tube]?.[other.sensor] as SensorMemory)) continue;
    nearest = Math.min(nearest, Math.abs(other.position_m - c.position_m));
  }
  return UNSEEN_SHARE * Math.max(0, nearest - SEEN_SHARE * length_m);
}

/** What of a reach of `reach_m` a place learned by the filter may be [m], one sigma. */
export const ownReach = (reach_m: number): number => OWN_SHARE * reach_m;

/**
 * Coldest and hottest rock within `reach_m` of `place_m`, less that at the place itself: low <= 0 and
 * high >= 0 [K]. The profile is straight between cell centres and level beyond the outermost.
 */
export function unseenRange(
  { layout, tables }: TubeModel,
  { enthalpy }: TubeState,
  place_m: number,
  reach_m: number,
): readonly [low: number, high: number] {
  const last = layout.cells - 1;
  const cell = (x: number): number =>
    Math.min(last, Math.max(0, (x / tables.bed.length_m) * layout.cells - 0.5));
  const centre = (i: number): number => temperatureAt(tables, enthalpy[i] as number);
  const between = (u: number): number => {
    const i = Math.min(last - 1, Math.floor(u));
    const a = centre(i);
    return a + (u - i) * (centre(i + 1) - a);
  };
  const from = cell(place_m - reach_m);
  const to = cell(place_m + reach_m);
  const here = between(cell(place_m));
  let low = Math.min(here, between(from), between(to));
  let high = Math.max(here, between(from), between(to));
  for (let i = Math.ceil(from); i <= to; i++) {
    const T = centre(i);
    low = Math.min(low, T);
    high = Math.max(high, T);
  }
  return [low - here, high - here];
}
