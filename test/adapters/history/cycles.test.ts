import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { pointsOf } from '../../../src/adapters/history/influxPoints.js';
import type { StoreConfig } from '../../../src/config/site.js';
import type { WatchView } from '../../../src/core/watch/causes.js';
import { run, script } from '../../core/watch/cycleScript.js';
import { temporaryFolder } from '../../support/folders.js';
import { makeOlder } from './older.js';
import { estimate, NOTHING, unit } from './unit.js';

const DAY = 86_400_000;
const STORE = {
  ...{ keep_estimates_days: 100, keep_readings_days: 10, thin_after_days: 5, thin_to_s: 600 },
} as StoreConfig;

function opened(folder = temporaryFolder('cycles')): History {
  const history = new History(join(folder, 'history.sqlite'), STORE);
  history.start();
  return history;
}

const RUNS = run(
  script([
    { mode: 'stand', scans: 30 },
    { mode: 'charge', scans: 300 },
    { mode: 'stand', scans: 60 },
    { mode: 'discharge', scans: 150 },
    { mode: 'stand', scans: 30 },
  ]),
).records.map((record) => ({ ...record, unit: 'u' }));
const ALL = [0, 8.64e15] as const;

describe('cycles', () => {
  it('come back as they were, by span and kind, the newest of many', () => {
    const folder = temporaryFolder('cycles');
    const history = opened(folder);
    for (const record of RUNS) expect(history.cycles.add(record)).toBe(true);
    history.stop();
    const again = opened(folder);
    const { cycles } = again;
    expect(cycles.between('u', ...ALL, undefined, 10)).toEqual(RUNS);
    expect(cycles.between('u', ...ALL, 'stand', 10)).toEqual([RUNS[0], RUNS[2]]);
    expect(cycles.between('u', ...ALL, undefined, 2)).toEqual(RUNS.slice(2));
    expect(cycles.between('v', ...ALL, undefined, 10)).toEqual([]);
    const [from, to] = [Date.parse(RUNS[2]!.from) + 1, Date.parse(RUNS[2]!.to) - 1];
    expect(cycles.between('u', from, to, undefined, 10)).toEqual([RUNS[2]]);
    again.stop();
  });

  it('are entered once, also where a restart tells them again, whole or from amid them', () => {
    const history = opened();
    for (const record of RUNS) history.cycles.add(record);
    for (const record of RUNS) expect(history.cycles.add({ ...record, no: 99 })).toBe(false);
    const amid = new Date(Date.parse(RUNS[1]!.from) + 60_000).toISOString();
    expect(history.cycles.add({ ...RUNS[1]!, from: amid })).toBe(false);
    expect(history.cycles.add({ ...RUNS[1]!, unit: 'v', from: amid })).toBe(true);
    expect(history.cycles.between('u', ...ALL, undefined, 10)).toEqual(RUNS);
    history.stop();
  });

  it('share the numbers of estimates, wait in the outbox, and those numbers go on after a start', () => {
    const folder = temporaryFolder('cycles');
    const history = opened(folder);
    history.estimates.add(unit, estimate(Date.parse(RUNS[0]!.to), 0.5), NOTHING);
    for (const record of RUNS) history.cycles.add(record);
    expect(history.outbox.read(10).map(({ kind, seq }) => [kind, seq])).toEqual([
      ['estimate', 1],
      ...RUNS.map((_, i) => ['cycle', i + 2]),
    ]);
    expect(history.outbox.backlog).toBe(5);
    history.outbox.moveTo(3);
    expect(history.outbox.backlog).toBe(2);
    history.stop();
    const again = opened(folder);
    again.estimates.add(unit, estimate(Date.parse(RUNS[0]!.to) + 1, 0.5), NOTHING);
    expect(again.outbox.read(10).map(({ seq }) => seq)).toEqual([4, 5, 6]);
    again.stop();
  });

  it('become points at their end: one of the unit and one per store', () => {
    const time_ms = Date.parse(RUNS[1]!.to);
    const points = pointsOf({ kind: 'cycle', seq: 1, time_ms, content: RUNS[1]! });
    expect(points.map(({ tags }) => tags)).toEqual([
      { unit: 'u', run: 'charge' },
      { unit: 'u', run: 'charge', store: 'hot' },
      { unit: 'u', run: 'charge', store: 'cold' },
    ]);
    expect(points[0]).toMatchObject({
      measurement: 'rockhour_cycle',
      timestamp: new Date(time_ms),
      fields: { drawn_MWh_el: RUNS[1]!.drawn_MWh_el, raised: 0 },
    });
    const hot = points[1]!.fields!;
    expect(hot.width_50_m).toBe(RUNS[1]!.stores.hot!.widths[1]!.width_m);
    expect(hot.outlet_to_degC).toBeCloseTo(RUNS[1]!.stores.hot!.outlet_to_K! - 273.15, 3);
    for (const { fields } of points) {
      for (const value of Object.values(fields!)) {
        expect(['number', 'string']).toContain(typeof value);
        if (typeof value === 'number') expect(Number.isFinite(value)).toBe(true);
      }
    }
  });

  it('and views of the watch go with the rest once they are too old', () => {
    const history = opened();
    for (const record of RUNS) history.cycles.add(record);
    const end = Date.parse(RUNS[1]!.to);
    history.watch.add(view(end - 1, 'normal'));
    history.watch.add(view(end + DAY, 'normal'));
    const counts = history.retain(end + 100 * DAY + 1, Number.POSITIVE_INFINITY);
    expect(counts.cycles).toBe(2);
    expect(history.cycles.between('u', ...ALL, undefined, 10)).toEqual(RUNS.slice(2));
    expect(history.watch.between('u', ...ALL, 10)).toHaveLength(1);
    history.stop();
  });

  it('find room in a database of an older build', () => {
    const folder = temporaryFolder('cycles');
    opened(folder).stop();
    const old = new SQLite(join(folder, 'history.sqlite'));
    makeOlder(old, 'cycles');
    old.close();
    const history = opened(folder);
    expect(history.cycles.add(RUNS[0]!)).toBe(true);
    history.stop();
  });
});

const T = Date.UTC(2026, 0, 1);

function view(time_ms: number, state: 'normal' | 'degraded'): WatchView {
  const time = new Date(time_ms).toISOString();
  return {
    ...{ time, unit: 'u', causes: [] },
    indicators: [
      {
        ...{ kind: 'heat_transfer', subject: 'hot', value: 0.9, sigma: 0.05, unit: '-' },
        ...{ healthy: 1, healthy_from: 'learned', limit: 0.7, deadband: 0.1 },
        ...{ on_delay_s: 900, off_delay_s: 1800, score: 0, state, reason: null },
        ...{ time, sentence: 'Heat transfer is as it was.' },
      },
    ],
  };
}

describe('views of the watch', () => {
  it('are kept every ten minutes and where a state changes, also across a start', () => {
    const folder = temporaryFolder('watch');
    const history = opened(folder);
    for (let i = 0; i < 60; i++) history.watch.add(view(T + i * 30_000, 'normal'));
    history.watch.add(view(T + 60 * 30_000 + 1, 'degraded'));
    history.watch.add(view(T + 61 * 30_000, 'degraded'));
    const minutes = (of: History) =>
      of.watch.between('u', 0, 8.64e15, 100).map(({ time }) => (Date.parse(time) - T) / 60_000);
    expect(minutes(history)).toEqual([0, 10, 20, 30 + 1 / 60_000]);
    history.stop();
    const again = opened(folder);
    expect(again.watch.latest('u')?.indicators[0]?.state).toBe('degraded');
    // Nothing is held of what is due: the first is kept.
    again.watch.add(view(T + 62 * 30_000, 'degraded'));
    again.watch.add(view(T + 63 * 30_000, 'normal'));
    again.watch.add(view(T + 63 * 30_000, 'normal'));
    expect(minutes(again).slice(4)).toEqual([31, 31.5]);
    expect(again.watch.latest('v')).toBeNull();
    again.stop();
  });
});
