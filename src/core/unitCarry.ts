import type { UnitDefinition } from './definitions.js';
import { startMachineFactor } from './dispatch/machineFactor.js';
import { requireStoreFits } from './storeFits.js';
import { startGasMemories } from './track/gasDoubts.js';
import type { StoreModel, StoreState } from './track/storeTracker.js';
import { SNAPSHOT_VERSION, type UnitSnapshot } from './unit.js';
import { unitModel } from './unitModel.js';
import { shapeOf, type UnitShape } from './unitShape.js';
import type { UnitState } from './unitState.js';
import { carryIndicators, conditionFits } from './watch/carry.js';
import { startCycleLog } from './watch/cycleLog.js';
import { INDICATORS, INDICATORS_VERSION } from './watch/indicators.js';

export interface UnitCarry {
  readonly state: UnitState;
  /** Stores whose beds are begun anew. */
  readonly anew: readonly string[];
  /** `INDICATOR/SUBJECT` whose healthy value, evidence and decision are lost. */
  readonly lost: readonly string[];
  /** Whether what was told as raised can go on standing, by `KIND/SUBJECT`. */
  fits(key: string): boolean;
}

/**
 * What a state saved under another definition of a unit still holds good for. A store with the same bed
 * and strings goes on as it was saved, with all that was learned as healthy for it; another one takes the
 * bed of `fresh` and learns anew. Mode, cycle log and alarm conditions go on, machine factors where the
 * machine is the same.
 *
 * @param fresh state of the unit as now defined, as of the saved one's time or before; taken over
 * @param shape of the definition that `saved` was made under
 * @throws RangeError where the snapshot is of another version, or not of that shape
 */
export function carryUnit(
  unit: UnitDefinition,
  fresh: UnitState,
  saved: UnitSnapshot,
  shape: UnitShape,
): UnitCarry {
  if (saved.version !== SNAPSHOT_VERSION)
    throw new RangeError(`snapshot version ${saved.version}: expected ${SNAPSHOT_VERSION}`);
  const model = unitModel(unit);
  const own = shapeOf(unit);
  const old = structuredClone(saved.state);
  const before = Object.keys(shape.stores);
  const now = unit.stores.map(({ id }) => id);
  const same = now.filter((id) => shape.stores[id] === own.stores[id]);
  const anew = now.filter((id) => !same.includes(id));
  for (const id of same) {
    const s = now.indexOf(id);
    const from = before.indexOf(id);
    requireStoreFits(model.stores[s] as StoreModel, old.stores[from] as StoreState);
    fresh.gas[s] = old.gas?.[from] ?? startGasMemories();
    for (const part of ['stores', 'views', 'balances', 'unknownTravel_m', 'plenum_K'] as const)
      (fresh[part] as unknown[])[s] = old[part][from];
  }
  const machine = shape.machine === own.machine;
  const rating = shape.rating === own.rating;
  const { states, lost } = carryIndicators(
    old.watch,
    Object.fromEntries(INDICATORS.map((one) => [one.kind, one.start(model)])),
    { unit: unit.id, before, now, stores: new Set(same), machine, rating },
  );
  const subjects = new Set([unit.id, ...now, ...unit.channels.map(({ id }) => id)]);
  const gone = new Set(lost);
  const fits = (key: string) => conditionFits(key, subjects, gone);
  const whole = anew.length === 0 && before.length === now.length;
  const { cycle = startCycleLog() } = old;
  const state: UnitState = {
    ...fresh,
    time_ms: old.time_ms,
    conditions: old.conditions,
    factors: machine
      ? old.factors
      : { charge: startMachineFactor(), discharge: startMachineFactor() },
    watch: {
      ...old.watch,
      conditions: Object.fromEntries(
        Object.entries(old.watch.conditions).filter(([key]) => fits(key)),
      ),
      indicators: states,
      indicators_version: INDICATORS_VERSION,
    },
    // A run's energies are between the beds at its edges; its number goes on, so that none is told twice.
    cycle: whole ? cycle : { ...startCycleLog(), no: cycle.no },
    seen_ms: old.seen_ms,
    mode: old.mode,
    charge: whole && machine && rating ? old.charge : null,
    ambient_K: old.ambient_K,
  };
  return { state, anew, lost, fits };
}
