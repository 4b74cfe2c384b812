import { afterEach, describe, expect, it } from 'vitest';
import type { JournalReading } from '../../../src/adapters/history/journal.js';
import { ClockSteps } from '../../../src/daemon/clockSteps.js';
import { Counters } from '../../../src/daemon/counters.js';
import { clockHealth, unitHealth } from '../../../src/daemon/health.js';
import { Notices } from '../../../src/daemon/notices.js';
import { createLog } from '../../../src/log.js';
import { PERIOD_MS } from '../site.js';
import { Rig, reading } from './rig.js';

const START = Date.UTC(2026, 0, 5, 6);
const HOUR = 3_600_000;
const DAY = 24 * HOUR;
const rigs: Rig[] = [];
afterEach(() => {
  for (const rig of rigs.splice(0)) rig.stop();
});

async function started(): Promise<Rig> {
  const rig = new Rig();
  rigs.push(rig);
  return rig.start();
}

/** A scan as it comes live; `stamp` is what the clock of a channel's source makes of the time. */
function scan(i: number, stamp: (time_ms: number, channel: string) => number = (t) => t) {
  return ['a', 'b', 'c'].map((id, c): JournalReading => {
    const time_ms = START + i * PERIOD_MS + 100 + c;
    return reading(id, stamp(time_ms, id), 300 + i + c, time_ms + 50);
  });
}

async function live(rig: Rig, from: number, to: number, stamp?: Parameters<typeof scan>[1]) {
  for (let i = from; i < to; i++) {
    await rig.take(scan(i, stamp));
    // A delivery that is over would be taken in.
    rig.steady_ms += PERIOD_MS;
    rig.rewinder.poll();
  }
}

const socs = (rig: Rig) => rig.estimates().map((one) => [one.time, one.state_of_charge]);
const only = (channel: string, by_ms: number) => (time_ms: number, id: string) =>
  id === channel ? time_ms + by_ms : time_ms;
const health = (rig: Rig) =>
  unitHealth(rig.runner, undefined, { now: () => rig.now_ms, speed: 1 }, rig.counters.get('future'))
    .detail;

/** What comes out without any reading of b. */
async function withoutB(scans: number): Promise<unknown[]> {
  const rig = await started();
  for (let i = 0; i < scans; i++) await rig.take(scan(i).filter(({ channel }) => channel !== 'b'));
  return socs(rig);
}

describe('a source in another time zone', () => {
  it('behind by whole hours is told with its offset and not used, as late reading neither', async () => {
    const rig = await started();
    await live(rig, 0, 12, only('b', -2 * HOUR));
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ late_used: 0, rewinds: 0 });
    expect(rig.counters.get('wrong_zone')).toBeGreaterThanOrEqual(9);
    expect(rig.runner.wrongZones).toEqual([{ channel: 'b', hours: -2 }]);
    expect(rig.lines.join()).toContain('stamped 2 h behind, which looks like another time zone');
    expect(health(rig)).toContain('not used: b is stamped 2 h behind');
    const expected = await withoutB(12);
    expect(socs(rig)).toEqual(expected.slice(0, socs(rig).length));
    // Once it is set right, all is well.
    await live(rig, 12, 14);
    expect(rig.runner.wrongZones).toEqual([]);
    expect(health(rig)).not.toContain('time zone');
  });

  it('ahead by whole hours likewise, and it is known after a restart', async () => {
    const rig = await started();
    await live(rig, 0, 8, only('c', HOUR));
    expect(rig.counters.all()).toMatchObject({ future: 2, wrong_zone: 6 });
    expect(rig.lines.join()).toContain('stamped 1 h ahead');
    rigs.pop()!.stop();
    const again = new Rig({ folder: rig.folder });
    rigs.push(again);
    await again.start();
    expect(again.runner.wrongZones).toEqual([{ channel: 'c', hours: 1 }]);
  });

  it('is no gateway that delivers what it has stored, whatever the hours', async () => {
    const rig = await started();
    const all = Array.from({ length: 300 }, (_, i) => scan(i));
    const isLate = ({ channel }: JournalReading) => channel === 'b';
    await rig.take([...scan(0), ...all.slice(1).flatMap((one) => one.filter((r) => !isLate(r)))]);
    const now = rig.now_ms;
    const stored = all.slice(1).flatMap((one) => one.filter(isLate));
    await rig.take(stored.map((one, k) => ({ ...one, arrival_ms: now + 10 * k })));
    await rig.settle();
    expect(rig.counters.all()).toMatchObject({ wrong_zone: 0, rewinds: 1 });
    const inTime = await started();
    await inTime.take(all.flat());
    expect(rig.runner.snapshot()).toEqual(inTime.runner.snapshot());
  });
});

describe('a plant that sends yesterday once more', () => {
  it('as if it were live is recognised by its readings, again and again, and costs no rewind', async () => {
    const rig = await started();
    await live(rig, 0, 60);
    const before = socs(rig);
    for (let round = 0; round < 2; round++) {
      for (let i = 5; i < 25; i++) {
        const sent = scan(i).map((one) => ({
          ...one,
          arrival_ms: one.arrival_ms + (1 + round) * DAY,
        }));
        await rig.take(sent);
        rig.steady_ms += PERIOD_MS;
        rig.rewinder.poll();
      }
      await rig.settle();
    }
    expect(rig.counters.all()).toMatchObject({ late: 120, late_repeated: 120, rewinds: 0 });
    expect(socs(rig)).toEqual(before);
  });
});

describe('clocks without a date', () => {
  it('of a source: 1970 and 2099 are counted, told and not used, be they the first', async () => {
    const rig = await started();
    await rig.take([
      reading('b', 5000, 1, START - 10),
      reading('b', Date.UTC(2099, 0), 1, START - 9),
    ]);
    await live(rig, 0, 10);
    await rig.take([
      reading('a', 6000, 1, rig.now_ms),
      reading('a', Date.UTC(2099, 0), 1, rig.now_ms),
    ]);
    await live(rig, 10, 20);
    const inTime = await started();
    await inTime.take(Array.from({ length: 20 }, (_, i) => scan(i)).flat());
    expect(rig.runner.snapshot()).toEqual(inTime.runner.snapshot());
    expect(rig.counters.all()).toMatchObject({ dateless: 2, future: 2, late: 0, too_late: 0 });
    expect(rig.lines.join()).toContain('is of a clock that has lost its date: not used');
    expect(health(rig)).toContain("2 readings stamped ahead of this machine's clock were not used");
  });

  it('of this machine: dated readings are believed, and it is told until it is set', async () => {
    const rig = await started();
    const lost = Array.from({ length: 10 }, (_, i) =>
      scan(i).map((one) => ({ ...one, arrival_ms: 60_000 + i * PERIOD_MS })),
    );
    for (const one of lost) await rig.take(one);
    await live(rig, 10, 20);
    expect(rig.counters.all()).toMatchObject({ machine_dateless: 30, future: 0, late: 0 });
    expect(rig.lines.join()).toContain("this machine's clock stands at 1970-01-01T00:01:00.000Z");
    const inTime = await started();
    await inTime.take(Array.from({ length: 20 }, (_, i) => scan(i)).flat());
    expect(rig.runner.snapshot()).toEqual(inTime.runner.snapshot());
    expect(clockHealth(60_000, null)).toMatchObject({ ok: false });
  });
});

describe('the clock of a whole plant', () => {
  it('set back by an hour and more brings nothing but copies until it has come to where it was', async () => {
    const rig = await started();
    await live(rig, 0, 130);
    const before = socs(rig);
    await live(rig, 130, 140, (time_ms) => time_ms - 61 * PERIOD_MS);
    await rig.settle();
    expect(socs(rig)).toEqual(before);
    expect(rig.counters.all()).toMatchObject({ late: 30, late_repeated: 30, rewinds: 0 });
    await live(rig, 140, 145);
    expect(socs(rig)).toHaveLength(145);
  });

  it('set forward is not believed beyond the tolerance, and not waited for when it is right again', async () => {
    const rig = await started();
    await live(rig, 0, 10);
    await live(rig, 10, 15, (time_ms) => time_ms + 37 * 60_000);
    await live(rig, 15, 20);
    expect(rig.counters.all()).toMatchObject({ future: 15, late: 0 });
    expect(rig.estimates().at(-1)!.time).toBe(new Date(START + 19 * PERIOD_MS + 102).toISOString());
  });
});

describe('the clock of this machine', () => {
  it('set forward or back is counted and told, its own drift is not', () => {
    const [lines, counters] = [[] as string[], new Counters()];
    const destination = { write: (line: string) => void lines.push(JSON.parse(line).msg) };
    const notices = new Notices(createLog({ pretty: false, destination }));
    let [wall, counted] = [START, 0];
    const steps = new ClockSteps({ now: () => wall, speed: 1 }, () => counted, {
      counters,
      notices,
    });
    const pass = (by_wall: number, by_counted: number) => {
      wall += by_wall;
      counted += by_counted;
      steps.look();
    };
    pass(1000, 1000);
    pass(1900, 1000);
    expect(steps.last).toBeNull();
    expect(clockHealth(wall, steps.last)).toMatchObject({ ok: true, detail: 'was not set' });
    pass(HOUR + 1000, 1000);
    pass(1000 - 2 * HOUR, 1000);
    expect([counters.get('clock_set_forward'), counters.get('clock_set_back')]).toEqual([1, 1]);
    expect(lines).toEqual([expect.stringContaining('was set forward by 3600 s')]);
    expect(clockHealth(wall, steps.last).detail).toContain('was set back by 7200 s to 2026-01-05T');
  });

  it('set back makes readings look ahead: counted and told; what comes after is used again', async () => {
    const rig = await started();
    await live(rig, 0, 10);
    for (let i = 10; i < 13; i++) {
      await rig.take(scan(i).map((one) => ({ ...one, arrival_ms: one.arrival_ms - 2.5 * HOUR })));
    }
    await live(rig, 13, 20);
    expect(rig.counters.all()).toMatchObject({ future: 9, late: 0 });
    expect(rig.estimates()).toHaveLength(20);
  });
});
