import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { ceilingsBetween } from './ceilings.js';
import type { RunningBefore } from './command.js';
import type { Ceiling } from './leg.js';

/** What a question about what lies ahead is answered from. */
export interface PlanContext {
  readonly model: UnitModel;
  readonly state: UnitState;
  /** Source time of the estimate: second 0 of every plan [ms]. */
  readonly now_ms: number;
  readonly before: RunningBefore;
  /** What connection and outages leave, over the hours ahead. */
  ceilings(to_s: number): Ceiling[];
}

/**
 * @throws RangeError before the first scan
 */
export function planContext(model: UnitModel, state: UnitState): PlanContext {
  const now_ms = state.time_ms;
  if (now_ms === null) {
    throw new RangeError(`unit ${model.unit.id} has no estimate yet: expected readings first`);
  }
  return {
    model,
    state,
    now_ms,
    before: runningBefore(model, state),
    ceilings: (to_s) => ceilingsBetween(model.unit.limits, now_ms, now_ms + to_s * 1000),
  };
}

/** How the unit runs now: its power follows from its flow by the machine model. */
function runningBefore(model: UnitModel, state: UnitState): RunningBefore {
  const { stood_s = Number.POSITIVE_INFINITY, ran = null } = state.conditions;
  if (state.mode === 'stand') return { mode: 'stand', power_W: 0, stood_s, last: ran };
  const hot = model.stores.findIndex((s) => s.store.kind === 'hot');
  const cold = model.stores.findIndex((s) => s.store.kind === 'cold');
  const charging = state.mode === 'charge';
  const outlet = (s: number): number => {
    const { store } = model.stores[s] as UnitModel['stores'][number];
    const read = charging ? Number.NaN : (state.plenum_K[s] as number);
    if (Number.isFinite(read)) return read;
    return (store.kind === 'hot') === charging ? store.reference_cold_K : store.reference_hot_K;
  };
  const power_W = model.machine.powerForFlow(
    state.mode,
    Math.abs(state.conditions.lastFlow_kg_s),
    { hot_K: outlet(hot), cold_K: cold < 0 ? null : outlet(cold) },
    state.ambient_K,
    Math.exp(state.factors[state.mode].log),
  );
  return {
    mode: state.mode,
    power_W: charging ? -power_W : Math.max(0, power_W),
    stood_s: 0,
    last: state.mode,
  };
}
