import { describe, expect, it } from 'vitest';
import { centralHours } from '../../../src/core/dispatch/hours.js';
import { hoursInput } from '../../../src/core/dispatch/unitHours.js';
import { startAhead } from '../../../src/core/plan/bedsAhead.js';
import { contentOf } from '../../../src/core/plan/content.js';
import {
  firstBreak_s,
  runToLimit,
  standFor,
  withoutRules,
} from '../../../src/core/plan/limitToLimit.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { unitOf } from '../track/plants.js';
import { contextOf, engineUnit } from './units.js';

const MOST_S = 200 * 3600;

describe.each([
  ['a gas cycle with two stores', unitOf()],
  ['an engine on one hot store', engineUnit()],
])('a run from limit to limit: %s', (_, unit) => {
  const context = contextOf(unit, { hot: 0.6, cold: 0.55 });
  const { ahead: model, options } = createOutlook(context.model, context.state).beds();
  const now = startAhead(model);
  const power_W = unit.rated_power_W;
  const whole = runToLimit(model, now, 'discharge', power_W, { time_s: MOST_S }, options);

  it('lasts as long as the hours that are published', () => {
    const { hours } = centralHours(hoursInput(context.model, context.state, power_W), power_W);
    const broken_s = firstBreak_s(model, now, 'discharge', power_W, MOST_S, options);
    expect(broken_s / 3600).toBe(whole.first_h);
    // The rollout takes the flow of a step's middle from the flows before, the march from the work:
    // both of second order in steps of 1/60 of the run, (1/60)^2 apart.
    expect(Math.abs(whole.first_h / hours - 1)).toBeLessThan(1 / 3600 + 1e-4);
    expect(hours).toBeGreaterThan(1);
  });

  it('leaves the beds that it was given as they are', () => {
    expect(now).toEqual(startAhead(model));
  });

  it('ends its beds at the end of the run: nothing is left to give by the rule that ended it', () => {
    const again = runToLimit(model, whole.end, 'discharge', power_W, { time_s: MOST_S }, options);
    // The lids are swept anew, 10 minutes at most, before a rule holds.
    expect(again.hours).toBeLessThan(1 / 6);
  });

  it('stops where it has had enough, and two halves give what the whole gives', () => {
    const energy_J = 0.4 * whole.energy_J;
    const first = runToLimit(
      model,
      now,
      'discharge',
      power_W,
      { time_s: MOST_S, energy_J },
      options,
    );
    expect(first.ends_by).toBeNull();
    expect(first.energy_J).toBeCloseTo(energy_J, 3);
    const rest = runToLimit(model, first.end, 'discharge', power_W, { time_s: MOST_S }, options);
    // Two marches of other steps, second order in steps of 240 s: a minute of several hours.
    expect(Math.abs(first.hours + rest.hours - whole.hours)).toBeLessThan(1 / 60);
    expect(rest.ends_by).toBe(whole.ends_by);
    const ends = [rest.end, whole.end].map((beds) => contentOf(model, beds, []));
    const start = contentOf(model, now, []);
    start.forEach((held, s) => {
      const drawn = held - (ends[1]?.[s] as number);
      expect(Math.abs((ends[0]?.[s] as number) - (ends[1]?.[s] as number))).toBeLessThan(
        0.01 * drawn,
      );
    });
  });

  it('goes on past a rule that is left out', () => {
    const rules = { hot_outlet_min_K: null, cold_outlet_max_K: null };
    const further = withoutRules(model, rules);
    const on = runToLimit(further, now, 'discharge', power_W, { time_s: MOST_S }, options);
    expect(on.hours).toBeGreaterThan(whole.hours);
    expect(['hot_outlet', 'cold_outlet']).not.toContain(on.ends_by);
    expect(model.unit.limits.hot_outlet_min_K).not.toBeNull();
  });

  it('loses heat while it stands, the more the longer', () => {
    const held = contentOf(model, now, []);
    const day = contentOf(model, standFor(model, now, 86_400, options), []);
    const two = contentOf(model, standFor(model, now, 2 * 86_400, options), []);
    held.forEach((value, s) => {
      expect(day[s]).toBeLessThan(value);
      expect(two[s]).toBeLessThan(day[s] as number);
    });
  });

  it('refuses a power that is none', () => {
    expect(() => runToLimit(model, now, 'charge', 0, { time_s: 10 }, options)).toThrow(
      /power_W = 0: expected above 0/,
    );
  });
});
