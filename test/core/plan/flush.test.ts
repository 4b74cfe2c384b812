import { describe, expect, it } from 'vitest';
import { balanceOf } from '../../../src/core/plan/balance.js';
import { startAhead } from '../../../src/core/plan/bedsAhead.js';
import { contentOf } from '../../../src/core/plan/content.js';
import { watchToLimit } from '../../../src/core/plan/limitToLimit.js';
import { blownThrough } from '../../../src/core/plan/trim.js';
import { usualCycle } from '../../../src/core/plan/usual.js';
import { hotBed, hotStore, unitOf } from '../track/plants.js';
import { contextOf, ENGINE, engineUnit } from './units.js';

const J_PER_MWH = 3.6e9;
const PRICES = { price_per_MWh_el: 100, charging_price_per_MWh_el: 20 };
/** Fronts half way and wide, as after weeks of half cycles. */
const WIDE = { hot: 0.5, cold: 0.5, width: 0.25 };

describe.each([
  ['a gas cycle with two stores', unitOf(), 0.3],
  ['an engine on one hot store', engineUnit(), 0.6],
])('a flush of the fronts: %s', (_, unit, charge_MWh) => {
  const context = contextOf(unit, WIDE);
  const answer = balanceOf(context, { charge_J: charge_MWh * J_PER_MWH, prices: PRICES });
  const { as_usual, ways } = answer.flush;
  const eta = as_usual.round_trip;
  const sum = (runs: readonly { energy_MWh_el: number }[], from: number) =>
    runs.slice(from).reduce((all, run) => all + run.energy_MWh_el, 0);

  it('takes the usual charge that was asked for', () => {
    expect(answer.usual.charge_from).toBe('asked');
    expect(answer.usual.charge_MWh_el).toBeCloseTo(charge_MWh, 12);
    const [charge] = as_usual.runs;
    expect(charge?.ends_by).toBeNull();
    expect(charge?.energy_MWh_el).toBeLessThan(charge_MWh);
  });

  it('runs to the rules: a full charge takes more than the usual one, a full discharge nothing', () => {
    const [charge, discharge] = ways;
    expect(ways.map(({ way }) => way)).toEqual(['full_charge', 'full_discharge']);
    expect(charge?.runs.map(({ ends_by }) => ends_by)).not.toContain(null);
    expect(charge?.takes_MWh_el).toBeGreaterThan(0);
    expect(discharge?.runs).toHaveLength(1);
    expect(discharge?.takes_MWh_el).toBeCloseTo(-(as_usual.runs[0]?.energy_MWh_el as number), 12);
  });

  it('has costs that follow from its runs', () => {
    const usual = as_usual.runs;
    const net = (charged: number, given: number) => given - eta * charged;
    const usualNet = net(sum(usual.slice(0, 1), 0), sum(usual, 1));
    for (const { way, runs, cost_MWh_el, takes_hours, money, takes_MWh_el, gives_MWh_el } of ways) {
      const own =
        way === 'full_charge' ? net(sum(runs.slice(0, 1), 0), sum(runs, 1)) : net(0, sum(runs, 0));
      expect(cost_MWh_el).toBeCloseTo(usualNet - own, 10);
      const hours = (of: readonly { hours: number }[]) =>
        of.reduce((all, run) => all + run.hours, 0);
      expect(takes_hours).toBeCloseTo(hours(runs) - hours(usual), 10);
      expect(money?.energy_cost).toBeCloseTo(20 * takes_MWh_el - 100 * gives_MWh_el, 8);
      if (takes_hours <= 0) expect(money?.lost_time_cost).toBe(0);
      else expect(money?.lost_time_cost).toBeGreaterThan(0);
    }
  });

  it('wins back what does not come from the grid, a few per cent at most', () => {
    const fine = { ...unit, estimator: { ...unit.estimator, cells: 60 } };
    const other = balanceOf(contextOf(fine, WIDE), { charge_J: charge_MWh * J_PER_MWH }).flush;
    const gains = ways.flatMap(({ gains_MWh_el }) => gains_MWh_el);
    const finer = other.ways.flatMap(({ gains_MWh_el }) => gains_MWh_el);
    const largest = Math.max(...gains.map(Math.abs));
    expect(gains).toHaveLength(6);
    expect(largest).toBeGreaterThan(0.002 * (as_usual.following_MWh_el[0] as number));
    expect(largest).toBeLessThan(0.1 * (as_usual.following_MWh_el[0] as number));
    // A gain made by the numerical width of a front would fall to a quarter with the cell halved
    // (second order): an eighth of the largest is far from that.
    gains.forEach((gain, n) => {
      expect(Math.abs(gain - (finer[n] as number))).toBeLessThan(largest / 8);
    });
  });

  it('has paid where its gains are more than its cost', () => {
    for (const { money, pays_after_cycles } of ways) {
      const cost = money!.energy_cost + money!.lost_time_cost;
      const net = money!.gains.reduce((sum, gain) => sum + gain, -cost);
      expect(pays_after_cycles !== null).toBe(net >= 0);
    }
  });

  it('pays by the prices, not by MWh_el, where they are given', () => {
    const prices = { price_per_MWh_el: 0, charging_price_per_MWh_el: -50 };
    const [charge] = balanceOf(context, { charge_J: charge_MWh * J_PER_MWH, prices }).flush.ways;
    const { takes_MWh_el, takes_hours, money } = charge!;
    // Energy given is worth nothing, energy taken is paid for: only the lost time costs.
    expect(money!.energy_cost).toBeCloseTo(-50 * takes_MWh_el, 8);
    expect(takes_hours).toBeGreaterThan(0);
    const cost = money!.energy_cost + money!.lost_time_cost;
    let net = -cost;
    const sums = [net, ...money!.gains.map((gain) => (net += gain))];
    const short = sums.findLastIndex((sum) => sum < 0);
    expect(charge!.pays_after_cycles).toBe(short === sums.length - 1 ? null : short + 1);
  });

  it('is none where the usual charge is a full one already', () => {
    const full = balanceOf(context, { charge_J: 100 * J_PER_MWH });
    const [charge] = full.flush.ways;
    expect(charge).toMatchObject({
      reason: 'this is what is usual',
      takes_MWh_el: 0,
      cost_MWh_el: 0,
      pays_after_cycles: null,
      money: null,
    });
    expect(charge?.gains_MWh_el.every((gain) => gain === 0)).toBe(true);
  });

  it('refuses what it cannot be asked', () => {
    expect(() => balanceOf(context, { charge_J: 0 })).toThrow(/charge_J = 0: expected a finite/);
    expect(() => balanceOf(context, { power_W: 1e9 })).toThrow(/power_W = 1000000000: expected/);
    const prices = { price_per_MWh_el: -3 };
    expect(() => balanceOf(context, { prices })).toThrow(/price_per_MWh_el = -3: expected/);
    const connection = { time_zone: 'UTC', import_max_W: 0, export_max_W: 1e6, windows: [] };
    const cut = { ...unit, limits: { ...unit.limits, connection } };
    expect(() => balanceOf(contextOf(cut, WIDE), {})).toThrow(/connection.import_max_W = 0/);
  });
});

describe('heat that is blown through a full store', () => {
  it('is what came in less what stayed: a store without losses', () => {
    const bed = hotBed({
      fluid: ENGINE.fluid,
      pressure_Pa: 1.02e5,
      wall_loss_W_m2K: 0,
      end_loss_W_m2K: { charge_inlet: 0, discharge_inlet: 0 },
    });
    const unit = engineUnit({ stores: [hotStore({ bed })] });
    const usual = usualCycle(contextOf(unit, { hot: 0.7, cold: 0.7 }), {});
    const { model, options, capacity } = usual;
    const open = {
      ...model,
      unit: { ...unit, limits: { ...unit.limits, charge_hot_outlet_max_K: null } },
    };
    const now = startAhead(model);
    const run = watchToLimit(open, now, 'charge', 100e3, { time_s: 8 * 3600 }, options);
    const stayed =
      (contentOf(model, run.end, capacity)[0] as number) -
      (contentOf(model, now, capacity)[0] as number);
    const { fluid } = ENGINE;
    const perKg = fluid.enthalpy(ENGINE.charge_inlet_K) - fluid.enthalpy(298.15);
    const cameIn = run.moments.reduce((sum, { t_s, flow_kg_s }, n) => {
      const dt = n === 0 ? 0 : t_s - (run.moments[n - 1]?.t_s as number);
      return sum + flow_kg_s * dt * perKg;
    }, 0);
    const blown = blownThrough(usual, 0, run.moments);
    expect(blown).toBeGreaterThan(0.02);
    // The bed's fluid has its own table of h(T), refreshed by segments: parts in a thousand.
    expect(Math.abs((blown + stayed) / (cameIn / J_PER_MWH) - 1)).toBeLessThan(0.005);
  });
});
