import type { MqttClient } from 'mqtt';
import { describe, expect, it } from 'vitest';
import { Assembler } from '../../src/core/scan/assemble.js';
import type { Scan } from '../../src/core/scan/scan.js';
import { fastClock } from '../../src/daemon.js';
import { requireProgram } from '../support/requirements.js';
import { startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';
import {
  count,
  counted,
  later,
  makeDaemon,
  publish,
  publisher,
  publishScan,
  storedEntries,
  storedEstimates,
} from './harness.js';
import { PERIOD_MS, smallSite, smallUnit } from './site.js';

const mosquitto = requireProgram('mosquitto');
const START = Date.UTC(2026, 0, 5, 6);

async function broker() {
  const service = await startMosquitto(mosquitto!);
  later(() => service.stop());
  return service;
}

const values = (i: number) => [300 + i * 0.1, 310 + Math.sin(i), 320 + i / 3];

/** Without waiting for one before sending the next: order is kept on one connection. */
async function publishScans(client: MqttClient, from: number, to: number): Promise<void> {
  const scans: Promise<void>[] = [];
  for (let i = from; i < to; i++) scans.push(publishScan(client, START + i * PERIOD_MS, values(i)));
  await Promise.all(scans);
}

/** What the core makes of a recording on its own, row by row. */
function byReplay(rows: number): number[] {
  const unit = smallUnit();
  const state = fakeCore.startUnit(unit);
  return Array.from({ length: rows }, (_, i) => {
    const scan: Scan = {
      time_ms: START + i * PERIOD_MS,
      values: Float64Array.from([...values(i), Number.NaN]),
      held: new Uint8Array(4),
    };
    const ask = { hours_at_W: [], profile: false };
    return fakeCore.advance(unit, state, scan, ask).estimate.state_of_charge;
  });
}

describe.skipIf(!mosquitto)('a daemon at a real broker', () => {
  it('estimates live what a replay of the same rows estimates, to the last bit', async () => {
    const { url } = await broker();
    const site = smallSite(url);
    const daemon = makeDaemon(site);
    await daemon.start();
    await waitFor('the broker', () => daemon.service.health()[0]!.ok);
    const client = await publisher(url);
    await publishScans(client, 0, 200);
    await counted(daemon, 'scans', 200);
    await daemon.stop();
    const stored = storedEstimates(site);
    expect(stored.map((one) => one.state_of_charge)).toEqual(byReplay(200));
    expect(storedEntries(site).filter((entry) => entry.kind === 'reading')).toHaveLength(600);
  });

  it('goes on after a stop, and after a stop amid a scan, to the last bit', async () => {
    const { url } = await broker();
    const site = smallSite(url);
    const client = await publisher(url);
    let sent = 0;
    for (const rows of [37, 50, 113]) {
      const daemon = makeDaemon(site);
      await daemon.start();
      await waitFor('the broker', () => daemon.service.health()[0]!.ok);
      // The rest of the scan that the stop cut in two, and all but the last part of the next cut.
      if (sent > 0) {
        const cut = values(sent - 1);
        const time = START + (sent - 1) * PERIOD_MS;
        await publish(client, 'in/bc', { time, values: cut.slice(1) });
      }
      await publishScans(client, sent, rows);
      const readings = 3 * (rows - sent) + (sent > 0 ? 3 : 1);
      sent = rows;
      const half = values(sent);
      await publish(client, 'in/a', { time: START + sent * PERIOD_MS, value: half[0] });
      sent++;
      await counted(daemon, 'readings', readings);
      await daemon.caughtUp();
      await daemon.stop();
    }
    const stored = storedEstimates(site).map((one) => one.state_of_charge);
    expect(stored).toEqual(byReplay(stored.length));
    expect(stored.length).toBe(113);
  });

  it('counts what is late, repeated, out of order, future, malformed and unknown, and loses nothing else', async () => {
    const { url } = await broker();
    const site = smallSite(url);
    const daemon = makeDaemon(site);
    await daemon.start();
    await waitFor('the broker', () => daemon.service.health()[0]!.ok);
    const client = await publisher(url);
    const at = (i: number, ms = 0) => START + i * PERIOD_MS + ms;
    await publishScan(client, at(0), values(0));
    await publish(client, 'in/a', { time: at(1, 20), value: 1 });
    await publish(client, 'in/a', { time: at(1, 20), value: 1 });
    await publish(client, 'in/a', { time: at(1, 20), value: 2 });
    await publish(client, 'in/a', { time: at(1, 10), value: 3 });
    await publish(client, 'in/bc', { time: at(1), values: [4, 5] });
    await publish(client, 'in/a', { time: at(1, 30), value: 6 });
    await publish(client, 'in/bc', { time: at(3, 15_000), values: [1, 1] });
    await publish(client, 'in/a', { time: at(2), value: 7 });
    await publish(client, 'in/a', { time: Date.now() + 3_600_000, value: 7 });
    await publish(client, 'in/a', { time: at(3), value: 'hot' });
    await publish(client, 'in/a', 'not json');
    await publish(client, 'in/bc', { time: at(3), values: [1] });
    await publish(client, 'in/bc', { time: at(3, 16_000), values: [1, 'x'] });
    await publish(client, 'in/a', { time: at(3), value: 7, quality: 'super' });
    await counted(daemon, 'messages', 16);
    await waitFor('the journal', () => count(daemon, 'readings') === 16);
    await daemon.caughtUp();
    expect(daemon.service.counters()).toMatchObject({
      messages: 16,
      readings: 16,
      malformed: 2,
      wrong_length: 1,
      bad_element: 1,
      unknown_quality: 1,
      // One exact copy that was left out, one reading that replaced another of the same time.
      repeated: 2,
      out_of_order: 1,
      surplus: 1,
      late: 1,
      future: 1,
    });
    await daemon.stop();
    expect(storedEntries(site).filter((entry) => entry.kind === 'reading')).toHaveLength(16);
  });

  it('closes empty scans while nothing comes, tells it, and says all of it again after a restart', async () => {
    const { url } = await broker();
    const fast = fastClock(Date.now(), 600);
    const site = smallSite(url);
    const daemon = makeDaemon(site, { clock: fast });
    const told: string[] = [];
    daemon.service.subscribe((message) => {
      if (message.kind === 'event') told.push(message.event.transition);
    });
    await daemon.start();
    await waitFor('the broker', () => daemon.service.health()[0]!.ok);
    const client = await publisher(url);
    await publishScan(client, START, values(0));
    await counted(daemon, 'scans_empty', 4);
    expect(told).toEqual(['raised']);
    expect(daemon.service.standing()).toMatchObject([{ state: 'unacknowledged' }]);
    const acknowledge = (id: string) =>
      daemon.service.commandAlarm({ id, action: 'acknowledge', who: 'operator' }).accepted;
    expect(acknowledge('u/data_stale/unit')).toBe(true);
    expect(acknowledge('u/nothing/unit')).toBe(false);
    await daemon.stop();
    const before = storedEstimates(site);

    const again = makeDaemon(site);
    await again.start();
    expect(again.service.standing()).toMatchObject([
      { state: 'acknowledged', acknowledged_by: 'operator' },
    ]);
    expect(again.service.now('u')?.estimate).toEqual(before.at(-1));
    expect(again.service.events('u', START, START + 1e9, 10)).toHaveLength(1);
    const seen = new Map<string, string>();
    client.on('message', (topic, payload) => seen.set(topic, payload.toString()));
    await client.subscribeAsync('out/#', { qos: 1 });
    await waitFor('state, alarms and heartbeat', () => seen.size >= 4);
    expect(JSON.parse(seen.get('out/u/state')!)).toEqual(before.at(-1));
    expect(JSON.parse(seen.get('out/u/alarms')!)).toMatchObject({
      standing: [{ id: 'u/data_stale/unit', state: 'acknowledged' }],
    });
    expect(JSON.parse(seen.get('out/u/dispatch')!)).toMatchObject({ answers: [{ power_MW: 1 }] });
    await waitFor('the heartbeat', () => seen.get('out/heartbeat')!.includes('"online"'));
    await again.stop();
    await waitFor('the farewell', () => seen.get('out/heartbeat')!.includes('offline'));
  });

  it('takes what the broker kept while it was away as a scan of its own time, not as late', async () => {
    const { url } = await broker();
    const site = smallSite(url);
    const first = makeDaemon(site);
    await first.start();
    await waitFor('the broker', () => first.service.health()[0]!.ok);
    const client = await publisher(url);
    await publishScan(client, START, values(0));
    await counted(first, 'scans', 1);
    await first.stop();
    await publishScans(client, 1, 100);
    const second = makeDaemon(site);
    await second.start();
    await counted(second, 'scans', 99);
    expect(count(second, 'late')).toBe(0);
    await second.stop();
    expect(storedEstimates(site).map((one) => one.state_of_charge)).toEqual(byReplay(100));
  });

  it('ends a subscription that the broker remembers from another configuration', async () => {
    const { url } = await broker();
    const before = smallSite(url);
    const old = { unit: 'u', topic: 'in/old', payload: 'value' as const, channels: ['a'] };
    const first = makeDaemon({ ...before, sources: [...before.sources, old] });
    await first.start();
    await waitFor('the broker', () => first.service.health()[0]!.ok);
    await first.stop();
    const second = makeDaemon(before);
    await second.start();
    await waitFor('the broker', () => second.service.health()[0]!.ok);
    const client = await publisher(url);
    await publish(client, 'in/old', { time: START, value: 1 });
    await counted(second, 'unknown_topic', 1);
    // Sent after the UNSUBSCRIBE, which the broker takes in before it.
    await new Promise((resolve) => setTimeout(resolve, 200));
    await publish(client, 'in/old', { time: START, value: 2 });
    await publishScan(client, START, values(0));
    await counted(second, 'scans', 1);
    expect(count(second, 'unknown_topic')).toBe(1);
  });

  it('loses nothing over a restart of the broker', async () => {
    const service = await broker();
    const site = smallSite(service.url);
    const daemon = makeDaemon(site);
    await daemon.start();
    await waitFor('the broker', () => daemon.service.health()[0]!.ok);
    const client = await publisher(service.url);
    await publishScans(client, 0, 20);
    await service.stop();
    await waitFor('the outage', () => !daemon.service.health()[0]!.ok);
    await service.start();
    await waitFor('the broker again', () => daemon.service.health()[0]!.ok);
    await publishScans(client, 20, 40);
    await counted(daemon, 'scans', 40);
    await daemon.stop();
    expect(storedEstimates(site).map((one) => one.state_of_charge)).toEqual(byReplay(40));
  });
});

describe('a daemon with its own broker', () => {
  it('works without any other program, answers questions and stops twice', async () => {
    const daemon = makeDaemon(smallSite(null));
    const { broker: url } = await daemon.start();
    const client = await publisher(url);
    await waitFor('the link', () => daemon.service.health()[0]!.ok);
    await expect(daemon.service.hours('u', [1])).rejects.toThrow(/got none yet/);
    await publishScan(client, START, values(0));
    await counted(daemon, 'scans', 1);
    const now = daemon.service.now('u')!;
    expect(now.stale).toBe(true);
    expect(now.age_s).toBeGreaterThan(0);
    expect(daemon.service.now('other')).toBeUndefined();
    const { time, answers } = await daemon.service.hours('u', [1, 2]);
    expect(time).toBe(new Date(START).toISOString());
    expect(answers.map((one) => one.power_MW)).toEqual([1, 2]);
    expect(daemon.service.history('u', START, START + 1, 10, ['quality'])).toMatchObject({
      points: [{ quality: 'good' }],
    });
    await daemon.stop();
    await daemon.stop();
  });

  it('makes the same scans of its journal again as it made live, partial and empty ones included', async () => {
    // What comes late stays out: what it changes is the matter of the rewind's tests.
    const late = { rewind_h: 0, rewind_point_every_s: 900, quiet_s: 30, wait_most_s: 600 };
    const site = smallSite(null, { late });
    const daemon = makeDaemon(site, { clock: fastClock(Date.now(), 600) });
    const { broker: url } = await daemon.start();
    const client = await publisher(url);
    await waitFor('the link', () => daemon.service.health()[0]!.ok);
    for (let i = 0; i < 30; i++) {
      const time = START + i * PERIOD_MS;
      if (i % 3 === 0) await publish(client, 'in/a', { time, value: 300 + i });
      else await publishScan(client, time, [...values(i), i]);
      await new Promise((resolve) => setTimeout(resolve, i % 7 === 0 ? 250 : 20));
    }
    await counted(daemon, 'scans', 30);
    await daemon.stop();
    const live = storedEstimates(site);

    const unit = smallUnit();
    const assembler = new Assembler(unit, {
      ...{ deadline_ms: 10_000, future_tolerance_ms: 300_000, longest_gap_scans: 2000 },
    });
    const state = fakeCore.startUnit(unit);
    const again: number[] = [];
    for (const entry of storedEntries(site)) {
      if (entry.kind === 'close') assembler.closeThrough(entry.scan_index);
      else {
        const channel = unit.channels.findIndex(({ id }) => id === entry.channel);
        assembler.add({ ...entry, channel });
      }
      for (let closed = assembler.take(); closed; closed = assembler.take()) {
        const ask = { hours_at_W: [], profile: false };
        again.push(fakeCore.advance(unit, state, closed.scan, ask).estimate.state_of_charge);
      }
    }
    // The stop may leave the last close mark to the next start.
    expect(again.length - live.length).toBeLessThanOrEqual(1);
    expect(again.slice(0, live.length)).toEqual(live.map((one) => one.state_of_charge));
    expect(count(daemon, 'scans_deadline')).toBeGreaterThan(5);
  });
});
