import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { ceilTo, floorTo, LEVELS_MS, stretchFor } from '../../../src/adapters/history/buckets.js';
import { History } from '../../../src/adapters/history/history.js';
import type { StoreConfig } from '../../../src/config/site.js';
import { temporaryFolder } from '../../support/folders.js';
import { mulberry } from '../../support/random.js';
import { makeOlder } from './older.js';
import { estimate, unit } from './unit.js';

const T = Date.UTC(2026, 0, 1, 5, 3, 7);
const HOUR = 3_600_000;
const DAY = 86_400_000;

const STORE: StoreConfig = {
  folder: '',
  keep_readings_days: 10,
  keep_estimates_days: 100,
  thin_after_days: 5,
  thin_to_s: 1800,
  checkpoint_every_s: 600,
};

interface Row {
  readonly time_ms: number;
  readonly soc: number;
  readonly flow: number | null;
  readonly mode: 'charge' | 'discharge';
}

/** Rows at uneven times, with gaps of hours and now and then no flow. */
function drawnRows(days: number): Row[] {
  const random = mulberry(1);
  const rows: Row[] = [];
  let time_ms = T;
  while (time_ms < T + days * DAY) {
    const flow = random() < 0.2 ? null : 10 * random();
    const mode = random() < 0.5 ? 'charge' : 'discharge';
    rows.push({ time_ms, soc: random(), flow, mode });
    time_ms += random() < 0.003 ? 7 * HOUR : Math.round(1000 + 600_000 * random());
  }
  return rows;
}

/** As they arrive: some come later than those after them, a few by more than a day. */
function shuffled(rows: readonly Row[]): Row[] {
  const random = mulberry(2);
  const due = rows.map((row) => {
    const u = random();
    const late_ms = u < 0.01 ? 30 * HOUR * random() : u < 0.1 ? HOUR * random() : 0;
    return { row, due_ms: row.time_ms + late_ms };
  });
  return due.sort((a, b) => a.due_ms - b.due_ms).map(({ row }) => row);
}

function opened(folder: string): History {
  const history = new History(join(folder, 'history.sqlite'), STORE);
  history.start();
  return history;
}

function add(history: History, rows: readonly Row[]): void {
  history.write(() => {
    for (const { time_ms, soc, flow, mode } of rows) {
      const measured = { flow_kg_s: flow, power_MW_el: null };
      history.estimates.add(unit, estimate(time_ms, soc, { mode }), measured);
    }
  });
}

/** What thinning is to give, from all rows. */
function expected(rows: readonly Row[], from_ms: number, to_ms: number, bucket_ms: number) {
  const stretches = new Map<number, Row[]>();
  for (const row of rows) {
    if (row.time_ms < from_ms || row.time_ms > to_ms) continue;
    const place = Math.floor(row.time_ms / bucket_ms);
    const own = stretches.get(place);
    if (own) own.push(row);
    else stretches.set(place, [row]);
  }
  return [...stretches.values()].map((own) => {
    const socs = own.map(({ soc }) => soc);
    const flows = own.flatMap(({ flow }) => flow ?? []);
    return {
      time: new Date(own.at(-1)!.time_ms).toISOString(),
      mode: own.at(-1)!.mode,
      soc: socs.reduce((a, b) => a + b) / socs.length,
      extremes: [Math.min(...socs), Math.max(...socs)],
      flows: flows.length === 0 ? [null, null] : [Math.min(...flows), Math.max(...flows)],
    };
  });
}

/** A point with these series alone, and their extremes. */
function only(point: object, names: readonly string[]): object {
  const isTold = (key: string) => key === 'time' || names.includes(key.replace(/\.(min|max)$/, ''));
  return Object.fromEntries(Object.entries(point).filter(([key]) => isTold(key)));
}

/**
 * Holds the history against all rows over some spans, of some numbers of points.
 *
 * @param isWhole only spans of whole stretches of the finest level, made of those
 * @returns the levels that were read
 */
function hold(history: History, rows: readonly Row[], isWhole = false): number[] {
  const end = rows.at(-1)!.time_ms;
  const levels: number[] = [];
  for (const [from, to, points] of [
    [T, end, 5],
    [T + 3 * HOUR + 1, end - 5 * HOUR, 12],
    [T + DAY + 17, T + 3 * DAY + 4, 25],
    [T + 2 * DAY, T + 2 * DAY + 9 * HOUR, 30],
    [end - 2 * HOUR, end + DAY, 20],
    [T - 40 * DAY, end, 10],
  ] as const) {
    const from_ms = isWhole ? floorTo(from, LEVELS_MS[0]) : from;
    const to_ms = isWhole ? ceilTo(to, LEVELS_MS[0]) - 1 : to;
    const { points: found, bucket_ms } = history.estimates.series('u', from_ms, to_ms, points);
    const some = history.estimates.series('u', from_ms, to_ms, points, ['mode', 'flow_kg_s']);
    expect(some.points).toEqual(found.map((point) => only(point, ['mode', 'flow_kg_s'])));
    const { level } = stretchFor(from_ms, to_ms, points);
    if (bucket_ms === null || (isWhole && level < 0)) continue;
    levels.push(level);
    expect(found.length).toBeLessThanOrEqual(points);
    const wanted = expected(rows, from_ms, to_ms, bucket_ms);
    expect(found.map(({ time, mode }) => [time, mode])).toEqual(
      wanted.map(({ time, mode }) => [time, mode]),
    );
    found.forEach((point, i) => {
      const { soc, extremes, flows } = wanted[i]!;
      expect(point.state_of_charge).toBeCloseTo(soc, 10);
      expect([point['state_of_charge.min'], point['state_of_charge.max']]).toEqual(extremes);
      expect([point['flow_kg_s.min'], point['flow_kg_s.max']]).toEqual(flows);
      expect(point['power_MW_el.max']).toBeNull();
    });
  }
  return levels;
}

describe('roll-ups', () => {
  it('give what all rows give, late ones too, at every level', () => {
    const rows = drawnRows(6);
    const history = opened(temporaryFolder('rollups'));
    add(history, shuffled(rows));
    expect(new Set(hold(history, rows))).toEqual(new Set([-1, 0, 1, 2]));
    history.stop();
  });

  it('keep the extremes of rows that are thinned, and take in what comes after that', () => {
    const rows = drawnRows(6);
    const [late, known] = [
      rows.filter((_, i) => i % 50 === 7),
      rows.filter((_, i) => i % 50 !== 7),
    ];
    const history = opened(temporaryFolder('rollups'));
    add(history, known);
    const many = history.estimates.between('u', 0, T + 10 * DAY, 1e6).length;
    for (let i = 0; i < 9; i++) history.retain(T + 15 * DAY, Number.POSITIVE_INFINITY);
    expect(history.estimates.between('u', 0, T + 10 * DAY, 1e6).length).toBeLessThan(many / 2);
    // What is asked of less than a whole stretch is made of the rows that are left.
    expect(hold(history, known, true).length).toBeGreaterThan(3);
    add(history, late);
    hold(history, rows, true);
    history.stop();
  });

  it('of a history without them are made a day at a time, before it is thinned', () => {
    const rows = drawnRows(6);
    const folder = temporaryFolder('rollups');
    const before = opened(folder);
    add(before, rows);
    before.stop();
    const old = new SQLite(join(folder, 'history.sqlite'));
    makeOlder(old, 'rollup_10min');
    old.close();

    const history = opened(folder);
    hold(history, rows);
    const next = { ...rows.at(-1)!, time_ms: rows.at(-1)!.time_ms + 30_000 };
    add(history, [next]);
    const all = [...rows, next];
    const thinned = () => history.retain(T + 12 * DAY, Number.POSITIVE_INFINITY).estimates;
    expect(thinned()).toBe(0);
    let days = 0;
    while (history.rollUp()) {
      days++;
      hold(history, all);
    }
    expect(days).toBeGreaterThanOrEqual(5);
    expect(thinned()).toBeGreaterThan(0);
    // A reading from before all of them: its day is made the next time.
    const first = { ...rows[0]!, time_ms: T - 3 * DAY };
    add(history, [first]);
    expect([history.rollUp(), history.rollUp()]).toEqual([true, false]);
    history.stop();
  });

  it('are given up with the rows, once these are older than they are kept', () => {
    const rows = drawnRows(6);
    const folder = temporaryFolder('rollups');
    const history = opened(folder);
    add(history, rows);
    const end = rows.at(-1)!.time_ms;
    history.retain(T + 103 * DAY, Number.POSITIVE_INFINITY);
    expect(history.estimates.series('u', 0, T + 2 * DAY, 2).points).toEqual([]);
    expect(history.estimates.series('u', 0, end, 2).points.length).toBeGreaterThan(0);
    history.retain(end + 102 * DAY, Number.POSITIVE_INFINITY);
    history.stop();
    const database = new SQLite(join(folder, 'history.sqlite'), { readonly: true });
    for (const table of ['rollup_10min', 'rollup_2h', 'rollup_1d']) {
      expect(database.prepare(`SELECT count(*) FROM ${table}`).pluck().get(), table).toBe(0);
    }
    database.close();
  });
});
