import { enthalpyAt } from '../bed/tables.js';
import type { HeatCapacity } from '../dispatch/heatCapacity.js';
import type { AheadModel, BedsAhead } from './bedsAhead.js';

const J_PER_MWH = 3.6e9;

/**
 * Heat (or cold) in each store above its discharged reference [MWh_th], with the rock's heat capacity
 * as it was found: E = A L exp(c) (mean H - H_d), positive when charged; see storeEnergy.
 *
 * @param capacity ln(heat capacity over the configured one) of each store; see heatCapacities
 * @returns in the order of the unit's stores
 */
export function contentOf(
  model: AheadModel,
  ahead: BedsAhead,
  capacity: readonly HeatCapacity[],
): number[] {
  return model.stores.map((own, s) => {
    const { kind, reference_cold_K, reference_hot_K, bed } = own.store;
    const hot = kind === 'hot';
    const discharged = enthalpyAt(own.tables, hot ? reference_cold_K : reference_hot_K);
    let mean = 0;
    own.tubes.forEach((tube, k) => {
      const cells = ahead.beds[s]?.[k] as Float64Array;
      let sum = 0;
      for (const h of cells) sum += h - discharged;
      mean += (tube.area_share * sum) / cells.length;
    });
    const log = capacity[s]?.log ?? 0;
    return ((hot ? mean : -mean) * bed.area_m2 * bed.length_m * Math.exp(log)) / J_PER_MWH;
  });
}

/** Figures of the stores by their ids. */
export function byStore(model: AheadModel, values: readonly number[]): Record<string, number> {
  return Object.fromEntries(model.stores.map((own, s) => [own.store.id, values[s] as number]));
}
