import { describe, expect, it } from 'vitest';
import type { PlanContext } from '../../../src/core/plan/context.js';
import { headroomOf } from '../../../src/core/plan/headroom.js';
import { unitOf } from '../track/plants.js';
import { contextOf } from './units.js';

const plain = unitOf();
const unit = unitOf({
  limits: {
    ...plain.limits,
    operation: {
      ramp_W_s: { charge: 100, discharge: 50 },
      start: {
        warm: { time_s: 300, energy_J: 3e6 },
        cold: { time_s: 900, energy_J: 13.5e6 },
        cold_after_s: 7200,
      },
      change_over_s: 600,
    },
  },
});
const rested = contextOf(unit, { hot: 0.4, cold: 0.4 });
const running = (before: Partial<PlanContext['before']>): PlanContext => ({
  ...rested,
  before: { mode: 'stand', power_W: 0, stood_s: 1000, last: 'charge', ...before },
});
const J_PER_MWH = 3.6e9;
const of = (context: PlanContext, power_W = 100e3) =>
  headroomOf(context, { powers_W: [power_W] })[0]!;

describe('headroom', () => {
  it('counts hours from the first power on, and energy with start-up and ramp', () => {
    const { hours, energy_MWh_el, refused, limited_by } = of(running({}));
    expect([refused, limited_by]).toEqual([null, null]);
    // 300 s of start with 3 MJ; 1000 s of ramp at 50 kW on average, then 100 kW.
    for (const at of ['p90', 'p50', 'p10'] as const) {
      const joules = 3e6 + 1000 * 50e3 + (hours[at] * 3600 - 1000) * 100e3;
      expect(energy_MWh_el[at]).toBeCloseTo(joules / J_PER_MWH, 9);
    }
    expect(hours.p50).toBeGreaterThan(1);
  });

  it('of a unit that still discharges is that of the charge to come', () => {
    const standing = of(running({}));
    const turning = of(
      running({ mode: 'discharge', power_W: 60e3, stood_s: 0, last: 'discharge' }),
    );
    // The ramp down gives 1200 s of 30 kW, 0.01 MWh: a tenth of an hour at 100 kW once charged again,
    // at a round trip of more than a third no more than three tenths.
    const more = turning.hours.p50 - standing.hours.p50;
    expect(more).toBeGreaterThan(0.05);
    expect(more).toBeLessThan(0.3);
    // Standing through the change-over: 600 s of 300 W.
    const hours = turning.hours.p50;
    const joules = 600 * 300 + 3e6 + 1000 * 50e3 + (hours * 3600 - 1000) * 100e3;
    expect(turning.energy_MWh_el.p50).toBeCloseTo(joules / J_PER_MWH, 9);
    expect(turning.ends_by).toBe(standing.ends_by);
  });

  it('of a unit that charges already goes on with it', () => {
    const { hours, energy_MWh_el } = of(running({ mode: 'charge', power_W: -100e3, stood_s: 0 }));
    expect(energy_MWh_el.p50).toBeCloseTo(hours.p50 * 0.1, 9);
  });

  it('says what limits a power, and refuses one that the machine cannot have', () => {
    const connection = {
      time_zone: 'UTC',
      export_max_W: 90e3,
      import_max_W: 150e3,
      windows: [{ from_min: 0, to_min: 30, export_max_W: 90e3, import_max_W: 120e3 }],
    };
    const limits = { ...unit.limits, connection };
    const behind = contextOf({ ...unit, limits }, { hot: 0.4, cold: 0.4 });
    const [low, window, high, over] = headroomOf(behind, { powers_W: [15e3, 130e3, 180e3, 250e3] });
    expect(low).toMatchObject({ limited_by: 'below_least_power', hours: { p10: 0 } });
    expect(low!.refused).toMatch(/^below_least_power: .* 0\.020 to 0\.200 MW_el$/);
    expect(window).toMatchObject({ limited_by: 'connection', refused: null });
    expect(high).toMatchObject({ limited_by: 'connection', refused: null });
    expect(over!.refused).toMatch(/^above_greatest_power/);
    expect(() => of(rested, 0)).toThrow(/power_W = 0/);
  });
});
