import { describe, expect, it } from 'vitest';
import { mismatchOf, storeAlone } from '../../../src/core/plan/alone.js';
import { balanceOf, ONE_STORE } from '../../../src/core/plan/balance.js';
import { contentOf } from '../../../src/core/plan/content.js';
import { runToLimit } from '../../../src/core/plan/limitToLimit.js';
import type { Mismatch } from '../../../src/core/plan/mismatch.js';
import type { Trim } from '../../../src/core/plan/trim.js';
import { toEmpty, usualCharge, usualCycle } from '../../../src/core/plan/usual.js';
import { coldStore, hotBed, hotStore, unitOf } from '../track/plants.js';
import { contextOf, engineUnit } from './units.js';

const unit = unitOf();
const mismatch = (fronts: { hot: number; cold: number }, of = unit): Mismatch => {
  const found = balanceOf(contextOf(of, fronts), {}).mismatch;
  if (found === null) throw new Error('two stores have a mismatch');
  return found;
};
const trim = ({ trims }: Mismatch, way: Trim['way']): Trim =>
  trims.find((one) => one.way === way) as Trim;

describe('the mismatch of two stores', () => {
  const hotMore = mismatch({ hot: 0.7, cold: 0.45 });
  const coldMore = mismatch({ hot: 0.45, cold: 0.7 });

  it('names the store that ends a discharge and what the other still holds', () => {
    expect(hotMore.mismatch_h).toBeGreaterThan(0.2);
    expect(hotMore).toMatchObject({ ends_first: 'cold', stranded: { store: 'hot' } });
    expect(coldMore.mismatch_h).toBeLessThan(-0.2);
    expect(coldMore).toMatchObject({ ends_first: 'hot', stranded: { store: 'cold' } });
    for (const { stranded } of [hotMore, coldMore]) {
      expect(stranded?.stranded_MWh_th).toBeGreaterThan(0);
      expect(stranded?.remains_MWh_th).toBeGreaterThan(stranded?.stranded_MWh_th as number);
      expect(stranded?.worth_MWh_el).toBeGreaterThan(0);
    }
  });

  it('tells the hours of each store alone, none less than those of both together', () => {
    for (const { together, alone } of [hotMore, coldMore]) {
      for (const { hours } of Object.values(alone)) {
        expect(hours.p50).toBeGreaterThanOrEqual(together.hours.p50 - 1e-9);
        expect(hours.p90).toBeLessThan(hours.p50);
        expect(hours.p50).toBeLessThan(hours.p10);
      }
      const least = Math.min(...Object.values(alone).map(({ hours }) => hours.p50));
      // The unit ends with the first of its stores; the median of the earlier of two is a little less.
      expect(together.hours.p50).toBeGreaterThan(least - 0.1);
    }
  });

  it('stays all but as it is while both are discharged by the same flow', () => {
    const usual = usualCycle(contextOf(unit, { hot: 0.7, cold: 0.45 }), {});
    const { model, now, options, power_W } = usual;
    const part = runToLimit(model, now, 'discharge', power_W, { time_s: 3600 }, options);
    // Two marches with other steps: a minute, as in limitToLimit.test.ts.
    expect(Math.abs(mismatchOf(usual, part.end) - hotMore.mismatch_h)).toBeLessThan(1 / 60);
  });

  it('strands what one store would give on from where the other ends', () => {
    const usual = usualCycle(contextOf(unit, { hot: 0.7, cold: 0.45 }), {});
    const { model, capacity, nowEmpty } = usual;
    const on = toEmpty(usual, nowEmpty.end, storeAlone(model, 'hot'));
    const [held, left] = [nowEmpty.end, on.end].map((beds) => contentOf(model, beds, capacity)[0]);
    const given = (held as number) - (left as number);
    expect(on.ends_by).toBe('hot_outlet');
    // By another way to the same outlet temperature: with and without the cold store's fall.
    expect(Math.abs(given / (hotMore.stranded?.stranded_MWh_th as number) - 1)).toBeLessThan(0.05);
    // Matched, it would give that at the efficiency of a discharge.
    expect(on.energy_J / 3.6e9 / (hotMore.stranded?.worth_MWh_el as number)).toBeCloseTo(1, 0);
  });

  it('drifts by the difference of two usual cycles', () => {
    const { after_charge_h, per_cycle_h } = hotMore.drift;
    expect(after_charge_h).toHaveLength(2);
    expect(per_cycle_h).toBe((after_charge_h[1] as number) - (after_charge_h[0] as number));
    const usual = usualCycle(contextOf(unit, { hot: 0.7, cold: 0.45 }), {});
    const first = usualCharge(usual, usual.now, usual.firstCharge_J);
    const second = usualCharge(usual, toEmpty(usual, first.end).end);
    expect(after_charge_h).toEqual([first, second].map(({ end }) => mismatchOf(usual, end)));
  });

  it('is trimmed by running on to the other rule, which costs what the heat was worth', () => {
    const way = trim(hotMore, 'run_on');
    expect(way.reason).toBeNull();
    expect(way.past_rule).toBe('cold_outlet');
    expect(way.mismatch_before_h).toBeGreaterThan(0);
    expect(way.mismatch_after_h).toBeLessThan(way.mismatch_before_h);
    expect(way.gives_MWh_el).toBeGreaterThan(0);
    expect(way.cost_MWh_el).toBeGreaterThan(0);
    expect(way.lost_MWh_th.hot).toBeGreaterThan(0);
    expect(way.lost_MWh_th.cold).toBe(0);
    // Past its rule of -95 degC and no warmer than ambient.
    expect(way.outlet_degC).toBeGreaterThan(-95);
    expect(way.outlet_degC).toBeLessThan(30);
  });

  it('is trimmed, or not, by a longer charge, which blows heat through the store that is full', () => {
    const way = trim(coldMore, 'longer_charge');
    expect(way.reason).toBeNull();
    expect(way.takes_MWh_el).toBeGreaterThan(0);
    const full = way.past_rule === 'hot_outlet' ? 'hot' : 'cold';
    expect(way.lost_MWh_th[full]).toBeGreaterThan(0);
    const { round_trip } = balanceOf(contextOf(unit, { hot: 0.45, cold: 0.7 }), {}).usual;
    expect(way.cost_MWh_el).toBeCloseTo(round_trip * way.takes_MWh_el - way.gives_MWh_el, 9);
  });

  it('cannot be trimmed at a store where no store ends a run', () => {
    const limits = { ...unit.limits, hot_outlet_min_K: null, cold_outlet_max_K: null };
    const found = mismatch({ hot: 0.6, cold: 0.6 }, { ...unit, limits });
    expect(trim(found, 'run_on').reason).toMatch(/^a discharge ends by \w+, not by a store$/);
  });

  it('is told, and what it would be worth, where one store is full and the other empty', () => {
    const locked = balanceOf(contextOf(unit, { hot: 2, cold: -1 }), {});
    expect(locked.usual.locked).toBe(true);
    expect(locked.usual.round_trip).toBeGreaterThan(0.3);
    expect(locked.mismatch?.ends_first).toBe('cold');
    // Nothing but the ten minutes in which the rules wait; see computeHours.
    expect(locked.mismatch?.together.hours.p10).toBeLessThanOrEqual(1 / 6);
    expect(locked.mismatch?.alone.hot?.hours.p50).toBeGreaterThan(5);
    expect(locked.mismatch?.stranded?.worth_MWh_el).toBeGreaterThan(0.3);
    expect(Number.isFinite(locked.flush.ways[0]?.cost_MWh_el)).toBe(true);
  });
});

describe('a stand', () => {
  it('trims the stores where the one that holds more loses more, as marched', () => {
    const leaky = hotStore({ bed: hotBed({ wall_loss_W_m2K: 1.2 }) });
    const found = mismatch({ hot: 0.62, cold: 0.6 }, unitOf({ stores: [leaky, coldStore()] }));
    const way = trim(found, 'stand');
    expect(found.mismatch_h).toBeGreaterThan(0.02);
    expect(way.reason).toBeNull();
    expect(Math.abs(way.mismatch_after_h)).toBeLessThan(0.1 * way.mismatch_before_h);
    expect(way.lost_MWh_th.hot).toBeGreaterThan(way.lost_MWh_th.cold as number);
    expect(way.takes_MWh_el).toBeCloseTo((300 * way.hours) / 1e6, 12);
    expect(way.cost_MWh_el).toBeCloseTo(way.takes_MWh_el - way.gives_MWh_el, 12);
  });
});

describe('a single hot store', () => {
  it('has no mismatch, and says so', () => {
    const answer = balanceOf(contextOf(engineUnit(), { hot: 0.5, cold: 0.5 }), {});
    expect(answer.mismatch).toBeNull();
    expect(answer.mismatch_reason).toBe(ONE_STORE);
    expect(answer.usual.round_trip).toBeGreaterThan(0.2);
    expect(answer.usual.round_trip).toBeLessThan(0.27);
  });
});
