import type { Direction, StoreEnd } from '../definitions.js';
import type { StoreModel } from '../track/storeTracker.js';

/** Temperature of plenum and lid steel at both ends of a store [K]; NaN before anything was read. */
export type EndSteel = Record<StoreEnd, number>;

/** Steel of which nothing is known yet. */
export function startEndSteel(): EndSteel {
  return { charge_inlet: Number.NaN, discharge_inlet: Number.NaN };
}

/**
 * Gas on its way into a bed meets the steel of that end, a well-mixed node:
 *
 *   C dTe/dt = m cp (Tin - Te),    gas into the bed at Te
 *
 * relaxed exactly over the step; its mean is returned. At the other end the gas leaving has the
 * steel's temperature, as measured there. Steel that nothing has been read of takes the gas's.
 *
 * @param entering_K gas in the pipe on the way in [K]
 * @param leaving_K gas measured in the pipe on the way out [K], NaN = not measured
 * @param flow_kg_s of either sign, not 0
 * @returns mean temperature of the gas that enters the bed [K]
 */
export function passEnd(
  store: StoreModel,
  steel: EndSteel,
  direction: Direction,
  entering_K: number,
  leaving_K: number,
  flow_kg_s: number,
  dt_s: number,
): number {
  const [inEnd, outEnd]: [StoreEnd, StoreEnd] =
    direction === 'charge'
      ? ['charge_inlet', 'discharge_inlet']
      : ['discharge_inlet', 'charge_inlet'];
  if (Number.isFinite(leaving_K)) steel[outEnd] = leaving_K;
  const { bed } = store.store;
  const capacity = bed.end_capacity_J_K[inEnd];
  const before = steel[inEnd];
  if (capacity <= 0 || !Number.isFinite(before)) {
    steel[inEnd] = entering_K;
    return entering_K;
  }
  const tau = capacity / (Math.abs(flow_kg_s) * bed.fluid.heatCapacity(entering_K));
  const fade = Math.exp(-dt_s / tau);
  const after = entering_K + (before - entering_K) * fade;
  steel[inEnd] = after;
  return entering_K + ((before - entering_K) * (1 - fade) * tau) / dt_s;
}
