import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { centralHours } from '../../../src/core/dispatch/hours.js';
import { hoursInput } from '../../../src/core/dispatch/unitHours.js';
import { startAhead } from '../../../src/core/plan/bedsAhead.js';
import { type Capability, capabilityOf } from '../../../src/core/plan/capability.js';
import { chargeOf } from '../../../src/core/plan/capabilityPaths.js';
import { greatestPower } from '../../../src/core/plan/greatest.js';
import { runToLimit, watchToLimit } from '../../../src/core/plan/limitToLimit.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { valueAt } from '../../../src/core/plan/piecewise.js';
import { unitOf } from '../track/plants.js';
import { contextOf, engineUnit } from './units.js';

const FRONTS = { hot: 0.5, cold: 0.5 };
/** Flow binds near both ends: 1.5 kg/s give 60 kW from full stores with 8 % to spare. */
const cycle = unitOf();
const tight: UnitDefinition = {
  ...cycle,
  limits: {
    ...cycle.limits,
    discharge: { ...cycle.limits.discharge, flow_max_kg_s: 1.05 },
    charge: { ...cycle.limits.charge, flow_max_kg_s: 1.2 },
  },
};
const line = (curve: Capability['discharge']) =>
  curve.points.map((p) => ({ x: p.state_of_charge, y: p.power_MW_el * 1e6 }));

describe.each([
  ['a gas cycle with two stores', tight],
  ['an engine on one hot store', engineUnit()],
])('the capability curve: %s', (_, unit) => {
  const context = contextOf(unit, FRONTS);
  const answer = capabilityOf(context, {});
  const { ahead: model, options } = createOutlook(context.model, context.state).beds();
  const most = { time_s: 1e6 };
  const charging_W = unit.limits.charge.power_max_W;
  const full = runToLimit(model, startAhead(model), 'charge', charging_W, most, options);
  const march = { model, options, capacity: [] };

  it('stands on the state of charge that the unit publishes', () => {
    const rated = unit.rated_power_W;
    const { hours } = centralHours(hoursInput(context.model, context.state, rated), rated);
    // See limitToLimit.test.ts for how close a march comes to the hours published.
    expect(Math.abs((answer.state_of_charge * unit.rated_hours) / hours - 1)).toBeLessThan(4e-4);
    expect(answer.full_from_now).toBeCloseTo(chargeOf(march, full.end), 6);
    expect(answer.full_from_now).toBeGreaterThan(answer.state_of_charge + 0.2);
  });

  it('keeps its stated error, against a march of steps of another length', () => {
    const curve = answer.discharge;
    expect(curve.after_cycles).toBe(0);
    expect(curve.largest_error_MW_el).toBeLessThanOrEqual(curve.tolerance_MW_el);
    const marched = (step_s: number) => {
      const steps = { ...options, step_s };
      const run = watchToLimit(model, full.end, 'discharge', unit.rated_power_W, most, steps);
      return { run, end_s: Math.min(run.first_h, run.hours) * 3600 };
    };
    const { run, end_s } = marched(60);
    const seen = run.moments
      .filter(({ t_s }) => t_s > 600 && t_s <= end_s)
      .map(({ t_s, beds }) => ({
        soc: (end_s - t_s) / 3600 / unit.rated_hours,
        power_W: greatestPower(model, beds, 'discharge', t_s).power_W,
      }));
    expect(seen.length).toBeGreaterThan(200);
    // Steepest fall over a step of 240 s of the curve's own march. A bend within a step lies a
    // quarter of it off a straight line at most; the two marches end so far apart on top.
    const fall = Math.max(
      ...seen.slice(4).map(({ power_W }, i) => (seen[i]?.power_W as number) - power_W),
    );
    const apart = Math.abs(marched(options.step_s).end_s - end_s) / options.step_s;
    const bound = curve.largest_error_MW_el * 1e6 + fall * (0.25 + apart);
    expect(bound).toBeLessThan(0.03 * unit.rated_power_W);
    for (const { soc, power_W } of seen) {
      expect(Math.abs(valueAt(line(curve), soc) - power_W)).toBeLessThan(bound);
    }
  });

  it('has its greatest charging power fall towards full, and its discharging power towards empty', () => {
    const [first, last] = [answer.charge.points[0], answer.charge.points.at(-1)];
    expect(last?.power_MW_el).toBeLessThanOrEqual(first?.power_MW_el as number);
    const low = answer.discharge.points[0];
    expect(low?.state_of_charge).toBe(0);
    expect(low?.power_MW_el).toBeLessThan(answer.discharge.points.at(-1)?.power_MW_el as number);
    expect(low?.limited_by).toBe('flow');
    // Rated power is what state of charge means: it can be given down to 0.
    expect(low?.power_MW_el).toBeGreaterThan(0.999 * (unit.rated_power_W / 1e6));
  });

  it('tells energy by the state of charge, and what each store holds', () => {
    for (const { state_of_charge, energy_MWh_el, stored_MWh_th } of answer.discharge.points) {
      const rated_MWh = (unit.rated_power_W / 1e6) * unit.rated_hours;
      expect(energy_MWh_el).toBeCloseTo(state_of_charge * rated_MWh, 6);
      expect(Object.keys(stored_MWh_th)).toEqual(unit.stores.map(({ id }) => id));
    }
    const { points } = answer.charge;
    expect(points.at(-1)?.energy_MWh_el).toBe(0);
    for (const id of unit.stores.map((store) => store.id)) {
      expect(points.at(-1)?.stored_MWh_th[id]).toBeGreaterThan(
        points[0]?.stored_MWh_th[id] as number,
      );
    }
  });

  it('tells efficiencies that agree with each other', () => {
    const { cycle: figures } = answer;
    if (figures === null) throw new Error('a cycle was expected');
    expect(figures.round_trip).toBeCloseTo(figures.discharge_MWh_el / figures.charge_MWh_el, 12);
    for (const { id } of unit.stores) {
      const there = figures.charge_MWh_el_per_MWh_th[id] as number;
      const back = figures.discharge_MWh_el_per_MWh_th[id] as number;
      // Settled to 0.5 % of the rated hours a cycle, with losses of some per cent on top: a store gives
      // what it took to within a few per cent.
      expect(Math.abs(back / there / figures.round_trip - 1)).toBeLessThan(0.05);
    }
  });

  it('takes more points for a smaller error', () => {
    const fine = capabilityOf(context, { tolerance: 0.0005 });
    const count = ({ charge, discharge }: Capability) =>
      charge.points.length + discharge.points.length;
    expect(count(fine)).toBeGreaterThan(count(answer));
    expect(fine.discharge.largest_error_MW_el).toBeLessThanOrEqual(
      0.0005 * unit.rated_power_W * 1e-6,
    );
  });
});

describe('the capability of a unit that something keeps from running', () => {
  const connection = { time_zone: 'UTC', import_max_W: 100e3, export_max_W: 70e3, windows: [] };

  it('is cut at the connection', () => {
    const unit = { ...cycle, limits: { ...cycle.limits, connection } };
    const { charge, discharge } = capabilityOf(contextOf(unit, FRONTS), {});
    for (const point of [...charge.points, ...discharge.points]) {
      expect(point.limited_by).toBe('connection');
    }
    expect(new Set(discharge.points.map((point) => point.power_MW_el))).toEqual(new Set([0.07]));
    expect(charge.marched_at_MW_el).toBe(0.1);
  });

  it('is refused in the direction that it cannot run in, with the reason', () => {
    const none = { ...connection, import_max_W: 10e3 };
    const unit = { ...cycle, limits: { ...cycle.limits, connection: none } };
    const { charge, discharge, cycle: figures } = capabilityOf(contextOf(unit, FRONTS), {});
    expect(charge.refused).toBe('connection: 0.010 MW_el at most, the least power is 0.020 MW_el');
    expect(charge.points).toEqual([]);
    expect(figures).toBeNull();
    expect(discharge.points.at(-1)?.state_of_charge).toBeGreaterThan(0.3);
  });

  it('is held by the pressure drop where that binds first', () => {
    const unit = { ...cycle, limits: { ...cycle.limits, pressure_drop_max_Pa: 260 } };
    const { discharge } = capabilityOf(contextOf(unit, FRONTS), {});
    expect(discharge.points.some((point) => point.limited_by === 'pressure_drop')).toBe(true);
  });

  it('is that of a settled cycle where one store is full and the other empty', () => {
    const answer = capabilityOf(contextOf(cycle, { hot: 2, cold: -1 }), {});
    expect([answer.state_of_charge, answer.full_from_now]).toEqual([0, 0]);
    for (const curve of [answer.discharge, answer.charge]) {
      expect(curve.after_cycles).toBeNull();
      expect(curve.points.at(-1)?.state_of_charge).toBeGreaterThan(0.3);
    }
    expect(answer.cycle?.round_trip).toBeGreaterThan(0.3);
  });

  it.each([
    ['empty', { hot: -1, cold: -1 }],
    ['full', { hot: 2, cold: 2 }],
    ['all front', { hot: 0.5, cold: 0.5, width: 0.6 }],
  ])('has sound points from stores that are %s', (_, fronts) => {
    for (const unit of [cycle, engineUnit()]) {
      const { charge, discharge } = capabilityOf(contextOf(unit, fronts), {});
      for (const { direction, points } of [charge, discharge]) {
        expect(points.length).toBeGreaterThan(1);
        points.forEach((point, i) => {
          const before = points[i - 1];
          if (before !== undefined) {
            expect(point.state_of_charge).toBeGreaterThan(before.state_of_charge);
            const more = point.energy_MWh_el - before.energy_MWh_el;
            if (direction === 'discharge') expect(more).toBeGreaterThan(0);
            else expect(more).toBeLessThan(0);
          }
          expect(point.power_MW_el).toBeGreaterThan(0);
          expect(point.power_MW_el).toBeLessThanOrEqual(unit.limits[direction].power_max_W / 1e6);
        });
      }
    }
  });

  it('refuses a tolerance that is none', () => {
    expect(() => capabilityOf(contextOf(cycle, FRONTS), { tolerance: 0.5 })).toThrow(
      /tolerance = 0.5: expected 0.0005 to 0.2 of rated power/,
    );
  });
});
