import { beforeAll, describe, expect, it } from 'vitest';
import { centralHours } from '../../../src/core/dispatch/hours.js';
import { type ChargeAhead, chargesAhead } from '../../../src/core/plan/chargeAhead.js';
import { type PlanContext, planContext } from '../../../src/core/plan/context.js';
import type { Leg } from '../../../src/core/plan/leg.js';
import { createPlanner } from '../../../src/core/plan/planner.js';
import { watchedMarches } from '../../../src/core/plan/watchedMarches.js';
import { storeEnergy } from '../../../src/core/track/storeEnergy.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { inputOf, watchedUnit } from '../dispatch/fullUnit.js';
import { unit } from './offerUnit.js';

const H = 3600;
const quarters = (mode: Leg['mode'], power_W: number, from_h: number, to_h: number): Leg[] =>
  Array.from({ length: (to_h - from_h) * 4 }, (_, i) => ({
    ...{ mode, power_W, from_s: (from_h + i / 4) * H, to_s: (from_h + (i + 1) / 4) * H },
  }));
const LEGS = [
  ...quarters('stand', 0, 0, 1),
  ...quarters('charge', 100e3, 1, 3),
  ...quarters('stand', 0, 3, 5),
  ...quarters('discharge', 60e3, 5, 8),
  ...quarters('discharge', 40e3, 8, 9),
];
const edges_s = LEGS.map(({ to_s }) => to_s);

let context: PlanContext;

/** The states of charge, rolled out at these times alone. */
function along(marks_s: readonly number[]): ChargeAhead[] {
  const planner = createPlanner(context, LEGS, 9 * H);
  const { outlook, beyond_s } = planner;
  const command = planner.command(LEGS);
  const watched = watchedMarches(outlook, command, beyond_s, edges_s, marks_s);
  const course = watched.best();
  const points = { times_s: edges_s, charges: watched.edges.charges };
  return chargesAhead(outlook, command, course, watched, points, marks_s);
}

let everywhere: ChargeAhead[];
let carried: ChargeAhead[];

beforeAll(() => {
  context = planContext(unitModel(unit), watchedUnit(unit, { hot: 0.6, cold: 0.6 }, 3));
  everywhere = along(edges_s);
  carried = along([1 * H, 3 * H, 5 * H, 9 * H]);
});

describe('the state of charge along a plan', () => {
  it('begins with that of now: of each store, and of the unit by the best rollout', () => {
    const { model, state } = context;
    const [now] = carried;
    model.stores.forEach((store, s) => {
      const { soc, soc_sigma } = storeEnergy(store, state.stores[s]!);
      expect(now!.stores[s]).toEqual({ soc, sigma: soc_sigma });
    });
    const { hours } = centralHours(inputOf(unit, state), unit.rated_power_W);
    // The same steps; meter and machine are calibrated about the plan's mean power, not the rated one.
    expect(now!.unit / (hours / unit.rated_hours)).toBeCloseTo(1, 3);
  });

  it('has a point at every edge, rising while charging and falling while discharging', () => {
    expect(everywhere.map(({ t_s }) => t_s)).toEqual([0, ...edges_s]);
    everywhere.slice(1).forEach(({ t_s, unit: value, stores }, i) => {
      const before = everywhere[i]!;
      // The charge ramps down for 1000 s past its end.
      if (t_s > 3 * H && t_s <= 3.5 * H) return;
      const sign = t_s <= H || (t_s > 3 * H && t_s <= 5 * H) ? 0 : t_s <= 3 * H ? 1 : -1;
      if (sign === 0) expect(Math.abs(value - before.unit)).toBeLessThan(0.01);
      else expect(sign * (value - before.unit)).toBeGreaterThan(0);
      stores.forEach(({ soc }, s) => {
        if (sign !== 0) expect(sign * (soc - before.stores[s]!.soc)).toBeGreaterThan(0);
      });
    });
  });

  it('carried between rollouts is within a hundredth of one rolled out at every edge', () => {
    const worst = Math.max(
      ...carried.map(({ unit: value }, i) => Math.abs(value - everywhere[i]!.unit)),
    );
    expect(worst).toBeLessThan(0.01);
    for (const h of [1, 3, 5, 9]) {
      const at = (list: readonly ChargeAhead[]) => list.find(({ t_s }) => t_s === h * H)!;
      expect(at(carried).unit).toBeCloseTo(at(everywhere).unit, 12);
      expect(at(carried).unit_sigma).toBeCloseTo(at(everywhere).unit_sigma, 12);
    }
  });

  it('has a sigma that grows with what is moved and lies between those of the marks', () => {
    const sigmaAt = (h: number) => carried.find(({ t_s }) => t_s === h * H)!;
    expect(sigmaAt(3).stores[0]!.sigma).toBeGreaterThan(carried[0]!.stores[0]!.sigma);
    expect(sigmaAt(9).stores[0]!.sigma).toBeGreaterThan(sigmaAt(5).stores[0]!.sigma);
    expect(sigmaAt(7).stores[1]!.sigma).toBeCloseTo(
      (sigmaAt(5).stores[1]!.sigma + sigmaAt(9).stores[1]!.sigma) / 2,
      12,
    );
    for (const { unit_sigma } of carried) expect(unit_sigma).toBeLessThan(0.1);
  });
});
