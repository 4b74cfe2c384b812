import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import type { JournalReading } from '../../../src/adapters/history/journal.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import type { Core } from '../../../src/daemon/core.js';
import { waitFor } from '../../support/wait.js';
import { fakeCore } from '../fakeCore.js';
import { PERIOD_MS, smallUnit } from '../site.js';
import { Rig, reading, rigsOfTests } from './rig.js';

const START = Date.UTC(2026, 0, 5, 6);
const HOUR = 3_600_000;
const { rigs, started } = rigsOfTests();

const timeOf = (scan: number, ms = 200) => START + scan * PERIOD_MS + ms;

/** Scans `from` to before `to`, with a, b and c each. */
function scans(from: number, to: number, unit = 'u'): JournalReading[] {
  return Array.from({ length: to - from }, (_, k) => {
    const i = from + k;
    return ['a', 'b', 'c'].map((id, c) =>
      reading(id, timeOf(i, 100 + c), 300 + i + c, timeOf(i, 100 + c), unit),
    );
  }).flat();
}

/** As they come hours later; whole hours might be another time zone. */
function late(readings: readonly JournalReading[], hours = 2.3): JournalReading[] {
  const newest = Math.max(...readings.map(({ time_ms }) => time_ms));
  return readings.map((one) => ({ ...one, arrival_ms: newest + hours * HOUR }));
}

const without = (all: JournalReading[], channel: string, scan: number) =>
  all.filter((one) => !(one.channel === channel && one.time_ms === timeOf(scan, 101)));
const bOf = (scan: number) => scans(scan, scan + 1).filter(({ channel }) => channel === 'b');
const revisions = (rig: Rig) => rig.estimates().map(({ revision }) => revision);

describe('a rewind', () => {
  it('gives estimates since the late reading the next revision, and leaves what was told of hours', async () => {
    const rig = await started();
    await rig.take(without(without(scans(0, 60), 'b', 20), 'b', 30));
    const told = rig.estimates().filter(({ dispatch }) => dispatch);
    expect(told.length).toBeGreaterThan(2);
    await rig.take(late(bOf(30)));
    await rig.settle();
    const first = revisions(rig);
    expect(first.slice(0, 30)).toEqual(Array(30).fill(0));
    expect(first.slice(30)).toEqual(Array(30).fill(1));
    await rig.take(late(bOf(20)));
    await rig.settle();
    expect(revisions(rig)).toEqual([
      ...Array(20).fill(0),
      ...Array(10).fill(1),
      ...Array(30).fill(2),
    ]);
    expect(rig.estimates().filter(({ dispatch }) => dispatch)).toEqual(
      told.map(({ time, dispatch }) => expect.objectContaining({ time, dispatch })),
    );
    // What is said next is of the new state, and what comes after it is as new as ever.
    expect(rig.stepped.at(-1)).toMatchObject({ time: rig.estimates()[59]!.time, revision: 2 });
    expect(rig.runner.view.estimate).toEqual(rig.estimates()[59]);
    await rig.take(scans(60, 61));
    expect(revisions(rig).at(-1)).toBe(0);
    const state = rig.runner.snapshot();
    rig.stop();
    const inTime = await started();
    await inTime.take(scans(0, 61));
    expect(state).toEqual(inTime.runner.snapshot());
    expect(rig.counters.all()).toMatchObject({ rewinds: 2, late_used: 2, estimates_revised: 70 });
    expect(rig.rewinder.words('u')).toMatch(
      /^last rewind 2026-\S+: 1 late readings, \d+ scans made again, revision 2$/,
    );
  });

  it('fills a gap of all channels without a second estimate of a scan, and takes nothing back', async () => {
    const rig = await started();
    await rig.take(scans(0, 10));
    for (let i = 10; i < 40; i++) await rig.pass(PERIOD_MS);
    await rig.take(scans(40, 50));
    const before = rig.history.events.between('u', 0, 8e15, 100);
    expect(before.map(({ transition }) => transition)).toEqual(['returned', 'raised']);
    const told = rig.told.length;
    await rig.take(late(scans(10, 40)));
    await rig.settle();
    expect(rig.estimates().map(({ time }) => Date.parse(time))).toEqual(
      Array.from({ length: 50 }, (_, i) => timeOf(i, 102)),
    );
    expect(rig.history.events.between('u', 0, 8e15, 100)).toEqual(before);
    expect(rig.told).toHaveLength(told);
    const [record] = rig.history.rewinds.between('u', 0, 8e15, 10);
    expect(record).toMatchObject({
      unit: 'u',
      late_used: 90,
      revision: 1,
      differences_left_out: 0,
    });
    expect(record!.differences).toMatchObject([
      { id: 'u/data_stale/unit', transition: 'raised', told: true },
      { id: 'u/data_stale/unit', transition: 'returned', told: true },
    ]);
  });

  it('raises now what holds by late readings alone, and returns what does not hold by them', async () => {
    const rig = await started({ core: latching });
    await rig.take(without(scans(0, 20), 'b', 5));
    await rig.take([reading('b', timeOf(5, 101), 2000, timeOf(30))]);
    await rig.settle();
    expect(rig.told).toMatchObject([
      {
        ...{ id: 'u/front_spread/b', transition: 'raised', time: rig.estimates()[19]!.time },
        message: expect.stringMatching(
          /^above\. Seen only by readings that came late; holds since /,
        ),
      },
    ]);
    expect(rig.history.alarms.active('u')).toHaveLength(1);
    await rig.take(without(scans(20, 40), 'b', 25));
    await rig.take([reading('b', timeOf(25, 101), -2000, timeOf(50))]);
    await rig.settle();
    expect(rig.told.slice(1)).toMatchObject([
      { transition: 'returned', time: rig.estimates()[39]!.time },
    ]);
    expect(rig.history.alarms.active('u')).toEqual([]);
    expect(rig.runner.standing).toEqual([]);
  });

  it('begun and killed, is begun again after the start and comes to the same, once', async () => {
    const slow: Core = {
      ...fakeCore,
      advance(...args) {
        for (const end = performance.now() + 1; performance.now() < end; );
        return fakeCore.advance(...args);
      },
    };
    const rig = await started({ core: slow });
    await rig.take(without(scans(0, 100), 'b', 5));
    await rig.take(late(bOf(5)));
    rig.steady_ms += 31_000;
    rig.rewinder.poll();
    await waitFor('the first scans', () => revisions(rig).includes(1), 10_000, 1);
    expect(rig.rewinder.busyWith).toBe('u');
    rigs.pop()!.stop(true);
    const left = revisions(new Reopened(rig.folder));
    expect(left.includes(0) && left.slice(5).includes(0)).toBe(true);

    const again = await started({ folder: rig.folder });
    expect(again.rewinder.isAwaited('u')).toBe(true);
    await again.settle();
    expect(revisions(again)).toEqual([...Array(5).fill(0), ...Array(95).fill(1)]);
    const inTime = await started();
    await inTime.take(scans(0, 100));
    expect(again.runner.snapshot()).toEqual(inTime.runner.snapshot());
    expect(again.history.rewinds.between('u', 0, 8e15, 10)).toHaveLength(1);
    // A restart afterwards finds nothing to be done, and a state with the late reading in it.
    rigs.splice(rigs.indexOf(again), 1)[0]!.stop(true);
    const third = await started({ folder: rig.folder });
    expect(third.rewinder.isAwaited('u')).toBe(false);
    expect(third.runner.snapshot()).toEqual(inTime.runner.snapshot());
  });

  it('leaves the live scans of this and of other units on time', async () => {
    const units = [smallUnit(), smallUnit('v')];
    const rig = await started({ units });
    await rig.take(without(scans(0, 400), 'b', 1));
    await rig.take(scans(0, 2, 'v'));
    await rig.take(late(bOf(1)));
    rig.steady_ms += 31_000;
    rig.rewinder.poll();
    for (let i = 0; rig.rewinder.busyWith !== null; i++) {
      await rig.take([...scans(400 + i, 401 + i), ...scans(2 + i, 3 + i, 'v')]);
      expect(rig.estimates('v')).toHaveLength(3 + i);
      expect(rig.estimates()).toHaveLength(401 + i);
    }
    expect(rig.counters.get('rewinds')).toBe(1);
    const inTime = await started({ units });
    await inTime.take(scans(0, rig.estimates().length));
    expect(rig.runner.snapshot()).toEqual(inTime.runner.snapshot());
  });
});

describe('late readings that change nothing', () => {
  it('as of a plant that sends yesterday once more, are left out and counted, without a rewind', async () => {
    const rig = await started();
    await rig.take(scans(0, 50));
    const before = rig.estimates();
    await rig.take(late(scans(5, 40), 24));
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ rewinds: 0, late_repeated: 105, late_used: 0 });
    expect(rig.estimates()).toEqual(before);
    expect(rig.lines.join()).toContain('105 late readings left out: their scans have values');
  });

  it('because they are too old are counted and told as such', async () => {
    const rig = await started({ late: { rewind_h: 0.1 } });
    await rig.take(without(scans(0, 60), 'b', 5));
    await rig.take(late(bOf(5)));
    // From before the unit's first scan.
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ too_late: 1, late_used: 0, rewinds: 0 });
    expect(rig.lines.join()).toContain('is older than the 0.1 h of late.rewind_h: not used');
    const young = await started();
    await young.take(scans(10, 60));
    await young.take([...late(scans(5, 6)), ...late(bOf(20))]);
    await young.settle();
    expect(young.counters.all()).toMatchObject({ too_late: 3, late_repeated: 1, rewinds: 0 });
    expect(young.lines.join()).toContain('no state is kept from before them');
  });

  it('because the core fails on them are given up after three tries, and the live unit goes on', async () => {
    const failing: Core = {
      ...fakeCore,
      advance(unit, state, scan, ask) {
        if (scan.values[1] === -7) throw new Error('a covariance has lost its sign');
        return fakeCore.advance(unit, state, scan, ask);
      },
    };
    const rig = await started({ core: failing });
    await rig.take(without(scans(0, 30), 'b', 5));
    await rig.take([reading('b', timeOf(5, 101), -7, timeOf(40))]);
    const before = rig.estimates();
    for (let i = 0; i < 3; i++) {
      await waitFor('a try', () => {
        rig.steady_ms += 31_000;
        rig.rewinder.poll();
        return rig.counters.get('rewind_failures') > i;
      });
    }
    expect(rig.counters.all()).toMatchObject({ rewind_failures: 3, late_lost: 1, rewinds: 0 });
    expect(rig.rewinder.isAwaited('u')).toBe(false);
    await rig.take(scans(30, 31));
    expect(rig.estimates().length).toBe(before.length + 1);
  });
});

describe('a disk that is full when something is given up', () => {
  /** As SQLite says it of a write under a name. */
  function refuse(rig: Rig, when: string): () => void {
    const database = new SQLite(`${rig.folder}/history.sqlite`);
    database.exec(`CREATE TRIGGER full_disk BEFORE ${when}
      BEGIN SELECT RAISE(ABORT, 'database or disk is full'); END`);
    return () => {
      database.exec('DROP TRIGGER full_disk');
      database.close();
    };
  }
  const failing: Core = {
    ...fakeCore,
    advance(unit, state, scan, ask) {
      if (scan.values[1] === -7) throw new Error('a covariance has lost its sign');
      return fakeCore.advance(unit, state, scan, ask);
    },
  };
  const tried = (rig: Rig, times: number) =>
    waitFor('a try', () => {
      rig.steady_ms += 31_000;
      rig.rewinder.poll();
      return rig.counters.get('rewind_failures') >= times;
    });

  it('leaves late readings waiting, and they are given up once there is room', async () => {
    const rig = await started({ core: failing });
    await rig.take(without(scans(0, 30), 'b', 5));
    await rig.take([reading('b', timeOf(5, 101), -7, timeOf(40))]);
    const mend = refuse(rig, "INSERT ON cursors WHEN NEW.name = 'late readings of u'");
    await tried(rig, 4);
    expect(rig.counters.all()).toMatchObject({ late_lost: 0, history_failures: 2 });
    expect(rig.rewinder.isAwaited('u')).toBe(true);
    mend();
    await tried(rig, 5);
    expect(rig.counters.get('late_lost')).toBe(1);
    expect(rig.rewinder.isAwaited('u')).toBe(false);
  });

  it('leaves lost estimates waiting, and they are given up once there is room', async () => {
    let isBroken = false;
    const rig = await started({
      core: {
        ...fakeCore,
        advance(unit, state, scan, ask) {
          if (isBroken) throw new Error('a covariance has lost its sign');
          return fakeCore.advance(unit, state, scan, ask);
        },
      },
    });
    await rig.take(scans(0, 30));
    rig.history.keep('estimates of u lost before', timeOf(20));
    rig.rewinder.historyLost();
    const mend = refuse(rig, "DELETE ON cursors WHEN OLD.name = 'estimates of u lost before'");
    isBroken = true;
    await tried(rig, 4);
    expect(rig.counters.get('history_failures')).toBe(2);
    expect(rig.history.lostBefore('u')).not.toBeNull();
    mend();
    await tried(rig, 5);
    expect(rig.history.lostBefore('u')).toBeNull();
    expect(rig.rewinder.words('u')).toBe('');
  });
});

describe('states to go back to', () => {
  it('are kept each 15 min for as long as late readings are taken in, and a damaged one is passed over', async () => {
    const rig = await started({ late: { rewind_h: 2 } });
    await rig.take(without(scans(0, 400), 'b', 330));
    rig.rewinder.forgetOld();
    const file = `${rig.folder}/history.sqlite`;
    const database = new SQLite(file);
    const times = database.prepare('SELECT time FROM rewind_points ORDER BY time').pluck().all();
    // 3 h 20 min in all: the two hours, and one state from before them.
    expect(times).toEqual(Array.from({ length: 9 }, (_, i) => timeOf(30 * (i + 5), 102)));
    database.prepare("UPDATE rewind_points SET image = x'00' WHERE time = ?").run(timeOf(330, 102));
    database.prepare("UPDATE rewind_points SET image = x'00' WHERE time = ?").run(timeOf(300, 102));
    database.close();
    await rig.take(late(bOf(330), 0.1));
    await rig.settle();
    expect(rig.history.rewinds.latest('u')!.scans).toBe(400 - 271);
    expect(revisions(rig).slice(329, 332)).toEqual([0, 1, 1]);
  });
});

/** Raises where b is above 1000 and returns where it is below -1000; between it stays. */
const latching: Core = {
  ...fakeCore,
  advance(unit, state, scan, ask) {
    const step = fakeCore.advance(unit, state, scan, ask);
    const own = state as unknown as { raised?: boolean };
    const b = scan.values[1]!;
    const was = own.raised ?? false;
    own.raised = b > 1000 ? true : b < -1000 ? false : was;
    if (own.raised === was) return step;
    const event: WatchEvent = {
      ...{ id: `${unit.id}/front_spread/b`, unit: unit.id, kind: 'front_spread', class: 'alert' },
      ...{ priority: 'low', subject: 'b', transition: own.raised ? 'raised' : 'returned' },
      ...{ time: step.estimate.time, value: b, limit: 1000, message: own.raised ? 'above.' : 'ok' },
    };
    return { ...step, events: [...step.events, event] };
  },
};

/** What a killed daemon has left. */
class Reopened extends Rig {
  constructor(folder: string) {
    super({ folder });
    this.history.start();
  }
  override estimates() {
    const found = super.estimates();
    this.history.stop();
    return found;
  }
}
