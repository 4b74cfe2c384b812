import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../src/core/definitions.js';
import type { Scan } from '../../src/core/scan/scan.js';
import {
  advance,
  hoursAt,
  hoursDue,
  restoreUnit,
  saveUnit,
  startUnit,
  type UnitAsk,
  type UnitState,
  type UnitStep,
} from '../../src/core/unit.js';
import { mulberry } from '../support/random.js';
import { emptyScan } from '../support/unitScans.js';
import { frontedScan } from './track/fronted.js';
import { coldStore, hotStore, stringOf, unitOf } from './track/plants.js';

const unit = unitOf();
const ALL: UnitAsk = { hours_at_W: [60e3], profile: true };
const NONE: UnitAsk = { hours_at_W: [], profile: false };
const PROFILE: UnitAsk = { hours_at_W: [], profile: true };
const START_MS = Date.UTC(2025, 0, 1);
const PERIOD_MS = unit.scan_period_s * 1000;
const at = (n: number): number => START_MS + n * PERIOD_MS;

/** Charging, standing and discharging for ten scans each, with noise; some readings missing. */
function dayOf(scans: number, of: UnitDefinition = unit): Scan[] {
  const random = mulberry(23);
  let front = 0.4;
  return Array.from({ length: scans }, (_, n) => {
    const mode = [1, 0, -1][Math.floor(n / 10) % 3] as number;
    front += 0.003 * mode;
    const scan = frontedScan(
      of,
      at(n),
      { hot: front, cold: front },
      {
        flow: 0.9 * mode,
        mode,
        power: mode > 0 ? 90e3 : mode < 0 ? -50e3 : 300,
        ambient: 283,
        hot_top: 730,
        hot_bottom: 299,
        cold_bottom: 146,
        cold_top: 297,
      },
      () => random() - 0.5,
    );
    for (let i = 0; i < scan.values.length; i++) if (random() < 0.02) scan.values[i] = Number.NaN;
    return scan;
  });
}

const askAt = (scan: Scan): UnitAsk => ((scan.time_ms / PERIOD_MS) % 10 === 0 ? ALL : PROFILE);

/** Takes scans in, the profile with each and hours with every tenth. */
function runAll(state: UnitState, scans: readonly Scan[], of = unit): UnitStep[] {
  return scans.map((scan) => advance(of, state, scan, askAt(scan)));
}

/** Paths of numbers in a published value that are neither finite nor null. */
function notFinite(value: unknown, path = ''): string[] {
  if (typeof value === 'number') return Number.isFinite(value) ? [] : [`${path} = ${value}`];
  if (value === null || typeof value !== 'object') return [];
  return Object.entries(value).flatMap(([key, inner]) => notFinite(inner, `${path}/${key}`));
}

describe('a unit', () => {
  it('gives the same for the same scans, to the last bit', () => {
    const scans = dayOf(40);
    const [a, b] = [startUnit(unit), startUnit(unit)];
    expect(runAll(a, scans)).toEqual(runAll(b, scans));
    expect(a).toEqual(b);
  });

  it('does not mix up units that are advanced in turn', () => {
    const scans = dayOf(25);
    const other = unitOf({
      id: 'v',
      stores: [hotStore({ strings: [stringOf('h', 5, 4)] }), coldStore()],
    });
    const alone = runAll(startUnit(unit), scans);
    const [a, b] = [startUnit(unit), startUnit(other)];
    const inTurn = dayOf(25, other).map((scan, n) => {
      advance(other, b, scan, ALL);
      return advance(unit, a, scans[n] as Scan, askAt(scan));
    });
    expect(inTurn).toEqual(alone);
  });

  it('leaves the scans that it is given alone', () => {
    const scans = dayOf(12);
    const before = structuredClone(scans);
    runAll(startUnit(unit), scans);
    expect(scans).toEqual(before);
  });

  it('publishes numbers that are finite or null, from the first scan on', () => {
    const scans = [emptyScan(unit, at(-1)), ...dayOf(40)];
    for (const { estimate, profile } of runAll(startUnit(unit), scans)) {
      expect(notFinite({ estimate, profile })).toEqual([]);
    }
  });

  it('refuses a scan that is not later than the last, and leaves the state as it was', () => {
    const state = startUnit(unit);
    runAll(state, dayOf(3));
    const before = structuredClone(state);
    for (const time of [at(2), at(1)]) {
      expect(() => advance(unit, state, emptyScan(unit, time), NONE)).toThrow(
        new RangeError(`scan at ${time} ms: not later than the last, ${at(2)} ms`),
      );
    }
    expect(state).toEqual(before);
  });

  it('refuses a scan of another length', () => {
    const values = new Float64Array(3);
    expect(() =>
      advance(unit, startUnit(unit), { time_ms: 0, values, held: new Uint8Array(3) }, NONE),
    ).toThrow(new RangeError(`scan has 3 values, expected ${unit.channels.length}`));
  });

  it('gives hours and profile only where asked', () => {
    const state = startUnit(unit);
    const [first, second] = dayOf(2) as [Scan, Scan];
    const asked = advance(unit, state, first, { hours_at_W: [60e3, 30e3], profile: true });
    expect(asked.estimate.dispatch?.map((d) => d.power_MW)).toEqual([0.06, 0.03]);
    expect(Object.keys(asked.profile?.stores ?? {})).toEqual(['hot', 'cold']);
    const bare = advance(unit, state, second, NONE);
    expect(bare.estimate.dispatch).toBeUndefined();
    expect(bare.profile).toBeNull();
  });

  it('gives the same hours between scans as with the scan', () => {
    const state = startUnit(unit);
    const steps = runAll(state, dayOf(21));
    expect(hoursAt(unit, state, [60e3])).toEqual(steps.at(-1)?.estimate.dispatch);
  });
});

describe('hours due', () => {
  it('strike by source time, first with the first scan', () => {
    expect(hoursDue(unit, null, at(3))).toBe(true);
    const struck = Array.from({ length: 21 }, (_, n) => n + 1).filter((n) =>
      hoursDue(unit, at(n - 1), at(n)),
    );
    // Every 600 s at scans of 60 s.
    expect(struck).toEqual([10, 20]);
  });

  it('are not lost in a gap', () => {
    expect(hoursDue(unit, at(1), at(500))).toBe(true);
  });
});

describe('a saved unit', () => {
  it.each([1, 7, 22])('goes on to the last bit after %i scans', (cut) => {
    const scans = dayOf(31);
    const whole = startUnit(unit);
    const steps = runAll(whole, scans);
    const half = startUnit(unit);
    runAll(half, scans.slice(0, cut));
    const snapshot = saveUnit(half);
    // The unit that was saved runs on; what was saved must not follow it.
    runAll(half, scans.slice(cut));
    const restored = restoreUnit(unit, structuredClone(snapshot));
    expect(runAll(restored, scans.slice(cut))).toEqual(steps.slice(cut));
    expect(restored).toEqual(whole);
  });

  it('does not change with the unit that was restored from it', () => {
    const state = startUnit(unit);
    runAll(state, dayOf(5));
    const snapshot = saveUnit(state);
    const before = structuredClone(snapshot);
    runAll(restoreUnit(unit, snapshot), dayOf(20).slice(5));
    expect(snapshot).toEqual(before);
  });

  it.each([
    ['indicators of another shape', { heat_transfer: { of: 'older times' } }, 0],
    ['no indicators yet', undefined, undefined],
  ])('goes on from one with %s, with the beds as saved', (_, indicators, version) => {
    const scans = dayOf(12);
    const half = startUnit(unit);
    runAll(half, scans.slice(0, 6));
    const { version: own, state } = saveUnit(half);
    Object.assign(state.watch, { indicators, indicators_version: version });
    const steps = runAll(restoreUnit(unit, { version: own, state }), scans.slice(6));
    const sound = runAll(half, scans.slice(6));
    expect(steps.map(({ estimate }) => estimate)).toEqual(sound.map(({ estimate }) => estimate));
    expect(steps.at(-1)?.watch?.indicators.length).toBe(sound.at(-1)?.watch?.indicators.length);
  });

  it.each([
    ['another version', () => ({ version: 0, state: startUnit(unit) }), /version 0/],
    [
      'fewer stores',
      () => {
        const { version, state } = saveUnit(startUnit(unit));
        return { version, state: { ...state, stores: state.stores.slice(1) } };
      },
      /unit u: has 1 stores, expected 2/,
    ],
    [
      'more strings',
      () => saveUnit(startUnit(unitOf({ stores: [twoStrings(), coldStore()] }))),
      /store hot: has 2 strings, expected 1/,
    ],
    [
      'more cells',
      () => saveUnit(startUnit(unitOf({ estimator: { cells: 31 } }))),
      /string h: has 31 cells, expected 30/,
    ],
    [
      'cells and thermocouples that make a covariance of the same size',
      () =>
        saveUnit(
          startUnit(
            unitOf({
              stores: [hotStore({ strings: [stringOf('h', 7, 4)] }), coldStore()],
              estimator: { cells: 32 },
            }),
          ),
        ),
      /string h: has 32 cells, expected 30/,
    ],
    [
      'a group more',
      () =>
        saveUnit(
          startUnit(
            unitOf({
              stores: [
                hotStore({ strings: [stringOf('h', 8, 4, { groups: ['a'] })] }),
                coldStore(),
              ],
            }),
          ),
        ),
      /string h: has 2809 elements of covariance, expected 2704/,
    ],
  ])('is refused by a unit of another shape: %s', (_, snapshotOf, message) => {
    let thrown: unknown;
    try {
      restoreUnit(unit, snapshotOf());
    } catch (error) {
      thrown = error;
    }
    expect(thrown).toBeInstanceOf(RangeError);
    expect((thrown as RangeError).message).toMatch(message);
  });

  function twoStrings() {
    return hotStore({
      strings: [0, 1].map((k) => stringOf(`h${k}`, 8, 4, { area_share: 0.5, radius_m: k })),
    });
  }
});

describe('a gap', () => {
  it.each([1, 2, 30])('of %i scans is filled as if they had come empty, one by one', (missing) => {
    const scans = dayOf(20);
    const [skipped, ticked] = [startUnit(unit), startUnit(unit)];
    runAll(skipped, scans);
    runAll(ticked, scans);
    const after = frontedScan(
      unit,
      at(20 + missing),
      { hot: 0.5, cold: 0.5 },
      { flow: 0, mode: 0 },
    );
    const events = Array.from({ length: missing }, (_, k) =>
      advance(unit, ticked, emptyScan(unit, at(20 + k)), NONE),
    ).flatMap((step) => step.events);
    const one = advance(unit, skipped, after, ALL);
    const last = advance(unit, ticked, after, ALL);
    expect(one.estimate).toEqual(last.estimate);
    expect(one.profile).toEqual(last.profile);
    expect(one.events).toEqual([...events, ...last.events]);
    expect(skipped).toEqual(ticked);
  });

  it('of scans with times between the ticks adds no tick where none is missing', () => {
    const [jittered, plain] = [startUnit(unit), startUnit(unit)];
    const late = dayOf(10).map((scan, n) => ({ ...scan, time_ms: scan.time_ms + 7000 * (n % 3) }));
    runAll(jittered, late);
    runAll(plain, dayOf(10));
    // No scan was missing, so none was put in between: the sensors saw ten scans either way.
    expect(jittered.stores.map((s) => s.settled)).toEqual(plain.stores.map((s) => s.settled));
  });

  it('lets sigma grow while nothing is read, and says that it is blind, then stale', () => {
    const state = startUnit(unit);
    runAll(state, dayOf(12));
    const steps = Array.from({ length: 30 }, (_, k) =>
      advance(unit, state, emptyScan(unit, at(12 + k)), NONE),
    );
    const sigma = steps.map((s) => s.estimate.stores.hot?.soc_sigma as number);
    for (let k = 3; k < sigma.length; k++) {
      expect(sigma[k]).toBeGreaterThan(sigma[k - 1] as number);
    }
    const qualities = steps.map((s) => s.estimate.quality);
    // Stale beyond five minutes; the flow is held for two scans before that.
    expect(qualities.slice(2, 5)).toEqual(['blind', 'blind', 'blind']);
    expect(qualities.slice(5)).toEqual(new Array(25).fill('stale'));
  });

  it('of a year does not take minutes', () => {
    const state = startUnit(unit);
    runAll(state, dayOf(12));
    const started = performance.now();
    const year = frontedScan(
      unit,
      at(365 * 24 * 60),
      { hot: 0.5, cold: 0.5 },
      { flow: 0, mode: 0 },
    );
    const { estimate } = advance(unit, state, year, NONE);
    expect(notFinite(estimate)).toEqual([]);
    // 2000 coarse scans of two small stores: a second or two, ten on a loaded machine.
    expect(performance.now() - started).toBeLessThan(25_000);
  });
});

describe('readings that are none', () => {
  const odd = fc.constantFrom(
    Number.NaN,
    Number.POSITIVE_INFINITY,
    Number.NEGATIVE_INFINITY,
    1e300,
    -1e300,
    Number.MAX_VALUE,
    Number.MIN_VALUE,
    -0,
    -9999,
    -9725.85,
    1e6,
  );
  const spoiled = fc.array(fc.record({ channel: fc.nat(unit.channels.length - 1), value: odd }), {
    maxLength: 12,
  });

  it('never throw, never reach the state and never leave it, on whatever channels they come', () => {
    fc.assert(
      fc.property(fc.array(spoiled, { minLength: 1, maxLength: 8 }), (rows) => {
        const state = startUnit(unit);
        const scans = dayOf(rows.length + 14).map((scan, n) => {
          const values = Float64Array.from(scan.values);
          for (const { channel, value } of rows[n - 8] ?? []) values[channel] = value;
          return { ...scan, values };
        });
        for (const { estimate, profile } of runAll(state, scans)) {
          expect(notFinite({ estimate, profile })).toEqual([]);
          // Whatever comes, a store's charge stays within what thermocouples can show.
          expect(estimate.stores.hot?.soc).toBeLessThan(1.4);
          expect(estimate.stores.hot?.soc).toBeGreaterThan(-0.4);
        }
        for (const { tubes } of state.stores) {
          for (const tube of tubes) {
            expect(tube.covariance.every(Number.isFinite)).toBe(true);
            expect(tube.enthalpy.every(Number.isFinite)).toBe(true);
            expect(tube.further.every(Number.isFinite)).toBe(true);
          }
        }
      }),
      { numRuns: 15 },
    );
  });

  it.each([
    ['hot_top', 273.15 - 9999],
    ['hot_top', 1e9],
    ['hot_bottom', -1],
    ['ambient', -3],
    ['ambient', 5000],
    ['flow', 1e12],
    ['power', 1e15],
  ])('count as missing and are told by the quality: %s = %d', (id, value) => {
    const [spoilt, missing] = [startUnit(unit), startUnit(unit)];
    runAll(spoilt, dayOf(15));
    runAll(missing, dayOf(15));
    const scan = dayOf(16)[15] as Scan;
    const index = unit.channels.findIndex((c) => c.id === id);
    const given = (reading: number): Scan => {
      const values = Float64Array.from(scan.values);
      values[index] = reading;
      return { ...scan, values };
    };
    const a = advance(unit, spoilt, given(value), NONE);
    const b = advance(unit, missing, given(Number.NaN), NONE);
    expect(a.estimate.stores).toEqual(b.estimate.stores);
    expect(a.estimate.quality).toBe('degraded');
    expect(spoilt).toEqual(missing);
  });
});

describe('events', () => {
  it('come once when a condition begins and once when it ends', () => {
    const state = startUnit(unit);
    const open = unit.channels.findIndex((c) => c.id === 'h_3');
    const events = Array.from({ length: 60 }, (_, n) => {
      const scan = frontedScan(unit, at(n), { hot: 0.5, cold: 0.5 }, { flow: 0, mode: 0 });
      if (n >= 15 && n < 30) scan.values[open] = Number.NaN;
      return advance(unit, state, scan, NONE).events;
    }).flat();
    const rejected = events.filter((e) => e.kind === 'sensor_rejected');
    expect(rejected.map((e) => e.transition)).toEqual(['raised', 'returned']);
    // Delays of 5 and 15 min: raised from scan 20, returned from scan 45 on.
    expect(rejected.map((e) => (Date.parse(e.time) - START_MS) / PERIOD_MS)).toEqual([20, 45]);
  });

  it('of a gap come with the scan that ends it', () => {
    const state = startUnit(unit);
    runAll(state, dayOf(12));
    const back = frontedScan(unit, at(40), { hot: 0.4, cold: 0.4 }, { flow: 0, mode: 0 });
    const stale = advance(unit, state, back, NONE).events.filter((e) => e.kind === 'data_stale');
    expect(stale.map((e) => e.transition)).toEqual(['raised', 'returned']);
    expect(Date.parse(stale[0]?.time ?? '')).toBeLessThan(at(20));
    expect(Date.parse(stale[1]?.time ?? '')).toBe(at(40));
  });
});
