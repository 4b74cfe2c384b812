import type { Direction, Mode } from './definitions.js';
import type { HeatBalance } from './dispatch/heatBalance.js';
import type { MachineFactor } from './dispatch/machineFactor.js';
import type { ChargeState } from './dispatch/unitHours.js';
import type { ConditionsState } from './track/conditions.js';
import type { GasMemories } from './track/gasDoubts.js';
import type { StoreState } from './track/storeTracker.js';
import type { StoreViews } from './track/storeViews.js';
import type { CycleLogState } from './watch/cycleLog.js';
import type { WatchState } from './watch/watch.js';

/** Everything a unit remembers; owned by whoever holds it, changed only by `advance`. */
export interface UnitState {
  /** Source time of the last scan taken in, null before the first. */
  time_ms: number | null;
  readonly conditions: ConditionsState;
  readonly stores: StoreState[];
  /** Front views and healthy twin of each store. */
  readonly views: StoreViews[];
  readonly factors: Record<Direction, MachineFactor>;
  /** Heat balance of each store. */
  readonly balances: HeatBalance[];
  /** Inlet gas of each store, held against its rock. */
  readonly gas: GasMemories[];
  readonly watch: WatchState;
  /** Runs told apart; absent in a state saved before there was a log. */
  cycle?: CycleLogState;
  /** Source time of the last scan with any thermocouple reading. */
  seen_ms: number | null;
  mode: Mode;
  /** Of the unit's state of charge, null before the first rollout. */
  charge: ChargeState | null;
  readonly unknownTravel_m: number[];
  /** Of the last scan: ambient, and the gas leaving each store while discharging, NaN = not measured [K]. */
  ambient_K: number;
  readonly plenum_K: number[];
}
