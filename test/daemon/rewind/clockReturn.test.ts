import { join } from 'node:path';
import Database from 'better-sqlite3';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { storeFailure } from '../../../src/adapters/history/database.js';
import { History } from '../../../src/adapters/history/history.js';
import type { JournalReading } from '../../../src/adapters/history/journal.js';
import { unpackImage } from '../../../src/adapters/history/thinImage.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import type { Core } from '../../../src/daemon/core.js';
import { unitHealth } from '../../../src/daemon/health.js';
import { fakeCore } from '../fakeCore.js';
import { PERIOD_MS } from '../site.js';
import { type Rig, reading, rigsOfTests } from './rig.js';

const START = Date.UTC(2026, 0, 5, 6);
const HOUR = 3_600_000;
const DAY = 24 * HOUR;
const TEN_YEARS = 3650 * DAY;
const { rigs, started } = rigsOfTests();

const timeOf = (scan: number, ms = 102) => START + scan * PERIOD_MS + ms;

/** Scans `from` to before `to` as they come live; the plant's clock, and this machine's, are off by so much. */
function scans(from: number, to: number, plant_ms = 0, machine_ms = plant_ms): JournalReading[] {
  return Array.from({ length: to - from }, (_, k) => {
    const i = from + k;
    return ['a', 'b', 'c'].map((id, c) => {
      const time_ms = timeOf(i, 100 + c);
      return reading(id, time_ms + plant_ms, 300 + i + c, time_ms + machine_ms + 50);
    });
  }).flat();
}

/** Takes readings in one scan after the other, by a machine's clock that may go back. */
async function live(rig: Rig, readings: readonly JournalReading[]): Promise<void> {
  for (let i = 0; i < readings.length; i += 3) {
    rig.now_ms = 0;
    await rig.take(readings.slice(i, i + 3));
    rig.steady_ms += PERIOD_MS;
    rig.pipeline.closeDue();
    rig.rewinder.poll();
  }
}

async function restarted(rig: Rig, kill: boolean): Promise<Rig> {
  const { now_ms, steady_ms } = rig;
  rigs.splice(rigs.indexOf(rig), 1)[0]!.stop(kill);
  const again = await started({ folder: rig.folder, now_ms });
  again.steady_ms = steady_ms;
  return again;
}

/** Roll-ups as they are stored. */
function rolledUp(rig: Rig): unknown[] {
  const database = new Database(join(rig.folder, 'history.sqlite'), { readonly: true });
  const tables = ['rolled_up', 'rollup_10min', 'rollup_2h', 'rollup_1d'];
  const rows = tables.map((table) => database.prepare(`SELECT * FROM ${table}`).all());
  database.close();
  return rows;
}

/** Of now: what stands in the future is left out. */
/**
 * The checkpoint with the state put aside as it comes back: packed, a whole number is written as one or
 * as a fraction, by how the engine happens to hold it.
 */
function opened(rig: Rig): unknown {
  const checkpoint = structuredClone(rig.runner.checkpoint()) as {
    image: { clocks: { aside: { packed: unknown } | null } };
  };
  const { aside } = checkpoint.image.clocks;
  if (aside?.packed instanceof Uint8Array) aside.packed = unpackImage(Buffer.from(aside.packed));
  return checkpoint;
}
const present = (rig: Rig) => rig.estimates().filter(({ time }) => Date.parse(time) < START + DAY);
const scansTold = (rig: Rig) =>
  rig.estimates().map(({ time }) => Math.floor(Date.parse(time) / PERIOD_MS));
const health = (rig: Rig) =>
  unitHealth(rig.runner, undefined, { now: () => rig.now_ms, speed: 1 }, 0).detail;

async function inTime(from: number, to: number): Promise<Rig> {
  const rig = await started();
  await live(rig, scans(from, to));
  return rig;
}

/** Holds a unit after a stretch ahead against one that never had it. */
async function expectAsWithout(rig: Rig, from: number, to: number): Promise<void> {
  const without = await inTime(from, to);
  expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
  expect(rig.runner.newest_ms).toBe(without.runner.newest_ms);
}

describe('clocks of plant and machine that were ahead together', () => {
  it.each([
    ['ten years', TEN_YEARS],
    ['two hours', 2 * HOUR],
  ])('by %s: within a minute the unit goes on from its state of before', async (_, ahead) => {
    const rig = await started();
    await live(rig, scans(0, 40));
    await live(rig, scans(40, 43, ahead));
    expect(Date.parse(rig.estimates().at(-1)!.time)).toBeGreaterThan(timeOf(43) + ahead / 2);
    // What is kept by age goes by the time of before.
    expect(Math.abs(rig.runner.sure_ms! - timeOf(42))).toBeLessThan(10 * PERIOD_MS);
    await live(rig, scans(43, 45));
    expect(health(rig)).toContain("6 readings live by this machine's clock wait");
    expect(rig.counters.all()).toMatchObject({ clock_back: 6, clock_returns: 0 });
    await live(rig, scans(45, 47));
    expect(rig.counters.all()).toMatchObject({ clock_returns: 1, too_late: 0, late: 0 });
    expect(Date.parse(rig.runner.view.estimate!.time)).toBe(timeOf(46));
    await live(rig, scans(47, 80));
    // What was told by clocks that were ahead is no part of the history; the journal has its readings.
    const without = await started();
    await live(without, [...scans(0, 40), ...scans(43, 80)]);
    expect(rig.estimates()).toEqual(without.estimates());
    expect(rolledUp(rig)).toEqual(rolledUp(without));
    const items = rig.history.outbox.read(1000);
    const [withdrawal] = items.filter(({ kind }) => kind === 'withdrawal');
    expect(withdrawal!.time_ms).toBeGreaterThan(timeOf(43) + ahead / 2);
    const after = items.filter(({ kind, seq }) => kind === 'estimate' && seq > withdrawal!.seq);
    expect(after).toHaveLength(40);
    // They are told for the first time: where a damaged history loses them they have no revision.
    expect(rig.history.rewinds.withdrawn('u')).toEqual([]);
    expect(rig.counters.get('estimates_taken_back')).toBeGreaterThanOrEqual(2);
    expect(rig.journal.lastSeq).toBeGreaterThanOrEqual(80 * 3);
    expect(rig.lines.filter((line) => line.includes('are right again'))).toEqual([
      expect.stringContaining(`gone back to the state of ${new Date(timeOf(39)).toISOString()}`),
    ]);
    expect(health(rig)).toContain('clocks were ahead, at 20');
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
    expect(rig.runner.sure_ms).toBe(timeOf(79));
    // Silence closes scans by the right clock again.
    rig.now_ms = timeOf(80);
    await rig.pass(3 * PERIOD_MS);
    await without.pass(3 * PERIOD_MS);
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('from the first scan on: the unit begins anew', async () => {
    const rig = await started();
    await live(rig, scans(0, 3, TEN_YEARS));
    await live(rig, scans(3, 180));
    expect(rig.counters.all()).toMatchObject({ clock_returns: 1, clock_back: 7, too_late: 0 });
    expect(rig.lines.join()).toContain('begun anew');
    expect(present(rig)).toHaveLength(177);
    await expectAsWithout(rig, 3, 180);
  });

  it('of a unit that has run by them alone: it begins anew only after as much as that', async () => {
    const rig = await started();
    await live(rig, scans(0, 60, TEN_YEARS));
    await live(rig, scans(60, 119));
    expect(rig.counters.get('clock_returns')).toBe(0);
    await live(rig, scans(119, 140));
    expect(rig.counters.get('clock_returns')).toBe(1);
    // It begins with the newest readings that waited.
    await expectAsWithout(rig, 66, 140);
  });

  it.each([
    ['stopped while it waits', false, 45],
    ['killed while it waits', true, 45],
    ['killed amid the stretch', true, 42],
    ['stopped right after', false, 46],
    ['killed right after', true, 46],
    ['killed later', true, 70],
  ])('and a daemon that is %s comes to the same, and shows what is of now', async (_, kill, at) => {
    const all = [...scans(0, 40), ...scans(40, 43, TEN_YEARS), ...scans(43, 80)];
    const first = await started();
    await live(first, all.slice(0, 3 * at));
    const rig = await restarted(first, kill);
    if (at >= 46)
      expect(rig.runner.view.estimate?.time).toBe(new Date(timeOf(at - 1)).toISOString());
    await live(rig, all.slice(3 * at));
    const without = await started();
    await live(without, [...scans(0, 40), ...scans(43, 80)]);
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
    const again = await restarted(rig, true);
    expect(again.runner.snapshot()).toEqual(without.runner.snapshot());
    expect(again.runner.view.estimate).toEqual(without.runner.view.estimate);
    expect(again.runner.view.profile).toEqual(without.runner.view.profile);
  });

  it('are gone back from also where the machine was ahead first, and closed scans by its clock', async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    rig.now_ms = timeOf(40) + TEN_YEARS;
    await rig.pass(3 * PERIOD_MS);
    const [entry] = rig.journal.read(rig.journal.lastSeq - 1, 1);
    expect(entry).toMatchObject({ kind: 'close', arrival_ms: rig.now_ms });
    await live(rig, scans(43, 46, TEN_YEARS));
    await live(rig, scans(46, 60));
    expect(rig.counters.get('clock_returns')).toBe(1);
    expect(rig.runner.newest_ms).toBe(timeOf(59));
  });

  it.each([
    ['recovers', null],
    ['recovers after a kill', 52],
    ['recovers after a stop', -52],
  ])('are gone back from also where the disk is full just then and %s', async (_, cut) => {
    const all = [...scans(0, 40), ...scans(40, 43, 2 * HOUR), ...scans(43, 80)];
    let rig = await started();
    await live(rig, all.slice(0, 3 * 44));
    const { history } = rig;
    history.write = () => {
      throw storeFailure('writing', new Error('full'));
    };
    await live(rig, all.slice(3 * 44, 3 * 52));
    expect(rig.counters.get('clock_returns')).toBe(1);
    expect(rig.counters.get('history_failures')).toBeGreaterThan(0);
    if (cut !== null) rig = await restarted(rig, cut > 0);
    else history.write = History.prototype.write;
    await live(rig, all.slice(3 * 52));
    const without = await started();
    await live(without, [...scans(0, 40), ...scans(43, 80)]);
    expect(rig.estimates()).toEqual(without.estimates());
    expect(rolledUp(rig)).toEqual(rolledUp(without));
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('come to the same where the disk is full just then and a late reading is taken in first', async () => {
    const isLate = ({ channel, time_ms }: JournalReading) =>
      channel === 'b' && time_ms === timeOf(20, 101);
    const all = [...scans(0, 40), ...scans(40, 43, 2 * HOUR), ...scans(43, 52)];
    const late = scans(20, 21).filter(isLate);
    const rig = await started();
    const { history } = rig;
    const soon = all.filter((one) => !isLate(one));
    await live(rig, soon.slice(0, -9 * 3));
    history.write = () => {
      throw storeFailure('writing', new Error('full'));
    };
    await live(rig, soon.slice(-9 * 3));
    await rig.take(late.map((one) => ({ ...one, arrival_ms: timeOf(51, 500) })));
    history.write = History.prototype.write;
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ clock_returns: 1, rewinds: 1 });
    const again = await restarted(rig, true);
    await live(again, scans(52, 60));
    const without = await started();
    await live(without, [...scans(0, 40), ...scans(43, 60)]);
    expect(again.estimates().map(({ time }) => time)).toEqual(
      without.estimates().map(({ time }) => time),
    );
    expect(again.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('come to the same over any restarts and kills', async () => {
    const stretch = fc.record({
      length: fc.integer({ min: 1, max: 30 }),
      ahead_ms: fc.constantFrom(0, 0, 2 * HOUR, 200 * DAY, TEN_YEARS),
    });
    const cut = fc.record({ at: fc.integer({ min: 31, max: 150 }), kill: fc.boolean() });
    const lists = [fc.array(stretch, { minLength: 2, maxLength: 5 }), fc.array(cut)] as const;
    let returns = 0;
    await fc.assert(
      fc.asyncProperty(...lists, async (stretches, cuts) => {
        let from = 30;
        const all = scans(0, from);
        for (const { length, ahead_ms } of stretches) {
          all.push(...scans(from, from + length, ahead_ms));
          from += length;
        }
        const whole = await started();
        await whole.take(all);
        returns += whole.counters.get('clock_returns');
        let rig = await started();
        let done = 0;
        for (const { at, kill } of cuts.sort((a, b) => a.at - b.at)) {
          const part = all.slice(done, 3 * at - 1);
          rig.now_ms = 0;
          await rig.take(part);
          done += part.length;
          rig = await restarted(rig, kill);
        }
        await rig.take(all.slice(done));
        expect(rig.runner.snapshot()).toEqual(whole.runner.snapshot());
        expect(opened(rig)).toStrictEqual(opened(whole));
        expect(rig.estimates()).toEqual(whole.estimates());
        expect(rolledUp(rig)).toEqual(rolledUp(whole));
      }),
      { numRuns: 25 },
    );
    expect(returns).toBeGreaterThan(5);
  }, 60_000);

  it('twice is gone back from twice', async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    await live(rig, [...scans(40, 43, TEN_YEARS), ...scans(43, 60)]);
    await live(rig, [...scans(60, 63, 2 * TEN_YEARS), ...scans(63, 90)]);
    const without = await started();
    await live(without, [...scans(0, 40), ...scans(43, 60), ...scans(63, 90)]);
    expect(rig.counters.get('clock_returns')).toBe(2);
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('keep no late reading from its place, of before or after', async () => {
    const rig = await started();
    const isLate = (one: JournalReading) =>
      one.channel === 'b' && [timeOf(20, 101), timeOf(60, 101)].includes(one.time_ms);
    const all = [...scans(0, 40), ...scans(43, 90)];
    const soon = all.filter((one) => !isLate(one));
    await live(
      rig,
      scans(0, 40).filter((one) => !isLate(one)),
    );
    await live(rig, scans(40, 43, TEN_YEARS));
    // Nothing is too old by clocks that may be wrong.
    rig.rewinder.forgetOld();
    await live(
      rig,
      soon.filter(({ time_ms }) => time_ms > timeOf(42)),
    );
    rig.rewinder.forgetOld();
    await rig.take(
      all.filter(isLate).map((one) => ({ ...one, arrival_ms: timeOf(90) + 1.3 * HOUR })),
    );
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ rewinds: 1, late_used: 2, rewind_failures: 0 });
    const without = await started();
    await live(without, all);
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
    expect(rig.runner.view.estimate!.time).toBe(without.runner.view.estimate!.time);
    expect(present(rig)).toHaveLength(rig.estimates().length);
    // A rewind took the state of one that never went through the stretch: the next still knows of it.
    expect(health(rig)).toContain('clocks were ahead');
    const again = await restarted(rig, true);
    expect(health(again)).toContain('clocks were ahead');
    expect(again.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('are gone back from also where a rewind came amid the stretch', async () => {
    const rig = await started();
    const all = scans(0, 40).filter(
      (one) => one.channel !== 'b' || one.time_ms !== timeOf(20, 101),
    );
    const late = (scan: number, value: number, ahead = 0) =>
      reading('b', timeOf(scan, 101) + ahead, value, timeOf(43) + TEN_YEARS);
    await live(rig, all);
    const stretch = scans(40, 43, TEN_YEARS);
    const soon = stretch.filter(
      (one) => one.channel !== 'b' || one.time_ms !== timeOf(41, 101) + TEN_YEARS,
    );
    await live(rig, soon);
    await rig.take([late(41, 342, TEN_YEARS)]);
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ rewinds: 1, late_used: 1 });
    const again = await restarted(rig, true);
    await live(again, scans(43, 80));
    expect(again.counters.all()).toMatchObject({ clock_returns: 1, rewind_failures: 0 });
    const without = await started();
    await live(without, [...all, ...scans(43, 80)]);
    expect(again.runner.snapshot()).toEqual(without.runner.snapshot());
    expect(again.estimates()).toEqual(without.estimates());
  });

  it('leave no alarm standing that was raised by them alone', async () => {
    const rig = await started({ core: raisingAbove(1000) });
    await live(rig, scans(0, 40));
    await live(
      rig,
      scans(40, 43, TEN_YEARS).map((one) => ({ ...one, value: 2000 })),
    );
    expect(rig.history.alarms.active('u')).toHaveLength(1);
    await live(rig, scans(43, 60));
    expect(rig.history.alarms.active('u')).toEqual([]);
    expect(rig.told.filter(({ kind }) => kind === 'front_spread').at(-1)).toMatchObject({
      transition: 'returned',
      message: 'By clocks that are right again, it does not hold now.',
    });
  });

  it('leave none standing either where the disk is full just then and the daemon stops', async () => {
    const core = raisingAbove(1000);
    const rig = await started({ core });
    await live(rig, scans(0, 40));
    await live(
      rig,
      scans(40, 43, 2 * HOUR).map((one) => ({ ...one, value: 2000 })),
    );
    await live(rig, scans(43, 45));
    const { history, folder, now_ms, steady_ms } = rig;
    history.write = () => {
      throw storeFailure('writing', new Error('full'));
    };
    await live(rig, scans(45, 52));
    expect(rig.counters.get('clock_returns')).toBe(1);
    history.write = History.prototype.write;
    expect(history.alarms.active('u')).toHaveLength(1);
    rigs.splice(rigs.indexOf(rig), 1)[0]!.stop();
    const again = await started({ core, folder, now_ms });
    again.steady_ms = steady_ms;
    await live(again, scans(52, 60));
    expect(again.history.alarms.active('u')).toEqual([]);
  });
});

describe('what is no such thing', () => {
  it("this machine's clock alone right again: the plant's readings stay ahead of it", async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    await live(rig, scans(40, 43, TEN_YEARS));
    await live(rig, scans(43, 80, TEN_YEARS, 0));
    expect(rig.counters.all()).toMatchObject({ future: 111, clock_back: 0, clock_returns: 0 });
  });

  it('both clocks set back for a moment: nothing has changed once they are right', async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    await live(rig, scans(40, 42, -200 * DAY));
    await live(rig, scans(42, 80));
    expect(rig.counters.all()).toMatchObject({ clock_back: 6, clock_returns: 0 });
    expect(rig.runner.clocks.waiting).toBe(0);
    const without = await started();
    await live(without, [...scans(0, 40), ...scans(42, 80)]);
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('an outage before clocks that are set back by less than it: the unit stays where it is', async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    await live(rig, scans(400, 900));
    expect(rig.runner.clocks.aside_ms).toBe(timeOf(39));
    await live(rig, scans(900, 910, -1.5 * HOUR));
    expect(rig.counters.all()).toMatchObject({ clock_back: 0, clock_returns: 0 });
    expect(rig.runner.newest_ms).toBe(timeOf(899));
  });

  it('an outage while this machine runs, or what comes from a store: no state is put aside', async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    rig.now_ms = timeOf(39);
    for (let i = 0; i < 130; i++) await rig.pass(PERIOD_MS);
    await live(
      rig,
      scans(400, 410).map((one) => ({
        ...one,
        time_ms: one.time_ms - 230 * PERIOD_MS,
        arrival_ms: one.arrival_ms - 230 * PERIOD_MS,
      })),
    );
    expect(rig.runner.clocks.aside_ms).toBeNull();
    const stored = await started();
    const late = scans(0, 60).map((one) => ({ ...one, arrival_ms: timeOf(400) }));
    await stored.take(late.filter(({ time_ms }) => time_ms < timeOf(20)));
    await stored.take(scans(400, 410));
    expect(stored.runner.clocks.aside_ms).toBeNull();
  });

  it('both clocks set back by years for days: what a unit has told and learned stays', async () => {
    const rig = await started();
    await rig.take(scans(0, 3100));
    const told = rig.estimates();
    await rig.take(scans(3100, 6050, -700 * DAY));
    expect(rig.counters.get('clock_returns')).toBe(0);
    expect(rig.estimates().slice(0, told.length)).toEqual(told);
    rig.now_ms = 0;
    await rig.take(scans(6050, 6060));
    const without = await started();
    await without.take([...scans(0, 3100), ...scans(6050, 6060)]);
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
    expect(rig.estimates()).toEqual(without.estimates());
  });

  it('and a unit that was begun anew of late takes back no more than it has told since', async () => {
    const first = await started();
    await first.take(scans(0, 20));
    await first.take(scans(6000, 6010));
    const { now_ms } = first;
    rigs.splice(rigs.indexOf(first), 1)[0]!.stop();
    const database = new Database(join(first.folder, 'history.sqlite'));
    database.exec('DELETE FROM checkpoints; DELETE FROM rewind_points;');
    database.close();
    const rig = await started({ folder: first.folder, now_ms });
    const begun = timeOf(6000, 0);
    const before = rig.estimates().filter(({ time }) => Date.parse(time) < begun);
    expect(before.length).toBeGreaterThanOrEqual(20);
    expect(rig.estimates().length).toBeGreaterThan(before.length);
    await live(rig, scans(6010, 6040, -700 * DAY));
    expect(rig.counters.get('clock_returns')).toBe(1);
    expect(rig.history.estimates.between('u', START, begun, 1e6)).toEqual(before);
    expect(rig.history.estimates.between('u', begun, 8.64e15, 1e6)).toEqual([]);
  });

  it('an outage before clocks come ahead by a little less: the unit goes back to after it', async () => {
    const rig = await started();
    const sound = [...scans(0, 40), ...scans(300, 420)];
    await live(rig, [...sound, ...scans(420, 423, 2 * HOUR), ...scans(423, 440)]);
    const without = await started();
    await live(without, [...sound, ...scans(423, 440)]);
    expect(rig.counters.get('clock_returns')).toBe(1);
    expect(rig.estimates()).toEqual(without.estimates());
    expect(rig.runner.snapshot()).toEqual(without.runner.snapshot());
  });

  it('an outage before clocks that are set back by much more than it', async () => {
    const rig = await started();
    await live(rig, [...scans(0, 40), ...scans(220, 520)]);
    const told = scansTold(rig);
    await live(rig, scans(520, 530, -3 * HOUR));
    // What comes late by as much has a gap to go into, and changes what was told since.
    expect(rig.counters.all()).toMatchObject({ clock_returns: 0, clock_back: 0, late: 30 });
    expect(scansTold(rig).slice(0, told.length)).toEqual(told);
  });

  it('an outage of three hours: the state of before is let go after a day', async () => {
    const rig = await started();
    await live(rig, scans(0, 40));
    await rig.take(scans(400, 400 + 2900));
    expect(rig.runner.clocks.aside_ms).toBeNull();
  });
});

/** Raises an alarm while a value is above. */
function raisingAbove(limit: number): Core {
  const raised = new WeakSet<object>();
  return {
    ...fakeCore,
    advance(unit: UnitDefinition, state, scan, ask) {
      const step = fakeCore.advance(unit, state, scan, ask);
      const isAbove = scan.values.some((value) => value > limit);
      if (!isAbove || raised.has(state)) return step;
      raised.add(state);
      const event: WatchEvent = {
        ...{ id: `${unit.id}/front_spread/x`, unit: unit.id, kind: 'front_spread' },
        ...{ class: 'alert', priority: 'low', subject: 'x', transition: 'raised' },
        ...{ time: step.estimate.time, value: null, limit: null, message: 'above.' },
      };
      return { ...step, events: [...step.events, event] };
    },
  };
}
