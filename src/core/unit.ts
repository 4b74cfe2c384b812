import type { UnitDefinition } from './definitions.js';
import { startHeatBalance } from './dispatch/heatBalance.js';
import { startMachineFactor } from './dispatch/machineFactor.js';
import { hoursOf } from './dispatch/unitHours.js';
import type { DispatchAnswer, Estimate, ProfileView } from './estimate.js';
import type { Scan } from './scan/scan.js';
import type { ScanCounts } from './scanCounts.js';
import { requireShape, requireStoreFits } from './storeFits.js';
import { startConditions } from './track/conditions.js';
import { startGasMemories } from './track/gasDoubts.js';
import { type StoreState, startStore } from './track/storeTracker.js';
import { startViews } from './track/storeViews.js';
import { describe } from './unitDescribe.js';
import { unitModel } from './unitModel.js';
import type { UnitState } from './unitState.js';
import { FORGET_MS, forget, takeIn } from './unitTakeIn.js';
import type { WatchView } from './watch/causes.js';
import type { CycleRecord } from './watch/cycleRecord.js';
import type { WatchEvent } from './watch/event.js';
import { INDICATORS_VERSION } from './watch/indicators.js';
import { startWatch } from './watch/watch.js';

export type { UnitState } from './unitState.js';

/** What one scan yields. */
export interface UnitStep {
  readonly estimate: Estimate;
  /** Only where asked for. */
  readonly profile: ProfileView | null;
  readonly events: readonly WatchEvent[];
  /** What of the scan was used and what not. */
  readonly counts?: ScanCounts;
  /** What the indicators show, and what is probably behind it. */
  readonly watch?: WatchView;
  /** A charge, stand or discharge that is now known to be over. */
  readonly cycle?: CycleRecord;
}

export interface UnitAsk {
  /** Powers [W] for which hours are wanted with this scan; empty = none. See `hoursDue`. */
  readonly hours_at_W: readonly number[];
  readonly profile: boolean;
  /** Place in [0, 1) among units that may all want a rollout at one moment; absent, 0: it is alone. */
  readonly turn?: number;
}

/** Plain, structured-cloneable image of a UnitState (typed arrays, numbers, strings). */
export interface UnitSnapshot {
  readonly version: number;
  readonly state: UnitState;
}

export const SNAPSHOT_VERSION = 5;
const NOTHING: UnitAsk = { hours_at_W: [], profile: false };
/** Longest run of empty scans that a gap is filled with; a longer gap takes coarser ones. */
const TICKS_MOST = 720;

/** State of a unit before its first scan: no store has started, nothing is learned. */
export function startUnit(unit: UnitDefinition): UnitState {
  const model = unitModel(unit);
  return {
    time_ms: null,
    conditions: startConditions(),
    stores: model.stores.map(startStore),
    views: model.stores.map(startViews),
    factors: { charge: startMachineFactor(), discharge: startMachineFactor() },
    balances: model.stores.map(startHeatBalance),
    gas: model.stores.map(startGasMemories),
    watch: startWatch(),
    seen_ms: null,
    mode: 'stand',
    charge: null,
    unknownTravel_m: model.stores.map(() => 0),
    ambient_K: unit.ambient_K,
    plenum_K: model.stores.map(() => Number.NaN),
  };
}

/**
 * Takes one scan in. Where scans are missing since the last one, time passes in empty scans at the
 * scan period first, exactly as if the daemon had closed them at their deadlines. After more than
 * a day without scans the beds are forgotten and start anew from the readings.
 *
 * @throws RangeError for a scan not later than the last, or of the wrong length
 */
export function advance(
  unit: UnitDefinition,
  state: UnitState,
  scan: Scan,
  ask: UnitAsk,
): UnitStep {
  const model = unitModel(unit);
  if (scan.values.length !== unit.channels.length) {
    throw new RangeError(`scan has ${scan.values.length} values, expected ${unit.channels.length}`);
  }
  if (state.time_ms !== null && !(scan.time_ms > state.time_ms)) {
    throw new RangeError(
      `scan at ${scan.time_ms} ms: not later than the last, ${state.time_ms} ms`,
    );
  }
  const events: WatchEvent[] = [];
  // Scans without a reading decide nothing but that all is forgotten, so that there is one at most.
  let over: CycleRecord | undefined;
  if (state.time_ms !== null && scan.time_ms - state.time_ms > FORGET_MS) forget(model, state);
  for (const time_ms of missingTicks(unit, state.time_ms, scan.time_ms)) {
    const values = new Float64Array(unit.channels.length).fill(Number.NaN);
    const empty = { time_ms, values, held: new Uint8Array(values.length) };
    const tick = describe(model, state, takeIn(model, state, empty), NOTHING);
    events.push(...tick.events);
    over = tick.cycle ?? over;
  }
  const step = describe(model, state, takeIn(model, state, scan), ask);
  const cycle = step.cycle ?? over;
  return { ...step, ...(cycle ? { cycle } : {}), events: [...events, ...step.events] };
}

/** Times of the scans that are missing between two scans. */
function missingTicks(unit: UnitDefinition, last_ms: number | null, now_ms: number): number[] {
  if (last_ms === null) return [];
  const period = unit.scan_period_s * 1000;
  // Nothing is left to move through a gap that was forgotten; one empty scan tells the watch of it.
  if (now_ms - last_ms > FORGET_MS) return [Math.max(last_ms + 1, now_ms - period)];
  const from = Math.floor(last_ms / period) + 1;
  const to = Math.floor(now_ms / period);
  const stride = Math.max(1, Math.ceil((to - from) / TICKS_MOST));
  const ticks: number[] = [];
  for (let index = from; index < to; index += stride) {
    if (index * period > last_ms) ticks.push(index * period);
  }
  return ticks;
}

/** True where the unit's own clock for hours (source time) strikes between two scans. */
export function hoursDue(unit: UnitDefinition, last_ms: number | null, now_ms: number): boolean {
  if (last_ms === null) return true;
  const every = unit.hours_every_s * 1000;
  return Math.floor(now_ms / every) !== Math.floor(last_ms / every);
}

/** An image of everything that a unit remembers; later scans do not change it. */
export function saveUnit(state: UnitState): UnitSnapshot {
  return { version: SNAPSHOT_VERSION, state: structuredClone(state) };
}

/**
 * The state that was saved. Where it is of another INDICATORS_VERSION the indicators begin anew:
 * `lostToVersion` tells which.
 *
 * @throws RangeError where the snapshot is of another version or another unit's shape
 */
export function restoreUnit(unit: UnitDefinition, snapshot: UnitSnapshot): UnitState {
  if (snapshot.version !== SNAPSHOT_VERSION) {
    throw new RangeError(`snapshot version ${snapshot.version}: expected ${SNAPSHOT_VERSION}`);
  }
  const model = unitModel(unit);
  const { stores } = snapshot.state;
  requireShape(`unit ${unit.id}`, 'stores', stores.length, model.stores.length);
  model.stores.forEach((store, s) => {
    requireStoreFits(store, stores[s] as StoreState);
  });
  // One saved before inlet gas was looked at has nothing of it.
  const saved: Omit<UnitState, 'gas'> & Partial<UnitState> = structuredClone(snapshot.state);
  if (saved.watch.indicators_version !== INDICATORS_VERSION) {
    saved.watch.indicators = {};
    saved.watch.indicators_version = INDICATORS_VERSION;
  }
  return { ...saved, gas: saved.gas ?? model.stores.map(startGasMemories) };
}

/** Hours and energy at given powers [W] from the present state. */
export function hoursAt(
  unit: UnitDefinition,
  state: UnitState,
  powers_W: readonly number[],
): DispatchAnswer[] {
  return hoursOf(unitModel(unit), state, powers_W);
}
