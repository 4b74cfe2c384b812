import { createBedWork, wallLossPerVolume } from '../bed/kernel.js';
import { machineSpread, partLoadFactor } from '../dispatch/machineSpread.js';
import { refined } from '../dispatch/refine.js';
import { rolloutStore } from '../dispatch/roller.js';
import { type RolloutStore, rollOut } from '../dispatch/rollout.js';
import { hoursInput } from '../dispatch/unitHours.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import { streamsOf } from '../track/streams.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';

/** As long a discharge as is answered for, in rated hours; step once the lids are swept [s]. */
const MOST_RATED = 4;
const STEP_S = 240;

/**
 * A profile moved along the bed until it holds as much heat as another, ends drawn on: the front of
 * the healthy twin where the bed's stands. By bisection, as the heat falls or rises with the place.
 *
 * @param enthalpy of the cells [J/m3 of bed]
 * @param mean what they are to have in the mean [J/m3 of bed]
 * @returns null where no place within the bed gives it
 */
export function movedTo(enthalpy: Float64Array, mean: number): Float64Array | null {
  const n = enthalpy.length;
  const at = (shift: number): Float64Array =>
    Float64Array.from({ length: n }, (_, i) => {
      const x = Math.min(n - 1, Math.max(0, i - shift));
      const k = Math.min(n - 2, Math.floor(x));
      const [a, b] = [enthalpy[k] as number, enthalpy[k + 1] as number];
      return a + (x - k) * (b - a);
    });
  const meanOf = (cells: Float64Array): number => cells.reduce((sum, h) => sum + h, 0) / n;
  let [low, high] = [-n, n];
  const rises = meanOf(at(high)) > meanOf(at(low));
  const [least, most] = rises ? [low, high] : [high, low];
  if (!(mean >= meanOf(at(least)) && mean <= meanOf(at(most)))) return null;
  for (let i = 0; i < 50; i++) {
    const middle = (low + high) / 2;
    if (meanOf(at(middle)) < mean === rises) low = middle;
    else high = middle;
  }
  return at((low + high) / 2);
}

/** A profile drawn out about its middle: each cell takes what stood nearer by the factor. */
export function drawnOut(enthalpy: Float64Array, factor: number, middle: number): Float64Array {
  const n = enthalpy.length;
  return Float64Array.from({ length: n }, (_, i) => {
    const x = Math.min(n - 1, Math.max(0, middle + (i - middle) / factor));
    const k = Math.min(n - 2, Math.floor(x));
    const [a, b] = [enthalpy[k] as number, enthalpy[k + 1] as number];
    return a + (x - k) * (b - a);
  });
}

/** Mean enthalpy of a store's rock, all streams [J/m3 of bed]. */
export function meanEnthalpy(model: StoreModel, state: StoreState): number {
  return streamsOf(model, state).reduce(
    (sum, { share, enthalpy }) =>
      sum + (share * enthalpy.reduce((s, h) => s + h, 0)) / enthalpy.length,
    0,
  );
}

/**
 * Hours at rated power of the unit with healthy beds: each store one even stream with a given profile,
 * its heat transfer as configured; meter, machine and heat capacity as they are taken to be now.
 *
 * @param profiles of each store, enthalpy of the cells [J/m3 of bed]
 * @returns h, at most four times the rated hours
 */
export function healthyHours(
  model: UnitModel,
  state: UnitState,
  profiles: readonly Float64Array[],
): number {
  const { unit } = model;
  const input = hoursInput(model, state, unit.rated_power_W);
  const stores = model.stores.map((store, s): RolloutStore => {
    const stream = {
      share: 1,
      enthalpy: profiles[s] as Float64Array,
      outlet_K: Number.NaN,
      flowFactor: 1,
      heatTransferFactor: 1,
      wallLoss_W_m3K: wallLossPerVolume(store.tables),
    };
    const logFlow = input.calibration?.mean[s] ?? 0;
    return refined(rolloutStore(store, [stream], input.plenum_K[s] as number, logFlow));
  });
  const works = stores.map((store) =>
    store.tubes.map((tube) => createBedWork(tube.enthalpy.length)),
  );
  const spread = machineSpread(unit);
  const most_s = MOST_RATED * unit.rated_hours * 3600;
  const { end_s } = rollOut(
    {
      unit,
      machine: model.machine,
      stores,
      power_W: unit.rated_power_W,
      workFactor: Math.exp(input.calibration?.mean[model.stores.length] ?? 0),
      partLoad: (flow_kg_s) => partLoadFactor(spread, 'discharge', flow_kg_s),
      ambient_K: input.ambient_K,
      step_s: STEP_S,
      most_s,
      endOnly: true,
    },
    works,
  );
  return Math.min(end_s, most_s) / 3600;
}
