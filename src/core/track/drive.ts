import type { Direction } from '../definitions.js';
import type { StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import type { Conditions } from './conditions.js';
import { meanTemperatureAt } from './storeEstimate.js';
import type { StoreState } from './storeTracker.js';
import type { TubeDrive } from './tube.js';

/** Sigma of an inlet temperature that the machine model stands in for [K]. */
const ASSUMED_INLET_SIGMA_K = 15;

/** Gas leaving each store in either direction: as measured, else as the tubes tell [K]. */
export function storeOutlets(
  model: UnitModel,
  state: UnitState,
  scan: Scan | null,
): Record<Direction, StoreTemperatures> {
  const at = (s: number, direction: Direction): number => {
    const store = model.stores[s];
    if (store === undefined) return Number.NaN;
    const end = direction === 'charge' ? 'discharge_inlet' : 'charge_inlet';
    const channel = model.map.gas[store.store.id]?.[end] ?? -1;
    const read = channel >= 0 && scan !== null ? (scan.values[channel] as number) : Number.NaN;
    const running = state.mode === direction;
    if (running && Number.isFinite(read)) return read;
    const cell = direction === 'charge' ? store.x_m.length - 1 : 0;
    return meanTemperatureAt(store, state.stores[s] as StoreState, cell);
  };
  const hot = model.stores.findIndex((s) => s.store.kind === 'hot');
  const cold = model.stores.findIndex((s) => s.store.kind === 'cold');
  const pair = (direction: Direction): StoreTemperatures => ({
    hot_K: at(hot, direction),
    cold_K: cold < 0 ? null : at(cold, direction),
  });
  return { charge: pair('charge'), discharge: pair('discharge') };
}

/**
 * One-sigma travel of the front that no reading of flow covers [m]: it adds up in line with time.
 * Returns the part of this scan such that variances add up to the square of the whole.
 */
export function unknownTravel(
  model: UnitModel,
  state: UnitState,
  s: number,
  dt_s: number,
  conditions: Conditions,
): number {
  if (conditions.flowKnown) return 0;
  const store = model.stores[s] as UnitModel['stores'][number];
  const { tables } = store;
  const { unit } = model;
  const middle = tables.segments >> 1;
  const most = Math.max(
    Math.abs(state.conditions.lastFlow_kg_s),
    Number.isFinite(unit.limits.discharge.flow_max_kg_s) ? unit.limits.discharge.flow_max_kg_s : 0,
  );
  const speed =
    ((most / store.store.bed.area_m2) * (tables.fluidHeatCapacity[middle] as number)) /
    (tables.heatCapacity[middle] as number);
  const before = state.unknownTravel_m[s] as number;
  const after = before + speed * dt_s;
  state.unknownTravel_m[s] = after;
  return Math.sqrt(after * after - before * before);
}

/**
 * What drives the tubes of store `s` in a scan: mass flux over the whole bed [kg/m2s], the gas that
 * enters as measured, else as the machine model has it at `outlets` [K], over `dt_s` [s].
 *
 * @param travelSigma_m this scan's part of the unknown travel; see `unknownTravel`
 */
export function driveOf(
  model: UnitModel,
  s: number,
  conditions: Conditions,
  scan: Scan,
  dt_s: number,
  outlets: Record<Direction, StoreTemperatures>,
  travelSigma_m: number,
): TubeDrive {
  const store = (model.stores[s] as UnitModel['stores'][number]).store;
  const direction: Direction = conditions.flow_kg_s >= 0 ? 'charge' : 'discharge';
  const end = direction === 'charge' ? 'charge_inlet' : 'discharge_inlet';
  const channel = model.map.gas[store.id]?.[end] ?? -1;
  const read = channel >= 0 ? (scan.values[channel] as number) : Number.NaN;
  const point = Number.isFinite(read)
    ? null
    : model.machine.operate(direction, outlets[direction], conditions.ambient_K);
  const assumed = store.kind === 'hot' ? point?.inlets.hot_K : point?.inlets.cold_K;
  return {
    massFlux_kg_m2s: conditions.flow_kg_s / store.bed.area_m2,
    inlet_K: Number.isFinite(read) ? read : (assumed ?? store.reference_cold_K),
    inletSigma_K: Number.isFinite(read) ? 0 : ASSUMED_INLET_SIGMA_K,
    ambient_K: conditions.ambient_K,
    dt_s,
    travelSigma_m,
    ...(conditions.flow_kg_s === 0 ? { standing_K: standingGas(model, store.id, scan) } : {}),
  };
}

/** Gas in the pipes at both ends as measured [K]; NaN where it is not. */
function standingGas(
  model: UnitModel,
  store: string,
  scan: Scan,
): Record<'charge_inlet' | 'discharge_inlet', number> {
  const at = (end: 'charge_inlet' | 'discharge_inlet'): number => {
    const channel = model.map.gas[store]?.[end] ?? -1;
    return channel >= 0 ? (scan.values[channel] as number) : Number.NaN;
  };
  return { charge_inlet: at('charge_inlet'), discharge_inlet: at('discharge_inlet') };
}
