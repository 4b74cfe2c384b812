import type { StoreEnergy } from '../track/storeEnergy.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { calibrate } from './calibration.js';

/** ln(heat capacity of a bed over the configured one), and its sigma. */
export interface HeatCapacity {
  readonly log: number;
  readonly sigma: number;
}

/**
 * What is known of each store's heat capacity: from the calibration, before a store has started the
 * prior alone.
 */
export function heatCapacities(model: UnitModel, state: UnitState): readonly HeatCapacity[] {
  if (state.stores.every((store) => store.started)) return calibrate(model, state, 1).capacity;
  const sigma = model.unit.estimator.heat_capacity_sigma;
  return model.stores.map(() => ({ log: 0, sigma }));
}

/**
 * Stored heat with the rock's heat capacity as it was found: E = soc E_full exp(c),
 * sigma_E = E_full exp(c) hypot(sigma_soc, soc sigma_c). The state of charge, a ratio, stays.
 */
export function withHeatCapacity(energy: StoreEnergy, { log, sigma }: HeatCapacity): StoreEnergy {
  const full = energy.capacity_MWh_th * Math.exp(log);
  return {
    ...energy,
    stored_MWh_th: energy.soc * full,
    stored_sigma_MWh_th: full * Math.hypot(energy.soc_sigma, energy.soc * sigma),
    capacity_MWh_th: full,
  };
}
