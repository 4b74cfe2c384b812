import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { commandOf } from '../../../src/core/plan/command.js';
import { energyBetween } from '../../../src/core/plan/course.js';
import { type OffersAsk, takesLong } from '../../../src/core/plan/offerAsk.js';
import { type Offer, offersOf } from '../../../src/core/plan/offers.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { firstBreaks, spreadOf } from '../../../src/core/plan/spread.js';
import { hoursAt } from '../../../src/core/unit.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import { contextOf, H, HOUR_MS, unit } from './offerUnit.js';
import { engineUnit } from './units.js';

const LEAST = unit.limits.discharge.power_min_W;
const MOST = unit.limits.discharge.power_max_W;
const CERTAINTIES = [0.5, 0.8, 0.9, 0.99];
const SEED = 4;
const STAND = { mode: 'stand' as const, power_W: 0 };
/** Of the estimate: see contextOf. */
const NOW_MS = 180_000;
const full = contextOf({ hot: 0.85, cold: 0.85 });

function ask(over: Partial<OffersAsk> = {}): OffersAsk {
  return {
    powers_W: [60e3],
    starts_ms: [HOUR_MS],
    block_s: 900,
    certainties: CERTAINTIES,
    ...over,
  };
}

function only(offers: readonly Offer[]): Offer {
  expect(offers).toHaveLength(1);
  return offers[0] as Offer;
}

describe('an offer table', () => {
  it('gives for a discharge from now what hours gives, and its energy', () => {
    const { operation: _, ...limits } = unit.limits;
    const plain: UnitDefinition = { ...unit, limits };
    const context = contextOf({ hot: 0.85, cold: 0.85 }, plain);
    const offer = only(offersOf(context, ask({ starts_ms: [900_000] })));
    const wait_h = offer.start_s / H;
    const state = watchedUnit(plain, { hot: 0.85, cold: 0.85 }, 3);
    const hours = hoursAt(plain, state, [60e3])[0]!.hours;
    const sigma = (hours.p10 - hours.p90) / 2.56;
    // Fixed points of their own, see NORMAL_COUNT and normalPoints: a tenth of a sigma at 10 %; the
    // wait of 12 minutes costs less than that.
    expect(wait_h).toBeLessThan(0.25);
    for (const key of ['p90', 'p50', 'p10'] as const) {
      expect(Math.abs(offer.hours[key] - hours[key])).toBeLessThan(0.12 * sigma);
      expect(offer.energy_MWh_el[key]).toBeCloseTo(offer.hours[key] * 0.06, 9);
    }
  });

  it('works the same on one hot store with an engine', () => {
    const engine = engineUnit();
    const context = contextOf({ hot: 0.8, cold: 0.8 }, engine);
    const powers_W = [15e3, 20e3, 30e3, 40e3];
    const offers = offersOf(context, ask({ powers_W, starts_ms: [900_000] }));
    const state = watchedUnit(engine, { hot: 0.8, cold: 0.8 }, 3);
    hoursAt(engine, state, powers_W).forEach(({ hours, ends_by }, i) => {
      const offer = offers[i] as Offer;
      const sigma = (hours.p10 - hours.p90) / 2.56;
      // As above: points of their own, and what goes between powers.
      expect(Math.abs(offer.hours.p50 - hours.p50)).toBeLessThan(0.15 * sigma);
      expect(Math.abs(offer.hours.p90 - hours.p90)).toBeLessThan(0.2 * sigma);
      expect(offer.ends_by[ends_by]).toBeGreaterThan(0.5);
    });
  });

  it('never gives more hours at more power, between the least and the greatest', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.3, max: 0.95, noNaN: true }),
        fc.double({ min: 0.3, max: 0.95, noNaN: true }),
        fc.uniqueArray(fc.integer({ min: 0, max: 20 }), { minLength: 2, maxLength: 4 }),
        (hot, cold, steps) => {
          const powers_W = steps
            .sort((a, b) => a - b)
            .map((n) => LEAST + ((MOST - LEAST) * n) / 20);
          const offers = offersOf(contextOf({ hot, cold }), ask({ powers_W }));
          offers.slice(1).forEach((offer, i) => {
            const less = offers[i] as Offer;
            for (const key of ['p90', 'p50', 'p10'] as const) {
              expect(offer.hours[key]).toBeLessThanOrEqual(less.hours[key]);
            }
          });
        },
      ),
      { seed: SEED, numRuns: 6 },
    );
  });

  it('gains nothing by waiting, beyond 0.5 % of the rated hours', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.4, max: 0.95, noNaN: true }),
        fc.integer({ min: 1, max: 12 }),
        (front, wait_h) => {
          const starts_ms = [HOUR_MS, HOUR_MS * (1 + wait_h)];
          const context = contextOf({ hot: front, cold: front });
          const [now, later] = offersOf(context, ask({ starts_ms })) as [Offer, Offer];
          expect(later.hours.p50).toBeLessThanOrEqual(now.hours.p50 + 0.005 * unit.rated_hours);
        },
      ),
      { seed: SEED, numRuns: 6 },
    );
  });

  it('orders what it gives by certainty, with nothing negative', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.2, max: 0.95, noNaN: true }),
        fc.double({ min: 0.2, max: 0.95, noNaN: true }),
        fc.double({ min: LEAST, max: MOST, noNaN: true }),
        (hot, cold, power_W) => {
          const offer = only(offersOf(contextOf({ hot, cold }), ask({ powers_W: [power_W] })));
          const inOrder = (values: readonly number[]): void => {
            values.forEach((value, i) => {
              expect(value).toBeGreaterThanOrEqual(0);
              expect(value).toBeLessThanOrEqual(values[i - 1] ?? Number.POSITIVE_INFINITY);
            });
          };
          inOrder(offer.at.map((at) => at.hours));
          inOrder(offer.at.map((at) => at.energy_MWh_el));
          inOrder(offer.at.map((at) => at.expected_shortfall_MWh_el));
          inOrder(offer.at.map((at) => at.whole_blocks.alone));
          for (const block of offer.blocks) {
            inOrder(block.at.map((at) => at.energy_MWh_el));
            expect(block.whole.jointly).toBeLessThanOrEqual(block.whole.alone);
            expect(block.mean_MWh_el).toBeLessThanOrEqual(block.most_MWh_el + 1e-12);
          }
          inOrder(offer.blocks.map((block) => block.whole.alone));
          const sum = Object.values(offer.ends_by).reduce((a, b) => a + b, 0);
          expect(sum).toBeCloseTo(1, 9);
        },
      ),
      { seed: SEED, numRuns: 8 },
    );
  });

  it('has block energies that add up to the integral of net power, ramps and start-up included', () => {
    fc.assert(
      fc.property(
        fc.double({ min: LEAST, max: MOST, noNaN: true }),
        fc.constantFrom(900, 1800, 3600),
        fc.integer({ min: 1, max: 20 }),
        (power_W, block_s, blocks) => {
          const horizon_s = blocks * block_s;
          const question = ask({
            ...{ powers_W: [power_W], block_s: block_s as 900, horizon_s },
          });
          const offer = only(offersOf(full, question));
          const legs = [
            {
              ...{ mode: 'discharge' as const, power_W },
              ...{ from_s: offer.start_s, to_s: offer.start_s + horizon_s },
            },
          ];
          const end = offer.start_s + horizon_s + 2 * H;
          const { pieces } = commandOf(unit, legs, [], full.before, end);
          const closes = offer.start_s + horizon_s + power_W / 100;
          offer.at.forEach((at, i) => {
            const sum = offer.blocks.reduce((a, b) => a + (b.at[i]?.energy_MWh_el as number), 0);
            expect(sum).toBeCloseTo(at.energy_MWh_el, 9);
            const stop = offer.begins_s + at.hours * H;
            const until = at.hours * H >= horizon_s - 1e-6 ? closes : stop;
            const net = energyBetween(pieces, offer.start_s, until) / 3.6e9;
            expect(at.energy_MWh_el).toBeCloseTo(net, 9);
          });
          const mean = offer.blocks.reduce((a, b) => a + b.mean_MWh_el, 0);
          expect(mean).toBeCloseTo(offer.mean_MWh_el, 9);
        },
      ),
      { seed: SEED, numRuns: 8 },
    );
  });

  it('gives zero with a reason where a store is empty', () => {
    const offer = only(offersOf(contextOf({ hot: 0.02, cold: 0.6 }), ask()));
    expect(offer.refused).toMatch(/^empty: .*hot_outlet/);
    expect(offer.hours).toEqual({ p90: 0, p50: 0, p10: 0 });
    expect(offer.at.every((at) => at.energy_MWh_el === 0)).toBe(true);
    expect(offer.blocks).toEqual([]);
    expect(offer.ends_by.hot_outlet).toBe(1);
  });

  it('is the same where all that goes between powers and starts is marched, within a tenth of a sigma', () => {
    const powers_W = [15e3, 25e3, 40e3, 55e3, 70e3, 90e3];
    // Neither the first start nor the last, in whatever order they are asked for.
    const starts_ms = [6, 13, 1].map((hours) => hours * HOUR_MS);
    const offers = offersOf(full, ask({ powers_W, starts_ms }));
    powers_W.forEach((power_W, i) => {
      const offer = offers[i] as Offer;
      const leg = { mode: 'discharge' as const, power_W, from_s: offer.start_s, to_s: Infinity };
      const end = offer.start_s + 24 * H * Math.max(1, 60e3 / power_W);
      const command = commandOf(unit, [leg], [], full.before, end);
      const load = power_W / unit.rated_power_W;
      const spread = spreadOf(createOutlook(full.model, full.state, load), command);
      const stops = firstBreaks(spread)[0]!.slice().sort();
      const at = (share: number): number =>
        (stops[Math.floor(share * stops.length)]! - offer.begins_s) / H;
      const sigma = (at(0.9) - at(0.1)) / 2.56;
      expect(Math.abs(offer.hours.p90 - at(0.1))).toBeLessThan(0.1 * sigma);
      expect(Math.abs(offer.hours.p50 - at(0.5))).toBeLessThan(0.1 * sigma);
      expect(Math.abs(offer.hours.p10 - at(0.9))).toBeLessThan(0.1 * sigma);
    });
  });
});

describe('an offer after a plan', () => {
  const legs = [
    { mode: 'discharge' as const, power_W: 60e3, from_ms: HOUR_MS, to_ms: 4 * HOUR_MS },
  ];

  it('gives what the plan leaves', () => {
    const starts_ms = [7 * HOUR_MS];
    const alone = only(offersOf(full, ask({ starts_ms })));
    const after = only(offersOf(full, ask({ starts_ms, legs })));
    // Three hours of the same power (what the ramp up lacks, the ramp down gives), less what a fuller
    // store loses more over the wait: 2 % an hour here at most.
    const left = alone.energy_MWh_el.p50 - after.energy_MWh_el.p50;
    expect(left).toBeGreaterThan(0.9 * 3 * 0.06);
    expect(left).toBeLessThan(1.05 * 3 * 0.06);
    expect(after.plan_holds).toBe(1);
  });

  it('goes on with a run of the plan that ends at its start, as if it were one', () => {
    const whole = only(offersOf(full, ask({ starts_ms: [HOUR_MS] })));
    const rest = only(offersOf(full, ask({ starts_ms: [4 * HOUR_MS], legs })));
    const sigma = (whole.hours.p10 - whole.hours.p90) / 2.56;
    expect(rest.begins_s).toBe(rest.start_s);
    expect(rest.start_up_MWh_el).toEqual({ before_start: 0, after_start: 0 });
    for (const key of ['p90', 'p50', 'p10'] as const) {
      // One step more, cut at the edge: its error is of second order.
      expect(Math.abs(rest.hours[key] + 3 - whole.hours[key])).toBeLessThan(0.02 * sigma);
    }
    expect(rest.blocks[0]!.most_MWh_el).toBeCloseTo(0.06 / 4, 9);
  });

  it('has blocks alone and jointly the same without a plan, and not after one that may fail', () => {
    const short = contextOf({ hot: 0.5, cold: 0.5 });
    const alone = only(offersOf(short, ask()));
    for (const { whole } of alone.blocks) expect(whole.jointly).toBe(whole.alone);
    // To its median end: half of the points have stopped by then.
    const to_ms = Math.round(HOUR_MS * (1 + alone.hours.p50));
    const plan = [{ mode: 'discharge' as const, power_W: 60e3, from_ms: HOUR_MS, to_ms }];
    const recharge = {
      ...{ mode: 'charge' as const, power_W: 100e3 },
      ...{ from_ms: to_ms + HOUR_MS, to_ms: to_ms + 4 * HOUR_MS },
    };
    const starts_ms = [Math.ceil((to_ms + 5 * HOUR_MS) / HOUR_MS) * HOUR_MS];
    const after = only(offersOf(short, ask({ starts_ms, legs: [...plan, recharge] })));
    expect(after.plan_holds).toBeGreaterThan(0.05);
    expect(after.plan_holds).toBeLessThan(0.95);
    const first = after.blocks[1]!;
    expect(first.whole.alone).toBeGreaterThan(0.99);
    expect(first.whole.jointly).toBeCloseTo(after.plan_holds!, 1);
    const [at] = after.at;
    expect(at!.whole_blocks.jointly).toBeLessThanOrEqual(at!.whole_blocks.alone);
  });

  it('begins late, and says so, where the unit is not ready at the start', () => {
    const charging = [{ mode: 'charge' as const, power_W: 60e3, from_ms: NOW_MS, to_ms: HOUR_MS }];
    const offer = only(offersOf(full, ask({ legs: charging })));
    // Ramp down of 10 min, change-over of 5, start-up of 6.
    expect(offer.begins_s - offer.start_s).toBeCloseTo(600 + 300 + 360, 6);
    expect(offer.limited[0]).toMatchObject({ cause: 'change_over', from_s: offer.start_s });
    expect(offer.start_up_MWh_el.after_start).toBeGreaterThan(1.8e6 / 3.6e9);
    expect(offer.blocks[0]!.whole.alone).toBe(0);
    // What is drawn after the start stands beside the energy of its block.
    expect(offer.blocks[0]!.most_MWh_el).toBe(0);
    expect(offer.blocks[0]!.drawn_MWh_el).toBeGreaterThan(offer.start_up_MWh_el.after_start);
    expect(offer.plan_limited[0]).toMatchObject({ leg: 0, cause: 'start_up' });
  });

  it.each([
    ['discharge' as const, 5 * MOST, 'above_greatest_power', 4 * MOST],
    ['charge' as const, unit.limits.charge.power_min_W / 2, 'below_least_power', null],
  ])(
    'tells what the machine leaves undone of a leg: %s of %d W',
    (mode, power_W, cause, missing) => {
      const past = { mode: 'stand' as const, power_W: 0, from_ms: HOUR_MS, to_ms: 2 * HOUR_MS };
      const leg = { mode, power_W, from_ms: 2 * HOUR_MS, to_ms: 3 * HOUR_MS };
      const offer = only(offersOf(full, ask({ starts_ms: [6 * HOUR_MS], legs: [past, leg] })));
      const undone = offer.plan_limited.find((part) => part.cause === cause)!;
      expect(undone.leg).toBe(1);
      expect(undone.missing_MW_el * 1e6).toBeCloseTo(missing ?? power_W, 3);
      expect(offer.limited).toEqual([]);
      expect([offer.plan_holds, offer.plan_stores_hold]).toEqual([0, 1]);
    },
  );

  it('gives nothing negative, and with what is drawn the integral of net power', () => {
    const edges = fc.uniqueArray(fc.integer({ min: 1, max: 24 }), { minLength: 2, maxLength: 6 });
    const modes = fc.array(fc.constantFrom('charge' as const, 'discharge' as const), {
      ...{ minLength: 3, maxLength: 3 },
    });
    fc.assert(
      fc.property(
        edges,
        modes,
        fc.double({ min: LEAST, max: MOST, noNaN: true }),
        (at, kinds, W) => {
          const quarters = at.sort((a, b) => a - b);
          const plan = kinds.slice(0, quarters.length >> 1).map((mode, i) => ({
            ...{ mode, power_W: mode === 'charge' ? 80e3 : W },
            from_ms: (quarters[2 * i] as number) * 900_000,
            to_ms: (quarters[2 * i + 1] as number) * 900_000,
          }));
          const start_ms = plan[plan.length - 1]!.to_ms;
          const horizon_s = 2 * H;
          const question = ask({ powers_W: [W], starts_ms: [start_ms], legs: plan, horizon_s });
          const offer = only(offersOf(full, question));
          const now_ms = start_ms - offer.start_s * 1000;
          const legs = [...plan, { ...plan[0]!, mode: 'discharge' as const, power_W: W }].map(
            ({ mode, power_W, from_ms, to_ms }, i) => ({
              ...{ mode, power_W },
              from_s: i < plan.length ? (from_ms - now_ms) / 1000 : offer.start_s,
              to_s: i < plan.length ? (to_ms - now_ms) / 1000 : offer.start_s + horizon_s,
            }),
          );
          const end = offer.start_s + horizon_s + H;
          const { pieces } = commandOf(unit, legs, [], full.before, end);
          for (const block of offer.blocks) {
            for (const { energy_MWh_el } of block.at) {
              expect(energy_MWh_el).toBeGreaterThanOrEqual(0);
              expect(energy_MWh_el).toBeLessThanOrEqual(block.most_MWh_el + 1e-12);
            }
            expect(Math.min(block.drawn_MWh_el, block.ramp_down_MWh_el)).toBeGreaterThanOrEqual(0);
            // Until the ramp down at the end is over; from then on it stands, which is not offered.
            const closes = Math.min(block.to_s, offer.start_s + horizon_s + W / 100);
            const net = energyBetween(pieces, block.from_s, closes) / 3.6e9;
            const told = block.most_MWh_el - block.drawn_MWh_el + block.ramp_down_MWh_el;
            expect(told).toBeCloseTo(net, 9);
          }
        },
      ),
      { seed: SEED, numRuns: 8 },
    );
  });
});

describe('an offer that is limited', () => {
  it('is refused with the range above the greatest and below the least power', () => {
    const [low, high] = offersOf(full, ask({ powers_W: [10e3, 95e3] })) as [Offer, Offer];
    expect(low.refused).toBe(
      'below_least_power: the unit discharges at 0.015 to 0.090 MW_el, not at 0.010',
    );
    expect(high.refused).toMatch(/^above_greatest_power: /);
    expect([low, high].every((offer) => offer.hours.p10 === 0)).toBe(true);
  });

  it('is down when a planned outage begins, which is its cause', () => {
    const outages = [
      {
        ...{ from_ms: 2 * HOUR_MS, to_ms: 9 * HOUR_MS, discharge_max_W: 0, charge_max_W: 0 },
        reason: 'works',
      },
    ];
    const out = contextOf(
      { hot: 0.85, cold: 0.85 },
      { ...unit, limits: { ...unit.limits, outages } },
    );
    const offer = only(offersOf(out, ask()));
    expect(offer.ends_by).toEqual({ outage: 1 });
    // 60 kW at 100 W/s: the ramp down takes the last ten minutes of the hour before it.
    expect(offer.hours.p90).toBeCloseTo(1 - 600 / 3600, 9);
    expect(offer.at[0]!.whole_blocks.alone).toBe(3);
  });
});

describe('prices of being wrong', () => {
  it('give the certainty worth bidding, at which the expected cost is least', () => {
    const prices = { shortfall_per_MWh_el: 90, surplus_per_MWh_el: 30 };
    const certainties = [0.5, 0.65, 0.75, 0.85, 0.95];
    const offer = only(offersOf(full, ask({ prices, certainties })));
    expect(offer.bid?.certainty).toBeCloseTo(0.75, 12);
    // E[(D - q)+] = E[D] - q + E[(q - D)+]
    const cost = certainties.map((_, i) => {
      const { energy_MWh_el: q, expected_shortfall_MWh_el: short } = offer.at[i]!;
      return 90 * short + 30 * (offer.mean_MWh_el - q + short);
    });
    expect(cost.indexOf(Math.min(...cost))).toBe(2);
    expect(offer.bid?.energy_MWh_el).toBe(offer.at[2]!.energy_MWh_el);
    const blocks = offer.blocks.reduce((sum, block) => sum + (block.bid_MWh_el as number), 0);
    expect(blocks).toBeCloseTo(offer.bid!.energy_MWh_el, 9);
  });
});

describe('a question that asks twice', () => {
  it('is answered once', () => {
    const twice = {
      powers_W: [60e3, 60e3],
      starts_ms: [HOUR_MS, HOUR_MS],
      certainties: [0.9, 0.9],
    };
    const offer = only(offersOf(full, ask({ ...twice, horizon_s: 1800 })));
    expect(offer.at.map(({ certainty }) => certainty)).toEqual([0.9]);
  });

  it('takes long with many offers or a long plan, by what is different', () => {
    const legs = Array.from({ length: 9 }, () => ({ ...STAND, from_ms: 0, to_ms: 1 }));
    const many = Array.from({ length: 5 }, (_, i) => (i + 1) * HOUR_MS);
    const powers_W = [1e4, 2e4, 3e4, 4e4, 5e4];
    expect(takesLong(ask({ legs }))).toBe(true);
    expect(takesLong(ask({ powers_W, starts_ms: many }))).toBe(true);
    expect(takesLong(ask({ powers_W, starts_ms: [...many.slice(1), ...many.slice(1)] }))).toBe(
      false,
    );
  });
});

describe('a wrong question', () => {
  it.each([
    [{ powers_W: [-1] }, /powers_W\[0\] = -1: expected a finite number above 0/],
    [{ block_s: 600 as 900 }, /block_s = 600: expected one of 900, 1800, 3600/],
    [{ certainties: [0.4] }, /certainties\[0\] = 0.4: expected 0.5 to 0.99/],
    [{ starts_ms: [60_000] }, /starts_ms\[0\] = .*00:01:00Z.*: expected .*00:15:00Z or later/],
    [{ starts_ms: [HOUR_MS + 60_000] }, /expected the beginning of a block of 15 min, such as/],
    [{ starts_ms: [8 * 24 * HOUR_MS] }, /expected a start within 7 days/],
    [{ horizon_s: 1000 }, /horizon_s = 1000: expected a multiple of the block of 900 s/],
    [
      { prices: { shortfall_per_MWh_el: 0, surplus_per_MWh_el: 1 } },
      /prices.shortfall_per_MWh_el = 0: expected a finite number above 0/,
    ],
    [
      { legs: [{ mode: 'stand' as const, power_W: 0, from_ms: 5, to_ms: 5 }] },
      /legs\[0\].to_ms = .*: expected later than/,
    ],
    [
      { legs: [{ mode: 'stand' as const, power_W: 0, from_ms: NOW_MS - 1, to_ms: HOUR_MS }] },
      /legs\[0\].from_ms = "1970-01-01T00:02:59.999Z": expected .*00:03:00Z or later: that time is past/,
    ],
    [{ horizon_s: 201 * 900 }, /horizon_s = 180900: expected at most 180000 s: 200 blocks/],
    [
      {
        legs: Array.from({ length: 49 }, () => ({
          ...STAND,
          from_ms: HOUR_MS,
          to_ms: 2 * HOUR_MS,
        })),
      },
      /legs = 49: expected at most 48 legs/,
    ],
    [{ gate: { closes_before_s: 0, count: 2, every_s: 900 } }, /expected none beside a gate/],
  ])('%j is answered with field, value and what would be right', (over, said) => {
    expect(() => offersOf(full, ask(over))).toThrow(RangeError);
    expect(() => offersOf(full, ask(over))).toThrow(said);
  });

  it('a gate gives the first block after it closes, and so many on', () => {
    const { starts_ms: _, ...rest } = ask({ powers_W: [95e3] });
    const gate = { closes_before_s: 1800, count: 3, every_s: 3600 };
    // 00:03 and half an hour: 00:45.
    const starts = offersOf(full, { ...rest, gate }).map((offer) => offer.start_s + 180);
    expect(starts).toEqual([2700, 2700 + 3600, 2700 + 7200]);
  });
});
