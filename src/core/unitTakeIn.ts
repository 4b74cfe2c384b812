import { type HeatBalance, startHeatBalance, stepHeatBalance } from './dispatch/heatBalance.js';
import { type HeatCapacity, heatCapacities, withHeatCapacity } from './dispatch/heatCapacity.js';
import { learnMachine } from './dispatch/unitHours.js';
import type { FrontEstimate, FrontReason } from './estimate.js';
import type { Scan } from './scan/scan.js';
import { type Conditions, readConditions, startConditions } from './track/conditions.js';
import { driveOf, storeOutlets, unknownTravel } from './track/drive.js';
import type { FrontViewStep } from './track/frontView.js';
import { followGas, type GasMemories, startGasMemories } from './track/gasDoubts.js';
import { withoutImplausible } from './track/plausible.js';
import { type StoreEnergy, storeEnergy } from './track/storeEnergy.js';
import { meanTemperatures, storeFronts } from './track/storeEstimate.js';
import { type StoreState, type StoreStep, startStore, stepStore } from './track/storeTracker.js';
import { type StoreViews, startViews, stepViews } from './track/storeViews.js';
import { followOrigin } from './track/unseenFlow.js';
import type { UnitModel } from './unitModel.js';
import type { UnitState } from './unitState.js';

/** What taking a scan in has shown, for the estimate that describes it. */
export interface Taken {
  /** The scan as it was used: readings that no plant produces are missing ones; the channels of those. */
  readonly scan: Scan;
  readonly implausible: readonly number[];
  readonly conditions: Conditions;
  /** Time of the last scan; null at the first. */
  readonly before_ms: number | null;
  /** Time since the last scan [s]; 0 at the first. */
  readonly dt_s: number;
  readonly stores: readonly TakenStore[];
  /** Thermocouple readings, and readings of any channel, in this scan. */
  readonly thermocouples: number;
  readonly readings: number;
  readonly modeChanged: boolean;
  /** Mode and flow contradict each other in this scan. */
  readonly disagrees: boolean;
}

/** What one scan did to a store: its step, its heat, its fronts, and the steps of its front views. */
export interface TakenStore {
  readonly step: StoreStep;
  readonly energy: StoreEnergy;
  readonly fronts: { fronts: FrontEstimate[]; reason: FrontReason | null };
  readonly views: readonly FrontViewStep[];
  /** Of the gas that entered, as measured, else as the machine gives it [K]; NaN before it moved. */
  readonly inlet_K: number;
}

/** Without any thermocouple for this long the beds are forgotten: anything may have happened. */
export const FORGET_MS = 24 * 3600 * 1000;

/** Beds, front views and twins start anew from the next readings; machine factors and watch stay. */
export function forget(model: UnitModel, state: UnitState): void {
  model.stores.forEach((store, s) => {
    state.stores[s] = startStore(store);
    state.views[s] = startViews(store);
    state.unknownTravel_m[s] = 0;
    state.balances[s] = startHeatBalance();
    state.gas[s] = startGasMemories();
  });
  // Only counted: what the bed was taken for does not hang on it.
  const { disagreements } = state.conditions;
  Object.assign(state.conditions, startConditions(), { disagreements });
  state.charge = null;
}

/** Takes one scan into a unit's state: conditions, tubes, front views, twin, machine factor. */
export function takeIn(model: UnitModel, state: UnitState, raw: Scan): Taken {
  const { unit } = model;
  const { scan, dropped: implausible } = withoutImplausible(model.ranges, raw);
  const { time_ms: before_ms } = state;
  const dt_s = before_ms === null ? 0 : (scan.time_ms - before_ms) / 1000;
  const outlets = storeOutlets(model, state, scan);
  const contradicted = state.conditions.disagreements;
  const conditions = readConditions(
    unit,
    model.map,
    model.machine,
    state.conditions,
    scan,
    dt_s,
    outlets,
  );
  const disagrees = state.conditions.disagreements > contradicted;
  const thermocouples = model.thermocouples.filter((i) => Number.isFinite(scan.values[i])).length;
  if (thermocouples > 0) {
    if (state.seen_ms !== null && scan.time_ms - state.seen_ms > FORGET_MS) forget(model, state);
    state.seen_ms = scan.time_ms;
  }
  const tracked = model.stores.map((store, s): TakenStore => {
    const travel = unknownTravel(model, state, s, dt_s, conditions);
    const storeState = state.stores[s] as StoreState;
    // Nothing to move before the first readings, nor over the gap in which the beds were forgotten.
    const moves = state.time_ms !== null && storeState.started;
    const drive = moves ? driveOf(model, s, conditions, scan, dt_s, outlets, travel) : null;
    const step = stepStore(
      store,
      storeState,
      drive,
      scan.values,
      scan.time_ms,
      state.unknownTravel_m[s] as number,
      // Drawn anew in this scan, or in the last one where its turn comes after this store's.
      state.stores.some((other, o) => o !== s && other.started && other.settled === 0),
    );
    followOrigin(store, storeState, step === 'reacquired');
    const energy = storeEnergy(store, storeState);
    const mean_K = meanTemperatures(store, storeState);
    const fronts = storeFronts(store, storeState, energy, mean_K);
    const unknown = state.unknownTravel_m[s] as number;
    // With the flow still unknown it goes on adding up, until the profile is drawn anew: a filter that
    // must follow a front it does not expect would bend its factors and offsets to explain it.
    if (step === 'reacquired' || (step === 'updated' && conditions.flowKnown)) {
      state.unknownTravel_m[s] = 0;
    }
    const known = conditions.flowKnown && !conditions.flowStandIn && step === 'updated';
    stepHeatBalance(store, storeState, state.balances[s] as HeatBalance, energy, {
      direction: known && drive !== null && conditions.mode !== 'stand' ? conditions.mode : null,
      flow_kg_s: conditions.flow_kg_s,
      inlet_K: drive?.inlet_K ?? Number.NaN,
      ambient_K: conditions.ambient_K,
      dt_s,
    });
    const gas = state.gas[s] as GasMemories;
    followGas(model, s, storeState, gas, scan, conditions, dt_s, outlets);
    const views = stepViews(
      store,
      storeState,
      state.views[s] as StoreViews,
      drive,
      scan.values,
      fronts.fronts,
      mean_K,
      unknown,
    );
    return { step, energy, fronts, views, inlet_K: drive?.inlet_K ?? Number.NaN };
  });
  const modeChanged = conditions.mode !== state.mode;
  learnMachine(model, state, conditions, dt_s, modeChanged, outlets);
  const capacity = heatCapacities(model, state);
  const stores = tracked.map((store, s) => ({
    ...store,
    energy: withHeatCapacity(store.energy, capacity[s] as HeatCapacity),
  }));
  state.mode = conditions.mode;
  state.ambient_K = conditions.ambient_K;
  model.stores.forEach((store, s) => {
    const channel = model.map.gas[store.store.id]?.charge_inlet ?? -1;
    const read = channel >= 0 ? (scan.values[channel] as number) : Number.NaN;
    state.plenum_K[s] = conditions.mode === 'discharge' ? read : Number.NaN;
  });
  state.time_ms = scan.time_ms;
  const readings = scan.values.reduce((n, v) => n + (Number.isFinite(v) ? 1 : 0), 0);
  return {
    scan,
    implausible,
    conditions,
    before_ms,
    dt_s,
    stores,
    thermocouples,
    readings,
    modeChanged,
    disagrees,
  };
}
