import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { commandOf } from '../../../src/core/plan/command.js';
import type { PlanContext } from '../../../src/core/plan/context.js';
import { energyBetween } from '../../../src/core/plan/course.js';
import { headroomOf } from '../../../src/core/plan/headroom.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
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

describe('headroom where the greatest flow comes before the power asked', () => {
  const within = (flow_max_kg_s: number, power_min_W: number, fronts: number) =>
    contextOf(
      unitOf({
        limits: {
          ...plain.limits,
          charge: { ...plain.limits.charge, flow_max_kg_s, power_min_W },
        },
      }),
      { hot: fronts, cold: fronts },
    );

  it('goes on derated until a store breaks through, at the same hours whatever is asked', () => {
    const context = within(0.9, 20e3, 0.5);
    const [free, derated, more] = headroomOf(context, { powers_W: [100e3, 160e3, 190e3] });
    expect(free).toMatchObject({ derated_after_hours: null, derated_to_MW_el: null });
    for (const { ends_by, derated_after_hours, derated_to_MW_el, energy_MWh_el, hours } of [
      derated!,
      more!,
    ]) {
      expect(ends_by).toBe(free!.ends_by);
      expect(derated_after_hours).toBe(0);
      const mean = energy_MWh_el.p50 / hours.p50;
      expect(mean).toBeGreaterThan(derated_to_MW_el as number);
      expect(mean).toBeLessThan(0.15);
      expect(energy_MWh_el.p90).toBeGreaterThan(0.9 * free!.energy_MWh_el.p90);
    }
    // What a march at that flow takes until it stops; by the trapezoids of its 240 s steps, 0.3 %.
    const leg = { mode: 'charge', power_W: 160e3, from_s: 0, to_s: 20 * 3600 } as const;
    const command = commandOf(context.model.unit, [leg], [], context.before, leg.to_s);
    const { episodes, delivered } = createOutlook(context.model, context.state).best(command);
    const stopped_s = episodes[0]?.stopped_s as number;
    const taken_MWh = -energyBetween(delivered, 0, stopped_s) / J_PER_MWH;
    expect(derated!.energy_MWh_el.p50 / taken_MWh).toBeGreaterThan(0.997);
    expect(derated!.energy_MWh_el.p50 / taken_MWh).toBeLessThan(1.003);
    expect(more!.hours.p50).toBeCloseTo(derated!.hours.p50, 3);
    expect(derated!.hours.p50).toBeLessThan(free!.hours.p50);
  });

  it('ends where that flow takes less than the least power', () => {
    const [outlet] = headroomOf(within(1.1, 20e3, 0.5), { powers_W: [180e3] });
    const [least] = headroomOf(within(1.1, 163e3, 0.5), { powers_W: [180e3] });
    expect(outlet!.derated_to_MW_el).toBeLessThan(0.163);
    expect(least!.ends_by).toBe('flow');
    expect(least!.derated_to_MW_el).toBeGreaterThan(0.162);
    expect(least!.hours.p50).toBeLessThan(outlet!.hours.p50);
    expect(least!.hours.p50).toBeGreaterThan(least!.derated_after_hours as number);
  });

  it('never gives more hours at more power, and no more energy than asked', () => {
    // A chord across a step of 240 s meets zero within an eighth of it where the slope at most doubles.
    const chord = 240 / 8 / 3600;
    // At the greatest flow the meter no longer drops out: its class and its slope, 1 % each, are a
    // sigma more; the quantiles of both sides of that bend are those of two straight lines.
    const meter = 1.2816 * 0.01 * Math.SQRT2;
    const power = fc.integer({ min: 30, max: 200 });
    fc.assert(
      fc.property(
        fc.record({
          flow: fc.double({ min: 0.5, max: 1.5, noNaN: true }),
          fronts: fc.double({ min: 0.25, max: 0.7, noNaN: true }),
          powers: fc.tuple(power, power),
        }),
        ({ flow, fronts, powers }) => {
          const powers_W = [Math.min(...powers) * 1e3, Math.max(...powers) * 1e3];
          const [less, more] = headroomOf(within(flow, 20e3, fronts), { powers_W });
          expect(more!.hours.p50).toBeLessThan(less!.hours.p50 + chord);
          for (const at of ['p90', 'p10'] as const) {
            expect(more!.hours[at]).toBeLessThan(less!.hours[at] + chord + meter * less!.hours.p50);
          }
          for (const one of [less!, more!]) {
            for (const { p90, p50, p10 } of [one.hours, one.energy_MWh_el]) {
              expect(p90).toBeGreaterThanOrEqual(0);
              expect(p50).toBeGreaterThanOrEqual(p90);
              expect(p10).toBeGreaterThanOrEqual(p50);
            }
            for (const at of ['p90', 'p50', 'p10'] as const) {
              const asked = one.power_MW_el * one.hours[at];
              expect(one.energy_MWh_el[at]).toBeLessThanOrEqual(asked * (1 + 1e-9));
            }
            if (one.derated_after_hours === null) continue;
            expect(one.derated_to_MW_el).toBeLessThanOrEqual(one.power_MW_el);
            expect(one.derated_after_hours).toBeGreaterThanOrEqual(0);
          }
        },
      ),
      { seed: 5, numRuns: 20 },
    );
  });
});
