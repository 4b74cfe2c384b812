import { createBedWork, stepBed } from '../../bed/kernel.js';
import { temperatureAt } from '../../bed/tables.js';
import type { StoreModel } from '../../track/storeTracker.js';
import type { TubeModel, TubeState } from '../../track/tube.js';

/** Where a tested thermocouple hangs. */
export interface Place {
  readonly tube: number;
  readonly sensor: number;
}

/** Gas that enters at the top over a step. */
interface Entering {
  readonly massFlux_kg_m2s: number;
  readonly inlet_K: number;
  readonly ambient_K: number;
  readonly dt_s: number;
}

/**
 * One step of a tube, as the filter has its flow and heat transfer.
 *
 * @param bed changed in place
 * @returns gas-to-rock lag of its cells from the top down [m]
 */
export function stepEntering(
  { tables, store }: StoreModel,
  tube: TubeModel,
  { further }: TubeState,
  bed: Float64Array,
  { massFlux_kg_m2s, inlet_K, ambient_K, dt_s }: Entering,
): Float64Array {
  const of = (index: number): number => further[index - tube.layout.cells] as number;
  const work = createBedWork(bed.length);
  const now = {
    massFlux_kg_m2s: massFlux_kg_m2s * Math.exp(of(tube.layout.flow)),
    inlet_K,
    ambient_K,
    dt_s,
    heatTransferFactor: Math.exp(of(tube.layout.transfer)),
    wallLoss_W_m3K: tube.wallLoss_W_m3K,
  };
  stepBed(tables, bed, now, work);
  return store.charge_inlet_at === 'top' ? work.gasLag_m : work.gasLag_m.toReversed();
}

/** Depth of a thermocouple below the bed's top [m]. */
export function depthOf({ tubes, store }: StoreModel, { tube, sensor }: Place): number {
  const x = tubes[tube]?.string.thermocouples[sensor]?.position_m ?? 0;
  return store.charge_inlet_at === 'top' ? x : store.bed.length_m - x;
}

/** Rock of the n-th cell from the top [K]. */
function rockOf({ tables, store }: StoreModel, bed: Float64Array, n: number): number {
  const cell = store.charge_inlet_at === 'top' ? n : bed.length - 1 - n;
  return temperatureAt(tables, bed[cell] as number);
}

/** Rock at a depth [K], between the middles of its cells. */
export function rockAt(model: StoreModel, bed: Float64Array, depth_m: number): number {
  const place = (depth_m * bed.length) / model.store.bed.length_m - 0.5;
  const n = Math.max(0, Math.min(bed.length - 2, Math.floor(place)));
  const share = Math.max(0, Math.min(1, place - n));
  return (1 - share) * rockOf(model, bed, n) + share * rockOf(model, bed, n + 1);
}

/**
 * Rock at a depth, and the gas there that has come down to it: in each cell it nears the rock by
 * exp(-dx/lag).
 *
 * @param lag_m of the cells, from the top
 */
export function seenAt(
  model: StoreModel,
  bed: Float64Array,
  lag_m: Float64Array,
  depth_m: number,
  inlet_K: number,
): { gas: number; rock: number } {
  const dx = model.store.bed.length_m / bed.length;
  let gas = inlet_K;
  for (let n = 0; n * dx < depth_m && n < bed.length; n++) {
    const rock = rockOf(model, bed, n);
    const way = Math.min(dx, depth_m - n * dx);
    gas = rock + (gas - rock) * Math.exp(-way / (lag_m[n] as number));
  }
  return { gas, rock: rockAt(model, bed, depth_m) };
}
