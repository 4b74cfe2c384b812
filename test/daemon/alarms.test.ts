import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { afterEach, describe, expect, it } from 'vitest';
import type { AlarmCommand } from '../../src/core/alarm/command.js';
import type { Estimate } from '../../src/core/estimate.js';
import type { EventKind, WatchEvent } from '../../src/core/watch/event.js';
import { KIND_CLASSES } from '../../src/core/watch/kinds.js';
import type { Core } from '../../src/daemon/core.js';
import { type DaemonClock, wallClock } from '../../src/daemon.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';
import { count, counted, makeDaemon, publisher, publishScan } from './harness.js';
import { PERIOD_MS, smallSite } from './site.js';

const START = Date.now() - 40 * PERIOD_MS;
let mode: Estimate['mode'] = 'discharge';
let planned: [EventKind, string, WatchEvent['transition']][] = [];
afterEach(() => {
  mode = 'discharge';
  planned = [];
});

/** The core in a few lines, with the mode and the events that a test wants of the next scan. */
const core: Core = {
  ...fakeCore,
  advance(unit, state, scan, ask) {
    const step = fakeCore.advance(unit, state, scan, ask);
    const events = planned.splice(0).map(([kind, subject, transition]): WatchEvent => {
      return {
        ...{ id: `u/${kind}/${subject}`, unit: 'u', kind, ...KIND_CLASSES[kind], subject },
        ...{ transition, time: step.estimate.time, value: 1, limit: 2, message: 'planned' },
      };
    });
    return { ...step, estimate: { ...step.estimate, mode }, events };
  },
};

/** A clock that a test can set forward. */
function settableClock(): DaemonClock & { ahead_ms: number } {
  const clock = { ...wallClock, ahead_ms: 0, now: () => Date.now() + clock.ahead_ms };
  return clock;
}

async function started(clock?: DaemonClock) {
  const site = smallSite(null);
  const daemon = makeDaemon(site, { core, ...(clock === undefined ? {} : { clock }) });
  const { broker } = await daemon.start();
  await waitFor('the broker', () => daemon.service.health()[0]!.ok);
  const client = await publisher(broker);
  const heard: { topic: string; payload: string; retain: boolean }[] = [];
  client.on('message', (topic, payload, { retain }) => {
    heard.push({ topic, payload: payload.toString(), retain });
  });
  await client.subscribeAsync('out/u/alarms/#', { qos: 1 });
  let scans = 0;
  const scan = async (...events: typeof planned) => {
    planned.push(...events);
    await publishScan(client, START + scans++ * PERIOD_MS, [300, 310, 320, 330]);
    await counted(daemon, 'scans', scans);
  };
  // biome-ignore lint/suspicious/noExplicitAny: what a client sees
  const of = (name: string): any[] =>
    heard.filter(({ topic }) => topic === name).map(({ payload }) => JSON.parse(payload));
  const send = async (command: unknown, retain = false) => {
    const before = of('out/u/alarms/answer').length;
    const text = typeof command === 'string' ? command : JSON.stringify(command);
    await client.publishAsync('out/u/alarms/command', text, { qos: 1, retain });
    await waitFor('the answer', () => of('out/u/alarms/answer').length > before);
    return of('out/u/alarms/answer').at(-1);
  };
  const states = () =>
    [...daemon.service.standing(), ...daemon.service.heldBack()].map((one) => one.state);
  return { site, daemon, client, heard, scan, of, send, states };
}

const ID = 'u/front_spread/hot';
const WORD: Omit<AlarmCommand, 'action' | 'hours'> = { id: ID, who: 'control room', why: 'known' };

describe('commands from the plant`s own system', () => {
  it('go round: raised, acknowledged, shelved, shown, out of service, all by MQTT', async () => {
    const { scan, send, of, heard, states, daemon } = await started();
    await scan(['front_spread', 'hot', 'raised']);
    expect(await send({ ...WORD, action: 'acknowledge' })).toMatchObject({
      ...{ unit: 'u', accepted: true, state: 'acknowledged', fault: null },
      command: { id: ID, action: 'acknowledge', who: 'control room' },
    });
    const steps = [
      [{ ...WORD, action: 'shelve', hours: 2 }, 'shelved'],
      [{ id: ID, who: 'x', action: 'unshelve' }, 'unacknowledged'],
      [{ ...WORD, action: 'out_of_service' }, 'out_of_service'],
      [{ id: ID, who: 'x', action: 'return_to_service' }, 'unacknowledged'],
    ] as const;
    for (const [command, state] of steps) {
      expect(await send(command)).toMatchObject({ accepted: true, state });
      expect(states()).toEqual([state]);
    }
    await waitFor('the list', () => of('out/u/alarms').at(-1)?.counts.unacknowledged === 1);
    expect(of('out/u/alarms').at(-1)).toMatchObject({
      ...{ unit: 'u', suppressed: [], left_out: 0 },
      standing: [{ id: ID, state: 'unacknowledged', letter: 'B', action: expect.any(String) }],
    });
    // Answers are news and not kept; the list is.
    expect(heard.filter(({ topic }) => topic.endsWith('answer')).some((one) => one.retain)).toBe(
      false,
    );
    expect(count(daemon, 'alarm_commands')).toBe(5);
    const walked = daemon.service.alarmTransitions({ id: ID }, 0, 1e15, 9).reverse();
    expect(walked.map(({ what, who }) => [what, who])).toEqual([
      ['raised', null],
      ['acknowledged', 'control room'],
      ['shelved', 'control room'],
      ['unshelved', 'x'],
      ['out_of_service', 'control room'],
      ['returned_to_service', 'x'],
    ]);
  });

  it('that are wrong are answered with field, value and what was expected, and counted', async () => {
    const { scan, send, daemon } = await started();
    await scan(['front_spread', 'hot', 'raised']);
    const fault = async (command: unknown) => {
      const { accepted, fault, state } = await send(command);
      expect([accepted, state]).toEqual([false, null]);
      return fault;
    };
    expect(await fault({ id: ID, action: 'acknowledge' })).toEqual({
      ...{ code: 'wrong_value', field: 'who', value: null },
      expected: 'a name of 1 to 64 characters',
    });
    expect(await fault({ ...WORD, action: 'shelve', hours: 9 })).toMatchObject({
      ...{ field: 'hours', value: 9, expected: 'a number from 1/60 (a minute) to 8' },
    });
    expect(await fault({ ...WORD, id: 'v/front_spread/hot', action: 'acknowledge' })).toMatchObject(
      {
        ...{ code: 'unknown_event', field: 'id', expected: 'an id that begins with u/' },
      },
    );
    expect(await fault({ ...WORD, id: 'u/gas_lost/u', action: 'acknowledge' })).toMatchObject({
      ...{ code: 'unknown_event', value: 'u/gas_lost/u', expected: `one of ${ID}` },
    });
    expect(
      await fault({ ...WORD, id: 'u/gas_lost/nowhere', action: 'out_of_service' }),
    ).toMatchObject({
      ...{ code: 'unknown_event', expected: 'u/gas_lost/ and one of u' },
    });
    for (const id of ['u/database_unreachable/x', 'u/front_spread/u', 'u/sensor_rejected/a'])
      expect(await fault({ ...WORD, id, action: 'out_of_service' })).toMatchObject({ field: 'id' });
    const time = new Date(Date.now() - 6 * 60_000).toISOString();
    expect(await fault({ ...WORD, action: 'acknowledge', time })).toMatchObject({
      ...{ field: 'time', value: time, expected: expect.stringMatching(/at most 5 min before/) },
    });
    expect(await fault({ ...WORD, action: 'unshelve' })).toMatchObject({
      ...{ code: 'wrong_state', field: 'action', value: 'unshelve' },
      expected: 'an action that fits: it is not shelved',
    });
    expect(count(daemon, 'alarm_commands_refused')).toBe(10);
    expect(await fault('{"id"')).toMatchObject({
      value: '{"id"',
      expected: expect.stringMatching(/^JSON/),
    });
    expect(await fault('x'.repeat(5000))).toMatchObject({ expected: 'at most 4096 bytes of JSON' });
    expect(count(daemon, 'alarm_commands_malformed')).toBe(2);
    expect(count(daemon, 'alarm_commands')).toBe(0);
    // None of it was taken for a reading.
    expect(count(daemon, 'unknown_topic') + count(daemon, 'malformed')).toBe(0);
  });
});

describe('rules and time', () => {
  it('hold back what means nothing in a mode, show it again, and tell it without an event', async () => {
    const { scan, states, daemon, of } = await started();
    const told: string[] = [];
    daemon.service.subscribe(({ kind }) => told.push(kind));
    mode = 'stand';
    await scan(['outlet_near_limit', 'hot', 'raised']);
    expect(states()).toEqual(['suppressed_by_design']);
    await waitFor('the list', () => of('out/u/alarms').at(-1).suppressed.length === 1);
    expect(of('out/u/alarms').at(-1)).toMatchObject({ standing: [] });
    mode = 'discharge';
    await scan();
    expect(states()).toEqual(['unacknowledged']);
    expect(told.filter((kind) => kind === 'event')).toHaveLength(1);
    expect(told.filter((kind) => kind === 'alarms')).toHaveLength(1);
    mode = 'stand';
    await scan();
    expect(states()).toEqual(['unacknowledged']);
  });

  it('show a shelved alarm again when its hours are over, though no reading comes', async () => {
    const clock = settableClock();
    const { scan, send, states } = await started(clock);
    await scan(['front_spread', 'hot', 'raised']);
    await send({ ...WORD, action: 'shelve', hours: 2 });
    clock.ahead_ms = 2 * 3_600_000 - 60_000;
    await new Promise((resolve) => setTimeout(resolve, 1200));
    expect(states()).toContain('shelved');
    clock.ahead_ms = 2 * 3_600_000 + 1000;
    await waitFor('it is shown', () => states().includes('unacknowledged'));
  });
});

describe('a history that cannot be written for a while', () => {
  it('has what was raised meanwhile once it can', async () => {
    const { site, daemon, scan, states } = await started();
    await scan();
    const lock = new SQLite(join(site.store.folder, 'history.sqlite'));
    lock.exec('BEGIN IMMEDIATE');
    await scan(['front_spread', 'hot', 'raised']);
    await counted(daemon, 'history_failures', 1);
    expect(states()).toEqual([]);
    expect(count(daemon, 'events')).toBe(1);
    lock.exec('COMMIT');
    lock.close();
    await scan();
    await waitFor('the alarm', () => states().length === 1);
    expect(daemon.service.events('u', 0, 1e15, 9)).toMatchObject([{ id: ID }]);
    // Told once, when it happened.
    expect([count(daemon, 'events'), count(daemon, 'events_lost')]).toEqual([1, 0]);
  });
});

describe('a storm', () => {
  it('of 10,000 events is all stored, with few messages and a bounded list', async () => {
    const { scan, daemon, of } = await started();
    const IDS = 1000;
    for (let flap = 0; flap < 10; flap++) {
      const transition = flap % 2 === 0 ? 'raised' : 'returned';
      await scan(
        ...Array.from(
          { length: IDS },
          (_, n) => ['sensor_rejected', `t${n}`, transition] as const,
        ).map((one) => [...one] as (typeof planned)[number]),
      );
    }
    expect(count(daemon, 'events')).toBe(10 * IDS);
    expect(daemon.service.events('u', 0, 1e15, 1e6)).toHaveLength(10 * IDS);
    const standing = daemon.service.standing('u');
    expect(new Set(standing.map(({ id }) => id)).size).toBe(standing.length);
    expect(standing).toHaveLength(IDS);
    await waitFor('the last list', () => {
      return of('out/u/alarms').at(-1)?.counts.returned_unacknowledged === IDS;
    });
    const lists = of('out/u/alarms');
    expect(lists.length).toBeLessThan(100);
    expect(Math.max(...lists.map(({ standing }) => standing.length))).toBeLessThanOrEqual(200);
    expect(lists.at(-1)).toMatchObject({ left_out: IDS - 200, suppressed: [] });
  }, 60_000);
});
