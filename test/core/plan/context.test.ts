import { describe, expect, it } from 'vitest';
import { planContext } from '../../../src/core/plan/context.js';
import { startUnit } from '../../../src/core/unit.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import { unitOf } from '../track/plants.js';

const unit = unitOf();
const model = unitModel(unit);
const state = watchedUnit(unit, { hot: 0.5, cold: 0.5 }, 3);

describe('how a unit runs when a plan begins', () => {
  it('is how long it has stood, and which way it ran', () => {
    Object.assign(state.conditions, { stood_s: 1234, ran: 'charge' });
    const before = { mode: 'stand', power_W: 0, stood_s: 1234, last: 'charge' };
    expect(planContext(model, state).before).toEqual(before);
    delete state.conditions.stood_s;
    delete state.conditions.ran;
    const unknown = { stood_s: Number.POSITIVE_INFINITY, last: null };
    expect(planContext(model, state).before).toMatchObject(unknown);
  });

  it('is its power by the machine where it runs', () => {
    // Nothing has been read of the outlets at rest: gas leaves as from full stores.
    const [hot, cold] = unit.stores;
    const outlets = { hot_K: hot!.reference_hot_K, cold_K: cold!.reference_cold_K };
    const flow = model.machine.flowForPower('discharge', 60e3, outlets, state.ambient_K);
    if ('reason' in flow) throw new Error(flow.reason);
    const running = structuredClone(state);
    running.mode = 'discharge';
    running.conditions.lastFlow_kg_s = -flow.flow_kg_s;
    const { before } = planContext(model, running);
    expect(before).toMatchObject({ mode: 'discharge', stood_s: 0, last: 'discharge' });
    // The machine factor has learned nothing: 1.
    expect(before.power_W).toBeCloseTo(60e3, 3);
  });

  it('is not known before the first scan', () => {
    expect(() => planContext(model, startUnit(unit))).toThrow(/no estimate yet/);
  });
});
