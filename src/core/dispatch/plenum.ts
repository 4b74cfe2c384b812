import type { StoreEnd } from '../definitions.js';
import type { RolloutStore } from './rollout.js';

/** Well-mixed node of gas and steel: T' = out + (T - out) exp(-dt/tau), tau = (C + rho V cp)/(m cp). */
export function throughPlenum(
  store: RolloutStore,
  plenum_K: number,
  out_K: number,
  flow_kg_s: number,
  dt_s: number,
  end: StoreEnd = 'charge_inlet',
): number {
  const tau = plenumTime(store, plenum_K, out_K, flow_kg_s, end);
  return tau <= 0 ? out_K : out_K + (plenum_K - out_K) * Math.exp(-dt_s / tau);
}

/** Time constant tau of the node [s]; 0 without a plenum. */
function plenumTime(
  store: RolloutStore,
  plenum_K: number,
  out_K: number,
  flow_kg_s: number,
  end: StoreEnd,
): number {
  const { bed } = store.store;
  const cp = bed.fluid.heatCapacity(out_K);
  const gas = bed.end_volume_m3[end] * bed.fluid.density_kg_m3(plenum_K, bed.pressure_Pa) * cp;
  return (bed.end_capacity_J_K[end] + gas) / (flow_kg_s * cp);
}

/**
 * How much later than it should [s] the plenum of `throughPlenum` shows a steadily changing outlet
 * that is known by its means over steps: (dt/2) coth(dt/(2 tau)) - tau, which is dt/2 without a
 * plenum and vanishes for one that is slow against the step.
 */
export function excessLag(
  store: RolloutStore,
  plenum_K: number,
  out_K: number,
  flow_kg_s: number,
  dt_s: number,
  end: StoreEnd = 'charge_inlet',
): number {
  const tau = plenumTime(store, plenum_K, out_K, flow_kg_s, end);
  return dt_s / 2 / Math.tanh(dt_s / (2 * tau)) - tau;
}

/** True once the gas and, by its heat, the steel at the outlet ends have been replaced twice. */
export function isSwept(
  stores: readonly RolloutStore[],
  plenum_K: readonly number[],
  sweptMass: readonly number[],
  t: number,
  end: StoreEnd = 'charge_inlet',
): boolean {
  return stores.every((store, i) => {
    const { bed } = store.store;
    const capacity = bed.end_capacity_J_K[end];
    const volume = bed.end_volume_m3[end];
    if (capacity === 0 && volume === 0) return t > 0;
    const temperature = plenum_K[i] as number;
    const gas = volume * bed.fluid.density_kg_m3(temperature, bed.pressure_Pa);
    const steel = capacity / bed.fluid.heatCapacity(temperature);
    return (sweptMass[i] as number) > 2 * (gas + steel);
  });
}
