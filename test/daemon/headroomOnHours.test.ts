import { setImmediate } from 'node:timers/promises';
import { describe, expect, it } from 'vitest';
import type { Estimate } from '../../src/core/estimate.js';
import type { Headroom } from '../../src/core/plan/headroom.js';
import {
  chargingPowers,
  type HeadroomAnswer,
  HeadroomOnHours,
} from '../../src/daemon/headroomOnHours.js';
import type { UnitRunner } from '../../src/daemon/unitRunner.js';
import { unitOf } from '../core/track/plants.js';

const unit = unitOf();
const runner = { unit, snapshot: () => ({}) } as unknown as UnitRunner;

/** As much of an estimate as is looked at. */
function estimate(mode: Estimate['mode'], minute: number, more: object = {}): Estimate {
  const time = new Date(minute * 60_000).toISOString();
  return { time, mode, stores: { hot: { fronts_reason: null } }, ...more } as unknown as Estimate;
}
const HOURS = { dispatch: [] };

/** A worker whose answers the test lets go one by one. */
function questions(hasWorker = true) {
  const open: { resolve: (answer: Headroom[]) => void; reject: (why: Error) => void }[] = [];
  const asked: unknown[] = [];
  const said: HeadroomAnswer[] = [];
  const warned: string[] = [];
  const clock = { ms: 0 };
  const news = new HeadroomOnHours({
    now: () => clock.ms,
    questions: {
      hasWorker,
      plan: (_unit, _snapshot, question) => {
        asked.push(question);
        return new Promise((resolve, reject) => open.push({ resolve, reject }));
      },
    },
    notices: { warn: (_kind, text) => void warned.push(text) },
    answered: (_runner, answer) => void said.push(answer),
  });
  return { news, open, asked, said, warned, clock };
}

describe('headroom', () => {
  it('is asked whenever hours are computed, and after a change of mode', async () => {
    const { news, open, asked, said } = questions();
    news.stepped(runner, estimate('stand', 0, HOURS), 0);
    expect(asked).toEqual([{ kind: 'headroom', ask: { powers_W: [200e3, 60e3] } }]);
    open[0]!.resolve([]);
    await setImmediate();
    expect(said).toEqual([{ time: '1970-01-01T00:00:00.000Z', answers: [] }]);
    news.stepped(runner, estimate('stand', 1), 0);
    expect(asked).toHaveLength(1);
    news.stepped(runner, estimate('charge', 2), 0);
    expect(asked).toHaveLength(2);
  });

  it('is asked once at a time, of the newest state once it is due again', async () => {
    const { news, open, asked, said } = questions();
    news.stepped(runner, estimate('stand', 0, HOURS), 0);
    news.stepped(runner, estimate('charge', 1, HOURS), 0);
    news.stepped(runner, estimate('charge', 2), 0);
    expect(asked).toHaveLength(1);
    open[0]!.resolve([]);
    await setImmediate();
    news.stepped(runner, estimate('charge', 3), 0);
    open[1]!.resolve([]);
    await setImmediate();
    expect(said.map(({ time }) => time.slice(11, 16))).toEqual(['00:00', '00:03']);
  });

  it('takes a tenth of the worker at most', async () => {
    const { news, open, asked, clock } = questions();
    news.stepped(runner, estimate('stand', 0, HOURS), 0);
    clock.ms = 40;
    open[0]!.resolve([]);
    await setImmediate();
    // It took 40 ms: 360 ms are free of it.
    clock.ms = 399;
    news.stepped(runner, estimate('stand', 10, HOURS), 0);
    expect(asked).toHaveLength(1);
    clock.ms = 400;
    news.stepped(runner, estimate('stand', 11), 0);
    expect(asked).toHaveLength(2);
  });

  it('is not asked far behind the journal, before the stores have started, or without a worker', () => {
    const { news, asked } = questions();
    news.stepped(runner, estimate('stand', 0, HOURS), 5000);
    const cold = { ...HOURS, stores: { hot: { fronts_reason: 'not_started' } } };
    news.stepped(runner, estimate('stand', 1, cold), 0);
    expect(asked).toEqual([]);
    // Still due.
    news.stepped(runner, estimate('stand', 2), 0);
    expect(asked).toHaveLength(1);
    const alone = questions(false);
    alone.news.stepped(runner, estimate('stand', 0, HOURS), 0);
    expect(alone.asked).toEqual([]);
  });

  it('tells a failure, but not that of a daemon that stops', async () => {
    const { news, open, warned } = questions();
    news.stepped(runner, estimate('stand', 0, HOURS), 0);
    open[0]!.reject(new Error('no machine'));
    await setImmediate();
    expect(warned).toEqual(['headroom of unit u: no machine']);
    news.stepped(runner, estimate('charge', 1), 0);
    news.stop();
    open[1]!.reject(new Error('rockhour is stopping'));
    await setImmediate();
    expect(warned).toHaveLength(1);
  });

  it('is told at the greatest charging power that the connection lets in, and at the rated one', () => {
    const connection = { time_zone: 'UTC', export_max_W: 9e4, windows: [] };
    const behind = (import_max_W: number) =>
      chargingPowers(
        unitOf({ limits: { ...unit.limits, connection: { ...connection, import_max_W } } }),
      );
    expect(chargingPowers(unit)).toEqual([200e3, 60e3]);
    expect(behind(150e3)).toEqual([150e3, 60e3]);
    expect(behind(60e3)).toEqual([60e3]);
    expect(chargingPowers(unitOf({ rated_power_W: 10e3 }))).toEqual([200e3]);
  });
});
