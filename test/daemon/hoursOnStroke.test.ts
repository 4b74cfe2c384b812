import { describe, expect, it, vi } from 'vitest';
import type { DispatchAnswer } from '../../src/core/estimate.js';
import type { HoursOnStrokeOptions } from '../../src/daemon/hoursOnStroke.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';
import { type Rig, reading, rigsOfTests } from './rewind/rig.js';
import { PERIOD_MS, smallUnit } from './site.js';

const { started } = rigsOfTests();
const START_MS = Date.UTC(2026, 5, 1);
const UNITS = ['u', 'v'].map((id) => ({
  ...smallUnit(id),
  hours_at_W: [1.2e6],
  hours_every_s: (3 * PERIOD_MS) / 1000,
}));

/** Asked for hours, it answers when it is told to. */
class SlowWorker {
  readonly hasWorker = true;
  readonly asked: string[] = [];
  private readonly open: (() => void)[] = [];

  readonly hours: HoursOnStrokeOptions['questions']['hours'] = (unit, snapshot, powers_W) => {
    this.asked.push(unit.id);
    return new Promise<DispatchAnswer[]>((resolve) => {
      const state = fakeCore.restoreUnit(unit, snapshot);
      const answers = fakeCore.hoursAt(unit, state, powers_W);
      this.open.push(() => resolve(answers));
    });
  };

  answer(): void {
    for (const resolve of this.open.splice(0)) resolve();
  }
}

/** Readings of scans from..to-1 of a unit, those of the last one without its end. */
const scans = (unit: string, from: number, to: number) =>
  Array.from({ length: to - from }, (_, i) =>
    ['a', 'b', 'c'].map((channel, k) => {
      const time_ms = START_MS + (from + i) * PERIOD_MS;
      return reading(channel, time_ms, Math.sin(from + i + k), time_ms, unit);
    }),
  ).flat();

const put = (rig: Rig, ...readings: ReturnType<typeof reading>[]) => {
  rig.journal.append(readings);
  rig.pipeline.kick();
};

const ALL = [...scans('u', 0, 10), ...scans('v', 0, 10)];

/** What a daemon that computes hours at once has told of each unit. */
async function atOnce() {
  const rig = await started({ units: UNITS });
  await rig.take(ALL);
  return ['u', 'v'].map((unit) => rig.estimates(unit));
}

describe('hours where the clock of a unit strikes', () => {
  it('come from the worker and are told with their scan, as if computed at once', async () => {
    const worker = new SlowWorker();
    const rig = await started({ units: UNITS, questions: worker });
    put(rig, ...ALL);
    await vi.waitUntil(() => {
      worker.answer();
      return rig.pipeline.backlog === 0;
    });
    expect(['u', 'v'].map((unit) => rig.estimates(unit))).toEqual(await atOnce());
    expect(rig.estimates('u').filter(({ dispatch }) => dispatch)).toHaveLength(4);
    expect(worker.asked.filter((unit) => unit === 'u')).toHaveLength(4);
    // Told in their order, each once.
    const times = rig.stepped.filter(({ unit }) => unit === 'u').map(({ time }) => time);
    expect(times).toEqual([...new Set(times)].sort());
  });

  it('keep no other unit waiting', async () => {
    const worker = new SlowWorker();
    // The clock of the second strikes on none of these scans.
    const [first, second] = UNITS;
    const units = [first!, { ...second!, hours_every_s: 86_400 }];
    const rig = await started({ units, questions: worker });
    put(rig, ...ALL);
    await waitFor('the scans of v', () => rig.estimates('v').length === 10);
    expect(rig.estimates('u')).toEqual([]);
    expect(rig.pipeline.backlog).toBeGreaterThan(0);
    expect(worker.asked).toEqual(['u']);
  });

  it('are computed at once where the worker fails, and where it does not answer', async () => {
    for (const hours of [
      () => Promise.reject(new Error('the worker ended')),
      () => new Promise<DispatchAnswer[]>(() => undefined),
    ]) {
      const rig = await started({ units: UNITS, questions: { hasWorker: true, hours } });
      // Only the first scans: each strike waits for a second where nobody answers.
      await rig.take([...scans('u', 0, 2), ...scans('v', 0, 2)]);
      const told = rig.estimates('u');
      expect(told).toHaveLength(2);
      expect(told[0]!.dispatch).toEqual((await atOnce())[0]![0]!.dispatch);
    }
  });

  it('are in what is saved at a stop, which awaits nobody', async () => {
    const worker = new SlowWorker();
    const rig = await started({ units: UNITS, questions: worker });
    put(rig, ...scans('u', 0, 2));
    await vi.waitUntil(() => worker.asked.length === 1);
    rig.pipeline.stop();
    const [estimate] = rig.estimates('u');
    expect(estimate!.dispatch).toHaveLength(1);
    expect(Date.parse(estimate!.time)).toBe(rig.runner.checkpoint()!.time_ms);
    // What comes too late is not told again.
    worker.answer();
    await new Promise((resolve) => setImmediate(resolve));
    expect(rig.stepped.filter(({ unit }) => unit === 'u')).toHaveLength(1);
  });

  it('that the core cannot compute fail their scan and are told', async () => {
    const core = {
      ...fakeCore,
      hoursAt: () => {
        throw new RangeError('no such rock');
      },
    };
    const hours = () => Promise.reject(new Error('the worker ended'));
    const rig = await started({ core, units: UNITS, questions: { hasWorker: true, hours } });
    await rig.take(scans('u', 0, 2));
    expect(rig.pipeline.failures.get('u')).toMatch(/no such rock/);
    // It begins anew after the first, and strikes again.
    expect(rig.counters.all().scan_failures).toBe(2);
  });
});
