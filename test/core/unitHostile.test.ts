import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { advance, saveUnit, startUnit, type UnitAsk } from '../../src/core/unit.js';
import { lookAt, sound } from '../../tools/score/soundState.js';
import { mulberry } from '../support/random.js';
import { runs } from '../support/runs.js';
import { frontedScan } from './track/fronted.js';
import { coldStore, hotStore, stringOf, unitOf } from './track/plants.js';

/**
 * Whatever reaches `advance`, no NaN may enter a state, no covariance may lose its symmetry or become
 * negative, and nothing may be thrown but the RangeErrors that are documented.
 */
const strings = (id: string) => [
  stringOf(`${id}a`, 5, 4, { area_share: 0.3, groups: ['one', 'two'] }),
  stringOf(`${id}b`, 6, 4, { radius_m: 0.5, area_share: 0.7, groups: ['two', null] }),
];
const PLAIN = unitOf();
const UNITS = [
  PLAIN,
  unitOf({ stores: [hotStore({ strings: strings('h') }), coldStore({ strings: strings('c') })] }),
];
const START_MS = Date.UTC(2025, 0, 1);
const HOUR_MS = 3600e3;

const odd = fc.constantFrom(
  Number.NaN,
  Number.POSITIVE_INFINITY,
  Number.NEGATIVE_INFINITY,
  Number.MAX_VALUE,
  -Number.MAX_VALUE,
  Number.MIN_VALUE,
  -0,
  0,
  1e9,
  -9999,
);
/** A reading by its place among all channels: near its true value, far off, or no number at all. */
const spoiled = fc.record({
  place: fc.double({ min: 0, max: 1, noNaN: true, maxExcluded: true }),
  value: fc.oneof(
    { weight: 2, arbitrary: odd },
    { weight: 2, arbitrary: fc.double() },
    { weight: 3, arbitrary: fc.double({ min: 80, max: 900, noNaN: true }) },
  ),
});
const step = fc.record({
  wait_ms: fc.oneof(
    { weight: 10, arbitrary: fc.constant(60e3) },
    { weight: 5, arbitrary: fc.integer({ min: 1, max: 300e3 }) },
    { weight: 1, arbitrary: fc.integer({ min: 1, max: 2 * HOUR_MS }) },
    { weight: 1, arbitrary: fc.integer({ min: 20 * HOUR_MS, max: 1000 * HOUR_MS }) },
  ),
  /** Where the fronts are found; mostly where they were. */
  front: fc.option(fc.double({ min: -0.2, max: 1.2, noNaN: true }), { freq: 4 }),
  mode: fc.constantFrom(1, 0, -1, 0.4, 3, Number.NaN),
  flow: fc.oneof(fc.double({ min: -3, max: 3, noNaN: true }), odd),
  power: fc.oneof(fc.double({ min: -2e5, max: 2e5, noNaN: true }), odd),
  spoiled: fc.array(spoiled, { maxLength: 10 }),
  missing: fc.oneof(
    { weight: 6, arbitrary: fc.constant(0) },
    { weight: 1, arbitrary: fc.constant(1) },
    { weight: 2, arbitrary: fc.double({ min: 0, max: 1, noNaN: true }) },
  ),
  held: fc.boolean(),
  asked: fc.option(fc.oneof(fc.double({ min: 1, max: 5e5, noNaN: true })), { freq: 8 }),
});

type Step = typeof step extends fc.Arbitrary<infer T> ? T : never;

describe('hostile inputs', () => {
  it('leave every state finite, its covariances symmetric and non-negative', () => {
    const run = (u: number, seed: number, steps: readonly Step[]) => {
      const unit = UNITS[u]!;
      const random = mulberry(seed);
      const state = startUnit(unit);
      let time_ms = START_MS;
      let front = 0.4;
      for (const s of steps) {
        time_ms += s.wait_ms;
        front = s.front ?? front;
        const scan = frontedScan(
          unit,
          time_ms,
          { hot: front, cold: front },
          {
            mode: s.mode,
            flow: s.flow,
            power: s.power,
            ambient: 283,
            hot_top: 730,
            hot_bottom: 299,
            cold_bottom: 146,
            cold_top: 297,
          },
          () => random() - 0.5,
        );
        for (const { place, value } of s.spoiled) {
          scan.values[Math.floor(place * scan.values.length)] = value;
        }
        for (let i = 0; i < scan.values.length; i++) {
          if (random() < s.missing) scan.values[i] = Number.NaN;
          if (s.held && random() < 0.5) scan.held[i] = 1;
        }
        const ask: UnitAsk = { hours_at_W: s.asked === null ? [] : [s.asked], profile: false };
        advance(unit, state, scan, ask);
        const counts = sound();
        // The first look of a count factorises.
        lookAt(state, counts);
        expect(counts).toMatchObject({
          not_finite: 0,
          not_symmetric: 0,
          negative: 0,
          indefinite: 0,
        });
      }
    };
    fc.assert(
      fc.property(
        fc.nat(UNITS.length - 1),
        fc.nat(),
        fc.array(step, { minLength: 5, maxLength: 40 }),
        run,
      ),
      { numRuns: runs(12), seed: 3 },
    );
  });

  it('of a time that is not later are refused, and change nothing', () => {
    const state = startUnit(PLAIN);
    const scanAt = (time_ms: number) =>
      frontedScan(PLAIN, time_ms, { hot: 0.5, cold: 0.4 }, { mode: 1, flow: 1 });
    const none: UnitAsk = { hours_at_W: [], profile: false };
    for (let n = 1; n <= 3; n++) advance(PLAIN, state, scanAt(START_MS + n * 60e3), none);
    const before = saveUnit(state);
    fc.assert(
      fc.property(fc.oneof(fc.integer({ min: 0, max: 1e9 }), fc.constant(Number.NaN)), (early) => {
        const time_ms = START_MS + 3 * 60e3 - early;
        expect(() => advance(PLAIN, state, scanAt(time_ms), none)).toThrow(RangeError);
        expect(() =>
          advance(PLAIN, state, { ...scanAt(0), values: new Float64Array(2) }, none),
        ).toThrow(RangeError);
      }),
      { numRuns: 20 },
    );
    expect(saveUnit(state)).toEqual(before);
  });
});
