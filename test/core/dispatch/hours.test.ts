import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { centralHours, computeHours } from '../../../src/core/dispatch/hours.js';
import { createRoller } from '../../../src/core/dispatch/roller.js';
import { END_CAUSES } from '../../../src/core/estimate.js';
import { coldStore, hotStore, stringOf, unitOf } from '../track/plants.js';
import { inputOf, watchedUnit } from './fullUnit.js';
import { sampledHours } from './sampledPlants.js';

const unit = unitOf();
const LEAST = unit.limits.discharge.power_min_W;
const MOST = unit.limits.discharge.power_max_W;

const share = fc.double({ min: 0.15, max: 0.95, noNaN: true });
const power = fc.double({ min: LEAST, max: MOST, noNaN: true });

describe('hours at a power', () => {
  it('never grow with the power, between the least and the greatest', () => {
    fc.assert(
      fc.property(
        share,
        share,
        fc.double({ min: 0.04, max: 0.2, noNaN: true }),
        (hot, cold, width) => {
          const input = inputOf(unit, watchedUnit(unit, { hot, cold, width }, 1));
          let before = Number.POSITIVE_INFINITY;
          for (let n = 0; n <= 12; n++) {
            const { hours } = centralHours(input, LEAST + ((MOST - LEAST) * n) / 12);
            // A rule that breaks while the plenum is swept, at a power that sweeps it later, counts
            // as never begun; beyond that the order is strict.
            expect(hours).toBeLessThanOrEqual(before);
            before = hours;
          }
        },
      ),
      { numRuns: 25 },
    );
  });

  it('end where a rollout that follows all rules ends, and by the same', () => {
    fc.assert(
      fc.property(share, share, power, (hot, cold, power_W) => {
        const roller = createRoller(inputOf(unit, watchedUnit(unit, { hot, cold }, 1)), power_W);
        const { end_s, ends_by } = roller.best();
        expect(roller.end()).toMatchObject({ end_s, ends_by });
      }),
      { numRuns: 60 },
    );
  });

  it('are ordered p90 <= p50 <= p10, none negative, with energy = hours x power and a cause', () => {
    fc.assert(
      fc.property(share, share, power, (hot, cold, power_W) => {
        const answer = computeHours(inputOf(unit, watchedUnit(unit, { hot, cold }, 1)), power_W);
        const { p90, p50, p10 } = answer.hours;
        expect(p90).toBeGreaterThanOrEqual(0);
        expect(p90).toBeLessThanOrEqual(p50);
        expect(p50).toBeLessThanOrEqual(p10);
        expect(Number.isFinite(p10)).toBe(true);
        expect(answer.power_MW).toBe(power_W / 1e6);
        for (const key of ['p90', 'p50', 'p10'] as const) {
          expect(answer.energy_MWh_el[key]).toBeCloseTo((answer.hours[key] * power_W) / 1e6, 9);
        }
        expect(END_CAUSES).toContain(answer.ends_by);
      }),
      { numRuns: 25 },
    );
  });

  it('are worked out however little is known of the rock: none gets colder than can be', () => {
    fc.assert(
      fc.property(
        share,
        power,
        fc.double({ min: 1, max: 300, noNaN: true }),
        (at, power_W, times) => {
          const input = inputOf(unit, watchedUnit(unit, { hot: at, cold: at }, 1));
          for (const state of input.states)
            for (const { covariance } of state.tubes)
              covariance.forEach((value, i) => {
                covariance[i] = value * times ** 2;
              });
          const { p90, p50, p10 } = computeHours(input, power_W).hours;
          expect(p90).toBeGreaterThanOrEqual(0);
          expect(p90).toBeLessThanOrEqual(p50);
          expect(p50).toBeLessThanOrEqual(p10);
          expect(Number.isFinite(p10)).toBe(true);
        },
      ),
      { numRuns: 25 },
    );
  });

  it('are more with more charge in both stores', () => {
    let before = 0;
    for (const at of [0.35, 0.5, 0.65, 0.8, 0.95]) {
      const { hours } = centralHours(inputOf(unit, watchedUnit(unit, { hot: at, cold: at })), 60e3);
      expect(hours).toBeGreaterThan(before);
      before = hours;
    }
  });

  it('are none from empty stores, and tell which outlet forbids it', () => {
    const empty = computeHours(inputOf(unit, watchedUnit(unit, { hot: -0.5, cold: -0.5 })), 60e3);
    // Nothing is firm, and a plant whose rules wait for ten minutes runs so long at most.
    expect(empty.hours.p90).toBe(0);
    expect(empty.energy_MWh_el.p90).toBe(0);
    expect(empty.hours.p10).toBeLessThanOrEqual(1 / 6);
    // Both stores are empty: the machine would run backwards, and both outlets are beyond limits.
    expect(['hot_outlet', 'cold_outlet', 'flow', 'empty']).toContain(empty.ends_by);
  });

  it.each([
    ['hot', { hot: 0.5, cold: 1.3 }, 'hot_outlet'],
    ['cold', { hot: 1.3, cold: 0.5 }, 'cold_outlet'],
  ] as const)('end by the outlet of the store that holds less (%s)', (_, fronts, cause) => {
    const answer = computeHours(inputOf(unit, watchedUnit(unit, fronts)), 60e3);
    expect(answer.ends_by).toBe(cause);
    expect(answer.hours.p50).toBeGreaterThan(0.5);
  });

  it('end by the flow where the machine may not take as much as the power needs', () => {
    const weak = unitOf({
      limits: {
        ...unit.limits,
        discharge: { ...unit.limits.discharge, flow_max_kg_s: 0.5 },
      },
    });
    const input = inputOf(weak, watchedUnit(weak, { hot: 0.8, cold: 0.8 }));
    expect(computeHours(input, 60e3)).toMatchObject({
      ends_by: 'flow',
      hours: { p90: 0, p50: 0, p10: 0 },
    });
  });

  it('end by the pressure drop where the beds may not have as much', () => {
    const tight = unitOf({ limits: { ...unit.limits, pressure_drop_max_Pa: 1 } });
    const input = inputOf(tight, watchedUnit(tight, { hot: 0.8, cold: 0.8 }));
    expect(computeHours(input, 60e3)).toMatchObject({ ends_by: 'pressure_drop' });
  });

  it('are the same for the same state, to the last bit', () => {
    const state = watchedUnit(unit, { hot: 0.7, cold: 0.7 });
    const once = computeHours(inputOf(unit, state), 60e3);
    expect(computeHours(inputOf(unit, structuredClone(state)), 60e3)).toEqual(once);
  });

  it('leave the state alone', () => {
    const state = watchedUnit(unit, { hot: 0.7, cold: 0.7 });
    const before = structuredClone(state);
    computeHours(inputOf(unit, state), 60e3);
    expect(state).toEqual(before);
  });

  it.each([0, -1, Number.NaN])('are refused for a power of %d W', (power_W) => {
    const input = inputOf(unit, watchedUnit(unit, { hot: 0.7, cold: 0.7 }, 1));
    expect(() => computeHours(input, power_W)).toThrow(
      new RangeError(`power_W = ${power_W}: expected above 0`),
    );
  });
});

describe('the quantiles', () => {
  const strings = (id: string) =>
    [0.3, 0.7].map((area_share, k) =>
      stringOf(`${id}${k}`, 6, 4, { area_share, radius_m: 0.3 * k }),
    );
  // At rest nothing ties the strings' errors together, so they are drawn independently.
  const twoStrings = unitOf({
    stores: [hotStore({ strings: strings('h') }), coldStore({ strings: strings('c') })],
  });

  it.each([
    ['one store decides', unit, { hot: 0.8, cold: 0.55 }],
    ['both stores compete', unit, { hot: 0.66, cold: 0.72 }],
    ['two strings a store', twoStrings, { hot: 0.66, cold: 0.72 }],
  ])('are those of 400 plants drawn from the same covariance: %s', (_, of, fronts) => {
    const input = inputOf(of, watchedUnit(of, fronts, 30));
    const { hours } = computeHours(input, 60e3);
    const count = 400;
    const drawn = sampledHours(input, 60e3, count);
    const mean = drawn.reduce((a, b) => a + b, 0) / count;
    const sigma = Math.sqrt(drawn.reduce((a, b) => a + (b - mean) ** 2, 0) / (count - 1));
    // Standard errors of 400 draws from a normal: of the mean sigma/20; of the 10 % quantile
    // sqrt(0.1 0.9/400)/phi(1.2816) = 0.0855 sigma. Three of them, and 3 % of sigma for curvature
    // and for the quantile's fixed points.
    const meanError = 3 / Math.sqrt(count) + 0.03;
    const quantileError = (3 * Math.sqrt(0.09 / count)) / 0.1755 + 0.03;
    expect(Math.abs(hours.p50 - mean) / sigma).toBeLessThan(meanError);
    const at = (p: number): number => drawn[Math.floor(p * count)] as number;
    expect(Math.abs(hours.p90 - at(0.1)) / sigma).toBeLessThan(quantileError);
    expect(Math.abs(hours.p10 - at(0.9)) / sigma).toBeLessThan(quantileError);
  });
});
