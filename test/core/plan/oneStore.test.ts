import { describe, expect, it } from 'vitest';
import { loadSite } from '../../../src/config/load.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { hoursOf } from '../../../src/core/dispatch/unitHours.js';
import { commandOf } from '../../../src/core/plan/command.js';
import { energyBetween } from '../../../src/core/plan/course.js';
import { headroomOf } from '../../../src/core/plan/headroom.js';
import type { Leg } from '../../../src/core/plan/leg.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { unitOf } from '../track/plants.js';
import { contextOf, engineUnit } from './units.js';

const H = 3600;

/** The example with one store, on few cells. */
function exampleUnit(): UnitDefinition {
  const file = new URL('../../../config/hot-air.yaml', import.meta.url).pathname;
  const [unit] = loadSite(file).units;
  if (unit === undefined) throw new Error('config/hot-air.yaml has no unit');
  return { ...unit, estimator: { ...unit.estimator, cells: 40 } };
}

describe.each([
  ['a gas cycle with two stores', unitOf(), 100e3, ['hot_outlet', 'cold_outlet']],
  ['an engine on one hot store', engineUnit(), 150e3, ['hot_outlet']],
  ['config/hot-air.yaml', exampleUnit(), 2e6, ['hot_outlet']],
])('what lies ahead works the same: %s', (_, unit, charging_W, rules) => {
  const context = contextOf(unit, { hot: 0.5, cold: 0.5 });
  const rated = unit.rated_power_W;

  it('headroom: p90 below p50 below p10, ended by a store, more of it at less power', () => {
    const found = headroomOf(context, { powers_W: [charging_W, charging_W / 2] });
    const [more, less] = found;
    for (const { hours, energy_MWh_el, ends_by, refused } of found) {
      expect(refused).toBeNull();
      expect(rules).toContain(ends_by);
      expect(hours.p90).toBeLessThan(hours.p50);
      expect(hours.p50).toBeLessThan(hours.p10);
      expect(energy_MWh_el.p90).toBeGreaterThan(0);
    }
    expect(less?.hours.p50).toBeGreaterThan(1.5 * (more?.hours.p50 as number));
  });

  it('a march through a charge, a stand and a discharge delivers what it is told', () => {
    const legs: Leg[] = [
      { mode: 'charge', power_W: charging_W, from_s: 0, to_s: H },
      { mode: 'stand', power_W: 0, from_s: H, to_s: 3 * H },
      { mode: 'discharge', power_W: rated, from_s: 3 * H, to_s: 4 * H },
    ];
    const command = commandOf(unit, legs, [], context.before, 5 * H);
    const { episodes, delivered } = createOutlook(context.model, context.state).best(command);
    expect(episodes.map(({ direction, stopped_s }) => [direction, stopped_s])).toEqual([
      ['charge', null],
      ['discharge', null],
    ]);
    expect(energyBetween(delivered, 0, H) / (-charging_W * H)).toBeCloseTo(1, 9);
    expect(energyBetween(delivered, 3 * H, 4 * H) / (rated * H)).toBeCloseTo(1, 9);
    const standing = -unit.machine.auxiliary_standing_W * 2 * H;
    expect(energyBetween(delivered, H, 3 * H) / standing).toBeCloseTo(1, 9);
  });

  it('hours before and after a charge: it has filled the stores', () => {
    const [now] = hoursOf(context.model, context.state, [rated]);
    const outlook = createOutlook(context.model, context.state);
    const hoursAfter = (charge_s: number): number => {
      const legs: Leg[] = [
        { mode: 'charge', power_W: charging_W, from_s: 0, to_s: charge_s },
        { mode: 'discharge', power_W: rated, from_s: charge_s, to_s: Number.POSITIVE_INFINITY },
      ];
      const command = commandOf(unit, legs, [], context.before, charge_s + 40 * H);
      const last = outlook.best(command).episodes.at(-1);
      return ((last?.first_s as number) - charge_s) / H;
    };
    const [half, one] = [hoursAfter(H / 2), hoursAfter(H)];
    expect(half).toBeGreaterThan((now?.hours.p50 as number) + 0.1);
    expect(one).toBeGreaterThan(half + 0.1);
  });
});
