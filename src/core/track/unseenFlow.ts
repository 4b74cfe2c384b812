import { energyPosition } from './energyPosition.js';
import { referenceEnthalpies } from './storeEnergy.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { streamsOf } from './streams.js';

/**
 * A string samples one ring of the part of the bed for which it stands; gas flows a little
 * differently in the rings that it does not see. Their lead or lag over the string grows with the
 * way that the front has gone since it was even, and turns with the flow:
 *
 *   sigma_k = UNSEEN_FLOW |x_E - x_0| / L,     sigma_store^2 = sum_k w_k^2 sigma_k^2
 *
 * in state of charge. No reading can show it. About half a per cent between a ring and its
 * neighbourhood in a bed of hundreds of pieces across: common practice, no source.
 */
const UNSEEN_FLOW = 0.006;
/** A front this close to an end of the bed is swept out: what follows starts even. */
const SWEPT = 0.08;

/** Follows where the fronts were last even; called once per scan. */
export function followOrigin(model: StoreModel, state: StoreState, restarted: boolean): void {
  const x = storeEnergyPosition(model, state);
  const share = x / model.store.bed.length_m;
  if (restarted || share < SWEPT || share > 1 - SWEPT) state.origin_m = x;
}

/** One sigma of the state of charge from flow that no string sees [-]. */
export function unseenSigma(model: StoreModel, state: StoreState): number {
  const way = Math.abs(storeEnergyPosition(model, state) - state.origin_m);
  const squares = model.tubes.reduce((sum, tube) => sum + tube.string.area_share ** 2, 0);
  return (UNSEEN_FLOW * way * Math.sqrt(squares)) / model.store.bed.length_m;
}

/** Energy-equivalent position of the store: the area-weighted mean of its streams' [m]. */
export function storeEnergyPosition(model: StoreModel, state: StoreState): number {
  const { charged, discharged } = referenceEnthalpies(model);
  return streamsOf(model, state).reduce((sum, { share, enthalpy }) => {
    const dx = model.store.bed.length_m / enthalpy.length;
    return sum + share * energyPosition(enthalpy, dx, charged, discharged);
  }, 0);
}
