import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { PIECE } from '../../../src/adapters/history/retention.js';
import type { StoreConfig } from '../../../src/config/site.js';
import type { AlarmCommand } from '../../../src/core/alarm/command.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { temporaryFolder } from '../../support/folders.js';
import { estimate, event, NOTHING, unit } from './unit.js';

const T = Date.UTC(2026, 0, 1);
const DAY = 86_400_000;

const STORE: StoreConfig = {
  folder: '',
  keep_readings_days: 10,
  keep_estimates_days: 100,
  thin_after_days: 5,
  thin_to_s: 600,
  checkpoint_every_s: 600,
};

function opened(folder = temporaryFolder('history'), store = STORE): History {
  const history = new History(join(folder, 'history.sqlite'), store);
  history.start();
  return history;
}

function fill(history: History, count: number, every_ms: number, from = T): void {
  history.write(() => {
    for (let i = 0; i < count; i++) {
      history.estimates.add(unit, estimate(from + i * every_ms, i / count), NOTHING);
    }
  });
}

describe('estimates', () => {
  it('come back as they were, and a time once written stays as it was', () => {
    const folder = temporaryFolder('history');
    const history = opened(folder);
    const answer = {
      power_MW: 1.8,
      hours: { p90: 1, p50: 2, p10: 3 },
      energy_MWh_el: { p90: 1.8, p50: 3.6, p10: 5.4 },
      ends_by: 'hot_outlet' as const,
    };
    const first = estimate(T, 0.5, { dispatch: [answer] });
    expect(history.estimates.add(unit, first, NOTHING)).toBe(true);
    expect(history.estimates.add(unit, estimate(T, 0.6), NOTHING)).toBe(false);
    expect(history.estimates.add(unit, estimate(T + 30_000, 0.7), NOTHING)).toBe(true);
    history.stop();
    const again = opened(folder);
    expect(again.estimates.between('u', T, T, 10)).toEqual([first]);
    expect(again.estimates.latest('u')?.state_of_charge).toBe(0.7);
    expect(again.estimates.latestDispatch('u')).toEqual({ time: first.time, answers: [answer] });
    expect(again.estimates.latest('other')).toBeNull();
    again.stop();
  });

  it('give series with their values, words for words and null for nothing', () => {
    const history = opened();
    const measured = { flow_kg_s: -12.5, power_MW_el: null };
    history.estimates.add(unit, estimate(T, 0.25, { mode: 'discharge' }), measured);
    const { points, bucket_ms } = history.estimates.series('u', T, T + 1000, 10);
    const [point, ...more] = points;
    expect([more, bucket_ms]).toEqual([[], null]);
    expect(point).toMatchObject({
      time: '2026-01-01T00:00:00.000Z',
      state_of_charge: 0.25,
      mode: 'discharge',
      quality: 'good',
      flow_kg_s: -12.5,
      power_MW_el: null,
      'hot.front_m': 3,
      'hot.width_m': null,
      'hot.outlet_degC': 300 - 273.15,
      'hot.axis.width_m': 0.4,
      'hours_p50_at_1.8_MW': null,
    });
    const { time: _, ...series } = point!;
    const names = history.estimates.names(unit).filter((name) => !/\.(min|max)$/.test(name));
    expect(Object.keys(series).sort()).toEqual(names.sort());
    history.stop();
  });

  it('are thinned to the mean of equal stretches, with their extremes', () => {
    const history = opened();
    const start = Math.ceil(T / 3_000_000) * 3_000_000;
    fill(history, 1000, 30_000, start);
    const end = start + 1000 * 30_000 - 1;
    const { points, bucket_ms } = history.estimates.series('u', start, end, 11);
    expect(bucket_ms).toBe(3_000_000);
    expect(points).toHaveLength(10);
    points.forEach((point, i) => {
      // Rows 100 i to 100 i + 99 of values k/1000: their mean is (100 i + 49.5)/1000.
      expect(point.state_of_charge).toBeCloseTo((100 * i + 49.5) / 1000, 12);
      expect(point['state_of_charge.min']).toBe(i / 10);
      expect(point['state_of_charge.max']).toBe((100 * i + 99) / 1000);
    });
    expect(history.estimates.series('u', start, start + 299_999, 10).points).toHaveLength(10);
    expect(history.estimates.series('u', T - DAY, T - 1, 10).points).toEqual([]);
    history.stop();
  });

  it('keep their series when strings are added to the configuration later', () => {
    const wider = structuredClone(unit) as unknown as { stores: { strings: object[] }[] };
    wider.stores[0]!.strings.unshift({ id: 'wall' });
    const changed = wider as unknown as UnitDefinition;
    const path = temporaryFolder('history');
    const before = opened(path);
    before.estimates.add(unit, estimate(T, 0.25), NOTHING);
    before.stop();
    const after = opened(path);
    after.estimates.add(changed, estimate(T + 30_000, 0.5), NOTHING);
    const { points } = after.estimates.series('u', T, T + 60_000, 10);
    expect(points.map((point) => point['hot.axis.width_m'])).toEqual([0.4, 0.4]);
    expect(points.map((point) => point['hot.wall.width_m'])).toEqual([undefined, null]);
    after.stop();
  });

  it('keep one profile per ten minutes, and the newest where asked, over restarts and replays', () => {
    const folder = temporaryFolder('history');
    const profile = (i: number) => ({
      time: new Date(T + i * 30_000).toISOString(),
      unit: 'u',
      stores: {},
    });
    const kept = ({ profiles }: History) =>
      profiles.spread('u', T, T + DAY, 100).rows.map(({ time }) => (Date.parse(time) - T) / 30_000);
    const history = opened(folder);
    for (let i = 9; i < 50; i++) history.profiles.add(profile(i));
    expect(kept(history)).toEqual([9, 20, 40]);
    history.profiles.add(profile(49), true);
    expect(kept(history)).toEqual([9, 20, 40, 49]);
    history.stop();
    const again = opened(folder);
    expect(again.profiles.latest('u')?.time).toBe(profile(49).time);
    for (let i = 15; i < 70; i++) again.profiles.add(profile(i));
    expect(kept(again)).toEqual([9, 20, 40, 49, 60]);
    again.stop();
  });
});

describe('profiles of a span', () => {
  const profile = (time_ms: number) => ({
    time: new Date(time_ms).toISOString(),
    unit: 'u',
    stores: {
      hot: {
        x_m: [0.04, 0.12],
        mean_K: [700.123456, 300],
        tubes: [{ id: 'axis', temperature_K: [700.1239, 300], sigma_K: [1.23456, 2] }],
        readings: [
          ...[{ id: 'T1', string: 'axis', position_m: 0.1, value_K: 650.98765, verdict: null }],
          ...[{ id: 'T2', string: 'axis', position_m: 0.2, value_K: null, verdict: null }],
        ],
      },
    },
  });

  it('come back to a thousandth of a kelvin with their readings, those of older versions too', () => {
    const folder = temporaryFolder('history');
    const history = opened(folder);
    history.profiles.add(profile(T));
    history.stop();
    const older = new SQLite(join(folder, 'history.sqlite'));
    const insert = older.prepare('INSERT INTO profiles (unit, time, json) VALUES (?, ?, ?)');
    insert.run('u', T + 600_000, JSON.stringify(profile(T + 600_000)));
    older.close();
    const again = opened(folder);
    const [first, second] = again.profiles.spread('u', T, T + DAY, 10).rows;
    expect(first!.stores.hot).toEqual({
      ...profile(T).stores.hot,
      mean_K: [700.123, 300],
      tubes: [{ id: 'axis', temperature_K: [700.124, 300], sigma_K: [1.235, 2] }],
      readings: [
        { ...profile(T).stores.hot.readings[0], value_K: 650.988 },
        profile(T).stores.hot.readings[1],
      ],
    });
    expect(second).toEqual(profile(T + 600_000));
    expect(again.profiles.atOrBefore('u', T + 599_999)?.time).toBe(first!.time);
    expect(again.profiles.atOrBefore('u', T - 1)).toBeNull();
    again.stop();
  });

  it('are the last of equal stretches where there are too many, and a gap stays one', () => {
    const history = opened();
    const kept = Array.from({ length: 144 }, (_, i) => T + i * 600_000).filter(
      (time_ms) => time_ms < T + DAY / 4 || time_ms >= T + DAY / 2,
    );
    for (const time_ms of kept) history.profiles.add(profile(time_ms));
    const { rows, thinned, every_ms } = history.profiles.spread('u', T, T + DAY - 1, 12);
    expect([thinned, every_ms]).toEqual([true, 7_200_000]);
    const hours = rows.map(({ time }) => (Date.parse(time) + 600_000 - T) / 3_600_000);
    expect(hours).toEqual([2, 4, 6, 14, 16, 18, 20, 22, 24]);
    history.stop();
  });
});

describe('the estimate nearest to a time', () => {
  it('comes with what was measured then, and from neither side too far away', () => {
    const history = opened();
    const measured = { flow_kg_s: -12.5, power_MW_el: null };
    history.estimates.add(unit, estimate(T, 0.5), measured);
    history.estimates.add(unit, estimate(T + 60_000, 0.6), NOTHING);
    const near = history.estimates.near('u', T + 29_000, 60_000);
    expect(near).toEqual({ estimate: estimate(T, 0.5), ...measured });
    const { estimate: next } = history.estimates.near('u', T + 31_000, 60_000)!;
    expect(next.state_of_charge).toBe(0.6);
    expect(history.estimates.near('u', T + 120_001, 60_000)).toBeNull();
    history.stop();
  });
});

describe('retention', () => {
  it('keeps the last estimate per stretch of old days and all of the young ones', () => {
    const history = opened();
    fill(history, 2 * 2880, 30_000);
    const now = T + 2 * DAY;
    for (let i = 0; i < 6; i++) history.retain(now + 5 * DAY, Number.POSITIVE_INFINITY);
    const left = history.estimates.between('u', T, now, 1e6).map((one) => Date.parse(one.time) - T);
    expect(left).toEqual(Array.from({ length: 288 }, (_, i) => (i + 1) * 600_000 - 30_000));
    history.stop();
  });

  it('thins in bounded pieces, unit by unit, until all is thinned', () => {
    const history = opened();
    const units = ['a', 'b', 'c'];
    history.write(() => {
      for (const id of units)
        for (let i = 0; i < 5000; i++) {
          const one = estimate(T + i * 10_000, i / 5000, { unit: id });
          history.estimates.add({ ...unit, id }, one, NOTHING);
        }
    });
    const now = T + DAY + 6 * DAY;
    const of = (id: string) => history.estimates.between(id, T, now, 1e6);
    const rows: number[] = [];
    for (let more = true; more && rows.length < 100; ) {
      const piece = history.thin(now, Number.POSITIVE_INFINITY);
      rows.push(piece.rows);
      more = piece.more;
    }
    // And what is left of one stretch.
    expect(Math.max(...rows)).toBeLessThanOrEqual(PIECE + 60);
    expect(rows.length).toBeGreaterThan(5);
    // 5000 times 10 s are 83 whole stretches of 10 min and a part of one.
    for (const id of units)
      expect(of(id).map(({ time }) => (Date.parse(time) - T) / 10_000)).toEqual([
        ...Array.from({ length: 83 }, (_, i) => 60 * (i + 1) - 1),
        4999,
      ]);
    expect(history.thin(now, Number.POSITIVE_INFINITY)).toEqual({ rows: 0, more: false });
    history.stop();
  });

  it('makes room early in pieces too, pictures first', () => {
    const history = opened();
    fill(history, 2 * PIECE, 10_000);
    const now = T + 30 * DAY;
    expect(history.forgetOldest(now, Number.POSITIVE_INFINITY)).toBe(PIECE);
    expect(history.forgetOldest(now, PIECE + 100)).toBe(100);
    expect(history.forgetOldest(now, PIECE + 100)).toBe(0);
    expect(history.estimates.between('u', T, now, 1e6)).toHaveLength(PIECE - 100);
    history.stop();
  });

  it('does not thin the young', () => {
    const history = opened();
    fill(history, 100, 30_000);
    history.retain(T + 5 * DAY, Number.POSITIVE_INFINITY);
    expect(history.estimates.between('u', T, T + DAY, 1e6)).toHaveLength(100);
    history.stop();
  });

  it('does not thin what is due to the database, but does not keep it for ever, and counts that', () => {
    const history = opened();
    fill(history, 100, 30_000);
    history.outbox.moveTo(50);
    history.retain(T + 50 * DAY, history.outbox.cursor);
    expect(history.estimates.between('u', T, T + DAY, 1e6)).toHaveLength(100);
    const counts = history.retain(T + 101 * DAY, history.outbox.cursor);
    expect(counts).toMatchObject({ estimates: 100, not_forwarded: 50 });
    history.stop();
  });

  it('does not use a number again after all was deleted and forwarded', () => {
    const folder = temporaryFolder('history');
    const history = opened(folder);
    fill(history, 10, 30_000);
    history.outbox.moveTo(10);
    history.retain(T + 200 * DAY, 10);
    history.stop();
    const again = opened(folder);
    fill(again, 1, 30_000, T + 200 * DAY);
    expect(again.outbox.read(10)).toMatchObject([{ seq: 11 }]);
    again.stop();
  });
});

const ACKNOWLEDGE: AlarmCommand = {
  ...{ id: 'u/front_spread/hot', who: 'mara', hours: null, why: '' },
  action: 'acknowledge',
};

describe('events', () => {
  it('stand until they have returned and were acknowledged, in either order', () => {
    const history = opened();
    const { events, alarms } = history;
    expect(events.add(event(T, 'raised'))).toBe(true);
    expect(alarms.entries()).toMatchObject([{ state: 'unacknowledged', acknowledged_by: null }]);
    expect(alarms.command(ACKNOWLEDGE, T + 1)).toBeNull();
    expect(alarms.entries()).toMatchObject([{ state: 'acknowledged', acknowledged_by: 'mara' }]);
    events.add(event(T + 2, 'returned'));
    expect(alarms.entries()).toEqual([]);
    events.add(event(T + 3, 'raised'));
    events.add(event(T + 4, 'returned'));
    expect(alarms.entries()).toMatchObject([{ state: 'returned_unacknowledged' }]);
    expect(alarms.entries('other')).toEqual([]);
    expect(alarms.command(ACKNOWLEDGE, T + 5)).toBeNull();
    expect(alarms.entries()).toEqual([]);
    expect(alarms.command(ACKNOWLEDGE, T + 6)).toBe('nothing of it is to be acknowledged');
    history.stop();
  });

  it('raised again after a return need a new acknowledgement', () => {
    const history = opened();
    const { events, alarms } = history;
    events.add(event(T, 'raised'));
    alarms.command(ACKNOWLEDGE, T);
    events.add(event(T + 1, 'returned'));
    events.add(event(T + 2, 'raised'));
    expect(alarms.entries()).toMatchObject([{ state: 'unacknowledged', acknowledged_by: null }]);
    history.stop();
  });

  it('known already, as in a replay after a restart, change nothing that stands', () => {
    const history = opened();
    const { events, alarms } = history;
    events.add(event(T, 'raised'));
    alarms.command(ACKNOWLEDGE, T);
    expect(events.add(event(T, 'raised'))).toBe(false);
    expect(alarms.entries()).toMatchObject([{ state: 'acknowledged' }]);
    expect(events.between(undefined, T, T, 10)).toHaveLength(1);
    history.stop();
  });

  it('are listed newest first, of one unit or all, no more than asked for', () => {
    const history = opened();
    for (let i = 0; i < 5; i++) history.events.add(event(T + i, i % 2 ? 'returned' : 'raised'));
    const times = history.events.between('u', T, T + 3, 2).map((one) => Date.parse(one.time) - T);
    expect(times).toEqual([3, 2]);
    expect(history.events.between('other', T, T + 9, 9)).toEqual([]);
    history.stop();
  });
});

describe('checkpoints', () => {
  it('come back newest first with all that they hold, and only the last three are kept', () => {
    const history = opened();
    for (let i = 1; i <= 5; i++) {
      const image = { state: new Float64Array([i, Number.NaN]), open: new Map([[i, 'x']]) };
      history.checkpoints.add(unit, { time_ms: T + i, journal_seq: i * 10, image });
    }
    const list = history.checkpoints.list(unit);
    expect(list.map((one) => one.journal_seq)).toEqual([50, 40, 30]);
    expect(list[0]!.load()).toEqual({
      state: new Float64Array([5, Number.NaN]),
      open: new Map([[5, 'x']]),
    });
    expect(history.checkpoints.coveredSeq(['u'])).toBe(30);
    expect(history.checkpoints.coveredSeq(['u', 'new'])).toBe(0);
    history.stop();
  });

  it('of another shape of the unit are told apart from its own', () => {
    const history = opened();
    history.checkpoints.add(unit, { time_ms: T, journal_seq: 1, image: 1 });
    const named = { ...unit, name: 'Another', hours_at_W: [2e6] };
    expect(history.checkpoints.list(named)).toHaveLength(1);
    expect(history.checkpoints.ofOtherShape(named)).toEqual([]);
    const changed = { ...unit, scan_period_s: 5 };
    expect(history.checkpoints.list(changed)).toEqual([]);
    expect(history.checkpoints.ofOtherShape(changed).map((one) => one.load())).toEqual([1]);
    expect(history.checkpoints.hasAny('u')).toBe(true);
    history.stop();
  });
});

describe('the outbox', () => {
  it('gives estimates, answers and events in the order in which they were made, from its cursor on', () => {
    const folder = temporaryFolder('history');
    const history = opened(folder);
    history.estimates.add(unit, estimate(T, 0.1), NOTHING);
    history.events.add(event(T, 'raised'));
    history.estimates.add(unit, estimate(T + 1, 0.2, { dispatch: [] }), NOTHING);
    const kinds = () => history.outbox.read(10).map((item) => `${item.seq} ${item.kind}`);
    expect(kinds()).toEqual(['1 estimate', '2 event', '3 estimate', '4 dispatch']);
    expect(history.outbox.read(2).map((item) => item.seq)).toEqual([1, 2]);
    history.outbox.moveTo(2);
    expect(kinds()).toEqual(['3 estimate', '4 dispatch']);
    expect(history.outbox.backlog).toBe(2);
    history.stop();
    const again = opened(folder);
    expect(again.outbox.cursor).toBe(2);
    again.stop();
  });
});
