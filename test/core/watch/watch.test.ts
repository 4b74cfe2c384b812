import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { StoreDefinition } from '../../../src/core/definitions.js';
import { SENSOR_VERDICTS, type StoreEstimate } from '../../../src/core/estimate.js';
import { EVENT_KINDS, type WatchEvent } from '../../../src/core/watch/event.js';
import type { IndicatorView } from '../../../src/core/watch/indicator.js';
import { KIND_CLASSES } from '../../../src/core/watch/kinds.js';
import { startServiceWatch, stepServiceWatch } from '../../../src/core/watch/service.js';
import { startWatch, stepWatch, type WatchInput } from '../../../src/core/watch/watch.js';
import { estimateOf, unitOf } from './units.js';

interface Scan extends Partial<WatchInput> {
  readonly hot?: Partial<StoreEstimate>;
  readonly cold?: Partial<StoreEstimate>;
}

/** Runs scans of 30 s; lists [second, event]. */
function run(
  scans: readonly Scan[],
  unit = unitOf(),
  state = startWatch(),
): [number, WatchEvent][] {
  const out: [number, WatchEvent][] = [];
  scans.forEach(({ hot, cold, ...change }, k) => {
    const time_ms = change.time_ms ?? 30_000 * k;
    const input = { mode: 'discharge' as const, readingsSeen: 10, ...change, time_ms };
    const estimate = estimateOf(time_ms, hot, cold);
    for (const event of stepWatch(unit, state, { ...input, estimate }))
      out.push([time_ms / 1000, event]);
  });
  return out;
}
const times = (n: number, scan: Scan) => Array.from({ length: n }, () => scan);
const short = (events: [number, WatchEvent][]) =>
  events.map(([at, e]) => `${at} ${e.id} ${e.transition}`);

describe('kinds of events', () => {
  it('makes an alarm only of what the operator must act on in time', () => {
    expect(Object.keys(KIND_CLASSES).sort()).toEqual([...EVENT_KINDS].sort());
    const alarms = EVENT_KINDS.filter((kind) => KIND_CLASSES[kind].class === 'alarm');
    const plant = ['outlet_near_limit', 'pressure_drop_near_limit', 'estimate_blind'];
    // Without room on the disk the readings pile up at the broker, which drops them in the end.
    expect([...alarms].sort()).toEqual([...plant, 'disk_full'].sort());
  });
});

const spread = (state: IndicatorView['state'], value: number | null): Scan => ({
  indicators: [
    {
      ...{ kind: 'spread_ratio', subject: 'hot', state, value, sigma: 0.1, unit: '-' },
      ...{ healthy: 1, healthy_from: 'twin', limit: 1.3, deadband: 0.1, score: 1 },
      ...{ on_delay_s: 60, off_delay_s: 60, reason: null, time: null },
      sentence: `Store hot: its front is ${value} times as wide.`,
    },
  ],
});

describe('an indicator that has decided', () => {
  it('is raised as its event once degraded for the delay, with its sentence', () => {
    const [first, ...rest] = run(times(5, spread('degraded', 1.6)));
    expect(rest).toEqual([]);
    expect(first![0]).toBe(60);
    expect(first![1]).toMatchObject({
      id: 'one/front_spread/hot',
      class: 'alert',
      subject: 'hot',
      transition: 'raised',
      time: '1970-01-01T00:01:00.000Z',
      value: 1.6,
      limit: 1.3,
    });
    expect(first![1].message).toBe('Store hot: its front is 1.6 times as wide.');
  });

  it('returns only where it is healthy again, not where it can no longer be told', () => {
    const scans = [
      ...times(4, spread('degraded', 1.6)),
      ...times(50, spread('undetermined', null)),
      ...times(50, {}),
      ...times(2, spread('degraded', 1.5)),
    ];
    expect(short(run(scans))).toEqual(['60 one/front_spread/hot raised']);
    const back = run([...scans, ...times(5, spread('normal', 1.15))]).at(-1)![1];
    expect(back).toMatchObject({ transition: 'returned', value: 1.15 });
    expect(back.message).toMatch(/As healthy again: Store hot: its front is 1\.15/);
  });
});

describe('a sensor that is rejected', () => {
  const rejected = (verdict: (typeof SENSOR_VERDICTS)[number]): Scan => ({
    hot: {
      sensors: {
        used: 2,
        rejected: [{ id: 'hot_a_2', verdict, since: '2026-01-01T00:00:00Z', evidence: '12 K low' }],
      },
    },
  });

  it('is raised and returned with its own delays, and remembers nothing afterwards', () => {
    const state = startWatch();
    const scans = [...times(5, rejected('stuck')), ...times(5, {})];
    const events = run(scans, unitOf(), state);
    expect(short(events)).toEqual([
      '60 one/sensor_rejected/hot_a_2 raised',
      '210 one/sensor_rejected/hot_a_2 returned',
    ]);
    expect(Object.keys(state.conditions)).toEqual([]);
  });

  it('is told with its verdict, the evidence and what to look at, for every verdict', () => {
    for (const verdict of SENSOR_VERDICTS) {
      const [, event] = run(times(4, rejected(verdict)))[0]!;
      expect(event.message).toContain(`(${verdict}: 12 K low)`);
      expect(event.message).toMatch(/Thermocouple hot_a_2 in store hot .*Look at [a-z].*\.$/);
      expect(event.message).not.toContain('undefined');
    }
  });

  it('is one event for the store where many are rejected at once, and one each for those that stay', () => {
    const unit = unitOf();
    const [hot, cold] = unit.stores as [StoreDefinition, StoreDefinition];
    const thermocouples = Array.from({ length: 20 }, (_, k) => ({
      id: `t${k}`,
      position_m: 0.05 * k,
      group: null,
    }));
    const wide = { ...hot, strings: [{ ...hot.strings[0]!, thermocouples }] };
    const without = (n: number): Scan => ({
      hot: {
        sensors: {
          used: 20 - n,
          rejected: thermocouples.slice(0, n).map(({ id }) => ({
            id,
            verdict: 'drifting' as const,
            since: '2026-01-01T00:00:00Z',
            evidence: '',
          })),
        },
      },
    });
    const scans = [...times(10, without(12)), ...times(10, without(2)), ...times(10, without(0))];
    const events = run(scans, { ...unit, stores: [wide, cold] });
    expect(short(events)).toEqual([
      '60 one/sensor_rejected/hot raised',
      '360 one/sensor_rejected/hot returned',
      '360 one/sensor_rejected/t0 raised',
      '360 one/sensor_rejected/t1 raised',
      '660 one/sensor_rejected/t0 returned',
      '660 one/sensor_rejected/t1 returned',
    ]);
    expect(events[0]![1]).toMatchObject({ value: 12, limit: 4 });
    expect(events[0]![1].message).toMatch(/12 of 20 thermocouples/);
  });

  it('is not raised by a verdict that comes and goes', () => {
    const flapping = Array.from({ length: 60 }, (_, k) => (k % 2 ? rejected('outlier') : {}));
    expect(run(flapping)).toEqual([]);
  });
});

describe('data that grow stale', () => {
  const silent: Scan = { readingsSeen: 0 };

  it('is raised by scans without a reading, once the age passes the limit, and returns with the first', () => {
    const events = run([{}, ...times(7, silent), {}, {}]);
    expect(short(events)).toEqual([
      '180 one/data_stale/one raised',
      '240 one/data_stale/one returned',
    ]);
    expect(events[0]![1]).toMatchObject({ value: 180, limit: 150 });
    expect(events[0]![1].message).toMatch(/no reading for 180 s \(limit 150 s\)/);
    expect(events[1]![1].value).toBe(0);
  });

  it('counts from the first scan where there never was a reading', () => {
    expect(short(run(times(8, silent)))).toEqual(['180 one/data_stale/one raised']);
  });

  it('does not call data stale that come again after a stop of the program', () => {
    expect(run([{ time_ms: 0 }, { time_ms: 3_600_000 }])).toEqual([]);
  });
});

describe('an outlet near its limit', () => {
  it('is an alarm while discharging, for a hot store that falls and a cold one that rises', () => {
    const events = run(times(5, { hot: { outlet_K: 680.15 }, cold: { outlet_K: 195.15 } }));
    expect(short(events)).toEqual([
      '60 one/outlet_near_limit/hot raised',
      '60 one/outlet_near_limit/cold raised',
    ]);
    expect(events[0]![1]).toMatchObject({ class: 'alarm', priority: 'high', limit: 15 });
    expect(events[0]![1].value).toBeCloseTo(7, 9);
    expect(events[0]![1].message).toMatch(/407\.0 degC, 7\.0 K above the limit of 400\.0 degC/);
    expect(events[1]![1].value).toBeCloseTo(8, 9);
    expect(events[1]![1].message).toMatch(/-78\.0 degC, 8\.0 K below the limit of -70\.0 degC/);
  });

  it('says so where the limit is passed already', () => {
    const [, event] = run(times(5, { hot: { outlet_K: 670.15 } }))[0]!;
    expect(event.message).toMatch(/3\.0 K past the limit/);
    expect(event.value).toBeCloseTo(-3, 9);
  });

  it('is none while charging or standing, and returns when the discharge ends', () => {
    const near = { hot: { outlet_K: 680.15 } };
    expect(run(times(20, { ...near, mode: 'charge' }))).toEqual([]);
    const ended = run([...times(4, near), ...times(5, { mode: 'stand' })]);
    expect(short(ended)).toEqual([
      '60 one/outlet_near_limit/hot raised',
      '180 one/outlet_near_limit/hot returned',
    ]);
  });

  it('waits in the deadband, and says nothing while the outlet is not known', () => {
    const scans = [
      ...times(4, { hot: { outlet_K: 680.15 } }),
      ...times(20, { hot: { outlet_K: 690.15 } }),
      ...times(20, { hot: { outlet_K: null } }),
    ];
    expect(run(scans)).toHaveLength(1);
    expect(run([...scans, ...times(4, { hot: { outlet_K: 694.15 } })])).toHaveLength(2);
  });

  it('is not watched where the store has no limit', () => {
    const unit = unitOf();
    const free = { ...unit, limits: { ...unit.limits, hot_outlet_min_K: null } };
    expect(run(times(9, { hot: { outlet_K: 300 } }), free)).toEqual([]);
  });
});

describe('watching as a whole', () => {
  const arbitrary = fc.record({
    mode: fc.constantFrom('charge' as const, 'discharge' as const, 'stand' as const),
    readingsSeen: fc.integer({ min: 0, max: 1 }),
    indicators: fc
      .tuple(
        fc.constantFrom('normal' as const, 'degraded' as const, 'undetermined' as const),
        fc.double({ min: 0.5, max: 3, noNaN: true }),
      )
      .map(([state, ratio]) => spread(state, ratio).indicators as IndicatorView[]),
    hot: fc.record({
      outlet_K: fc.option(fc.double({ min: 600, max: 800, noNaN: true })),
      sensors: fc.record({
        used: fc.constant(3),
        rejected: fc.subarray(
          ['hot_a_1', 'hot_a_2', 'hot_a_3'].map((id) => ({
            id,
            verdict: 'open' as const,
            since: '2026-01-01T00:00:00Z',
            evidence: '',
          })),
        ),
      }),
    }),
  });

  it('raises and returns in turn for every id, with finite numbers and whole sentences', () => {
    fc.assert(
      fc.property(fc.array(arbitrary, { maxLength: 120 }), (scans) => {
        const state = startWatch();
        const standing = new Set<string>();
        for (const [, event] of run(scans, unitOf(), state)) {
          expect(standing.has(event.id)).toBe(event.transition === 'returned');
          if (event.transition === 'raised') standing.add(event.id);
          else standing.delete(event.id);
          for (const number of [event.value, event.limit])
            expect(number === null || Number.isFinite(number)).toBe(true);
          expect(event.message).toMatch(/\.$/);
          expect(event.message).not.toMatch(/NaN|undefined|null/);
        }
        const raised = Object.values(state.conditions).filter((c) => c.raised);
        expect(raised).toHaveLength(standing.size);
        // At most one entry per sensor, store, view and unit.
        expect(Object.keys(state.conditions).length).toBeLessThanOrEqual(3 + 1 + 1 + 1);
      }),
      { seed: 5, numRuns: 200 },
    );
  });

  it('continues from a saved state as if nothing had been', () => {
    const scans = times(30, { ...spread('degraded', 1.7), readingsSeen: 0 });
    const whole = run(scans);
    const state = startWatch();
    const first = run(scans.slice(0, 2), unitOf(), state);
    const rest = run(
      scans.slice(2).map((scan, k) => ({ ...scan, time_ms: 30_000 * (k + 2) })),
      unitOf(),
      structuredClone(state),
    );
    expect([...first, ...rest]).toEqual(whole);
    expect(whole).toHaveLength(2);
  });
});

describe('a service that does not answer', () => {
  const rule = { on_delay_s: 60, off_delay_s: 30 };
  const attempt = (second: number, reachable: boolean, detail = '') => ({
    unit: 'one',
    service: 'InfluxDB',
    time_ms: 1000 * second,
    reachable,
    detail,
  });

  it('is told once after its delay, with how long and why, and once when it is back', () => {
    const state = startServiceWatch();
    const steps = [
      attempt(0, true),
      attempt(10, false, 'ECONNREFUSED'),
      attempt(40, false, 'ECONNREFUSED'),
      attempt(70, false, 'ECONNREFUSED'),
      attempt(100, false, 'ECONNREFUSED'),
      attempt(110, true),
      attempt(140, true),
      attempt(170, true),
    ].map((input) => stepServiceWatch(rule, state, input));
    const events = steps.filter((event) => event !== null);
    expect(steps.map((event) => event?.transition ?? null)).toEqual([
      ...[null, null, null, 'raised', null, null, 'returned', null],
    ]);
    expect(events[0]).toMatchObject({
      id: 'one/database_unreachable/InfluxDB',
      class: 'alert',
      value: 60,
      limit: 60,
    });
    expect(events[0]!.message).toMatch(/InfluxDB .* 60 s \(ECONNREFUSED\)\. Nothing is lost/);
  });

  it('forgets a failure that was over before the delay', () => {
    const state = startServiceWatch();
    for (let k = 0; k < 40; k++)
      expect(stepServiceWatch(rule, state, attempt(30 * k, k % 2 === 0))).toBeNull();
  });

  it('stands still while a clock that was set back catches up', () => {
    const state = startServiceWatch();
    stepServiceWatch(rule, state, attempt(1000, false));
    expect(stepServiceWatch(rule, state, attempt(400, false))).toBeNull();
    expect(stepServiceWatch(rule, state, attempt(1060, false))?.transition).toBe('raised');
  });
});
