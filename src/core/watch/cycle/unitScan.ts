import { temperatureAt } from '../../bed/tables.js';
import type { Estimate, FrontEstimate, StoreEstimate } from '../../estimate.js';
import type { Scan } from '../../scan/scan.js';
import type { Conditions } from '../../track/conditions.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { UnitModel } from '../../unitModel.js';
import type { UnitState } from '../../unitState.js';
import type { Taken, TakenStore } from '../../unitTakeIn.js';
import type { WatchEvent } from '../event.js';
import type { CycleScan, CycleStoreScan } from './cycleScan.js';

/** What the cycle log has to know of a scan that was taken in and estimated. */
export function cycleScanOf(
  model: UnitModel,
  state: UnitState,
  taken: Taken,
  estimate: Estimate,
  events: readonly WatchEvent[],
): CycleScan {
  const { scan, conditions } = taken;
  const { map } = model;
  const started = state.stores.every((store) => store.started);
  const tellMode = [
    ...[map.mode, map.valveOf.charge, map.valveOf.discharge, map.power],
    ...[map.flowSigned, map.flowUnsigned, map.flowOf.charge, map.flowOf.discharge],
  ];
  return {
    time_ms: scan.time_ms,
    mode: conditions.mode,
    read: taken.readings > 0,
    bedRead: taken.thermocouples > 0,
    modeRead: tellMode.some((i) => i >= 0 && Number.isFinite(scan.values[i])),
    flow_kg_s: conditions.flow_kg_s,
    flowKnown: conditions.flowKnown,
    power_MW: conditions.power_W / 1e6,
    ambient_K: conditions.ambient_K,
    soc: estimate.state_of_charge,
    stores: started
      ? model.stores.map((_, s) => storeScan(model, state, s, scan, conditions, taken, estimate))
      : [],
    raised: events.filter(({ transition }) => transition === 'raised').map(({ id }) => id),
    told: state.watch.run?.told ?? null,
  };
}

function storeScan(
  model: UnitModel,
  state: UnitState,
  s: number,
  scan: Scan,
  conditions: Conditions,
  { stores }: Taken,
  estimate: Estimate,
): CycleStoreScan {
  const store = model.stores[s] as StoreModel;
  const { id, bed } = store.store;
  const { energy, inlet_K } = stores[s] as TakenStore;
  const own = estimate.stores[id] as StoreEstimate;
  const outlet_K = outletOf(model, s, scan, conditions, own);
  const front = nearestFront(own);
  // As in the heat balance; what no string sees does not change while the store stands.
  const seen = Math.max(0, energy.soc_sigma ** 2 - energy.unseen ** 2);
  const lasting = seen * (state.balances[s]?.share ?? 0);
  const { coldest_K, hottest_K } = extremes(store, state.stores[s] as StoreState);
  return {
    id,
    length_m: bed.length_m,
    soc: energy.soc,
    capacity_MWh_th: energy.capacity_MWh_th,
    stored_sigma_MWh_th: energy.stored_sigma_MWh_th,
    soc_lasting: lasting,
    soc_passing: seen - lasting,
    carried_MW: carried_W(store, conditions.flow_kg_s, inlet_K, outlet_K) / 1e6,
    position_m: own.energy_position_m,
    width_m: front?.width_m ?? null,
    width_sigma_m: front?.width_sigma_m ?? null,
    spread_ratio: own.spread_ratio,
    outlet_K,
    hottest_K,
    coldest_K,
    heat_transfer_factor: own.heat_transfer_factor,
    heat_transfer_factor_sigma: own.heat_transfer_factor_sigma,
    flow_factors: Object.fromEntries(own.strings.map((one) => [one.id, one.flow_factor])),
    thermocouples_rejected: own.sensors.rejected.length,
  };
}

/** Gas that leaves a store, as measured, else as estimated [K]; null while standing. */
function outletOf(
  { stores, map }: UnitModel,
  s: number,
  scan: Scan,
  { flow_kg_s }: Conditions,
  { outlet_K }: StoreEstimate,
): number | null {
  if (flow_kg_s === 0) return null;
  const { store } = stores[s] as StoreModel;
  const end = flow_kg_s > 0 ? 'discharge_inlet' : 'charge_inlet';
  const channel = map.gas[store.id]?.[end] ?? -1;
  const read = channel >= 0 ? (scan.values[channel] as number) : Number.NaN;
  return Number.isFinite(read) ? read : outlet_K;
}

/**
 * Heat (of a cold store cold) that the gas brings [W]: |m| (e(T_in) - e(T_out)), with the other sign in
 * a cold store; 0 while standing, NaN where a temperature is not known.
 */
function carried_W(
  { store }: StoreModel,
  flow_kg_s: number,
  inlet_K: number,
  outlet_K: number | null,
): number {
  if (flow_kg_s === 0) return 0;
  if (outlet_K === null || !Number.isFinite(inlet_K)) return Number.NaN;
  const { fluid } = store.bed;
  const heat = Math.abs(flow_kg_s) * (fluid.enthalpy(inlet_K) - fluid.enthalpy(outlet_K));
  return store.kind === 'hot' ? heat : -heat;
}

/** Of several fronts the one nearest to the energy-equivalent position that has a width. */
function nearestFront({ fronts, energy_position_m }: StoreEstimate): FrontEstimate | null {
  let best: FrontEstimate | null = null;
  const off = ({ position_m }: FrontEstimate) => Math.abs((position_m ?? 0) - energy_position_m);
  for (const front of fronts) {
    if (front.position_m === null || front.width_m === null) continue;
    if (best === null || off(front) < off(best)) best = front;
  }
  return best;
}

/** Coldest and hottest rock of a store, by its tubes and the layers at its wall [K]. */
function extremes(
  model: StoreModel,
  { tubes, wall }: StoreState,
): { coldest_K: number; hottest_K: number } {
  let least = Number.POSITIVE_INFINITY;
  let most = Number.NEGATIVE_INFINITY;
  for (const enthalpy of [...tubes.map((tube) => tube.enthalpy), ...(wall?.enthalpy ?? [])]) {
    for (const h of enthalpy) {
      if (h < least) least = h;
      if (h > most) most = h;
    }
  }
  return {
    coldest_K: temperatureAt(model.tables, least),
    hottest_K: temperatureAt(model.tables, most),
  };
}
