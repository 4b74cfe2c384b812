import { describe, expect, it } from 'vitest';
import { planContext } from '../../../src/core/plan/context.js';
import { exceeded } from '../../../src/core/plan/evaluation.js';
import type { Leg } from '../../../src/core/plan/leg.js';
import { createPlanner } from '../../../src/core/plan/planner.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import { unitOf } from '../track/plants.js';

const H = 3600;
const plain = unitOf();
/** The greatest flow comes just before the outlets' limits. */
const unit = unitOf({
  limits: {
    ...plain.limits,
    discharge: { ...plain.limits.discharge, flow_max_kg_s: 1.04 },
  },
});
const state = watchedUnit(unit, { hot: 0.6, cold: 0.6 }, 3);

/** Sigma of when the greatest flow is first needed, and of the outlet rule nearest to it [h]. */
function sigmas(powers_W: readonly number[]): { flow: number; outlet: number; apart_h: number } {
  const legs = Array.from({ length: 14 }, (_, i): Leg => {
    const power_W = powers_W[i % powers_W.length] as number;
    return { mode: 'discharge', power_W, from_s: (i * H) / 4, to_s: ((i + 1) * H) / 4 };
  });
  const planner = createPlanner(planContext(unitModel(unit), state), legs, 3.5 * H);
  const { samples } = planner.evaluate(planner.command(legs));
  const of = (rule: number) => {
    const values = samples.find((one) => one.rule === rule)!.values;
    const middle = exceeded(values, 0.5);
    return { sigma: (middle - exceeded(values, 0.8413)) / H, middle_h: middle / H };
  };
  const [cold, flow] = [of(1), of(2)];
  return { flow: flow.sigma, outlet: cold.sigma, apart_h: cold.middle_h - flow.middle_h };
}

describe('the time at which the greatest flow is needed', () => {
  it('is as uncertain as the outlets at a constant power, by its own slopes', () => {
    const { flow, outlet, apart_h } = sigmas([60e3]);
    // The rules are near to each other, or there was nothing to compare.
    expect(Math.abs(apart_h)).toBeLessThan(0.5);
    expect(flow / outlet).toBeGreaterThan(0.6);
    expect(flow / outlet).toBeLessThan(1.6);
  });

  // By differences of marches alone: 4.9 and 0.55 times the outlet's.
  it.each([[[57e3, 59e3, 61e3, 63e3]], [[50e3, 56e3, 64e3, 70e3]]])(
    'is so under powers that step every quarter of an hour, %j W, where slopes jump or vanish',
    (powers_W) => {
      const { flow, outlet } = sigmas(powers_W);
      expect(flow / outlet).toBeGreaterThan(0.7);
      expect(flow / outlet).toBeLessThan(1.3);
    },
  );
});
