import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { connectAsync } from 'mqtt';
import { describe, expect, it } from 'vitest';
import type { SiteConfig } from '../../src/config/site.js';
import {
  count,
  counted,
  later,
  makeDaemon,
  publish,
  publisher,
  publishScan,
  storedEntries,
} from '../daemon/harness.js';
import { RockhourProcess } from '../daemon/processes.js';
import { PERIOD_MS, smallSite } from '../daemon/site.js';
import { siteFile } from '../daemon/siteFile.js';
import { freePort } from '../support/ports.js';
import { requireProgram } from '../support/requirements.js';
import { type Service, startInflux, startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';

const mosquitto = requireProgram('mosquitto');
const influxd = requireProgram('influxd');
const START = Date.UTC(2026, 0, 5, 6);

async function running(site: SiteConfig) {
  const daemon = makeDaemon(site);
  const { broker } = await daemon.start();
  const part = (name: string) => daemon.service.health().find((one) => one.name === name)!;
  return { daemon, broker, part };
}

/** Adds lines to a service's configuration below a line of it, and starts it again. */
async function reconfigured(service: Service, file: string, below: RegExp, lines: string) {
  await service.stop();
  const path = join(service.folder, file);
  const before = readFileSync(path, 'utf8');
  const after = before.replace(below, (found) => `${found}\n${lines}`);
  expect(after).not.toBe(before);
  writeFileSync(path, after);
  await service.start();
  return async () => {
    await service.stop();
    writeFileSync(path, before);
    await service.start();
  };
}

describe('payloads that are wrong', () => {
  /** What comes of each: the counter that tells it. */
  const WRONG: readonly (readonly [topic: string, content: unknown, counter: string])[] = [
    ['in/a', { value: '300' }, 'malformed'],
    ['in/a', { value: 'NaN' }, 'malformed'],
    ['in/a', { value: true }, 'malformed'],
    ['in/a', { value: [300] }, 'malformed'],
    ['in/a', { value: { value: 300 } }, 'malformed'],
    ['in/a', '{"value": NaN}', 'malformed'],
    ['in/a', '{"value": 1e999}', 'malformed'],
    ['in/a', '300', 'malformed'],
    ['in/a', '', 'malformed'],
    ['in/a', '\u0000\u0001\ufffd', 'malformed'],
    ['in/a', { values: [300] }, 'malformed'],
    ['in/a', { time: 'yesterday', value: 300 }, 'malformed'],
    ['in/a', { time: '2026-01-05T06:00:00', value: 300 }, 'malformed'],
    ['in/a', { time: true, value: 300 }, 'malformed'],
    ['in/bc', { value: 300 }, 'malformed'],
    ['in/bc', { values: 300 }, 'malformed'],
    ['in/bc', { values: [300] }, 'wrong_length'],
    ['in/bc', { values: [300, 301, 302] }, 'wrong_length'],
    ['in/bc', { values: [300, 301], quality: ['good'] }, 'wrong_length'],
    ['in/bc', { values: [300, '301'] }, 'bad_element'],
    ['in/bc', { values: [300, null] }, 'missing_value'],
    ['in/a', { value: null }, 'missing_value'],
    ['in/a', { value: 300, quality: 'excellent' }, 'unknown_quality'],
    ['in/a', { value: 300, quality: 7 }, 'unknown_quality'],
  ];

  it('are counted by what is wrong with them, and every sound reading around them is kept', async () => {
    const site = smallSite(null);
    const { daemon, broker } = await running(site);
    const client = await publisher(broker);
    const expected: Record<string, number> = {};
    for (const [i, [topic, content, counter]] of WRONG.entries()) {
      await publishScan(client, START + i * PERIOD_MS, [300 + i, 310, 320]);
      const timed =
        typeof content === 'object' && content !== null
          ? { time: START + i * PERIOD_MS + 1, ...content }
          : content;
      await publish(client, topic, timed);
      expected[counter] = (expected[counter] ?? 0) + 1;
    }
    // Two messages a scan, and the wrong one.
    await counted(daemon, 'messages', 3 * WRONG.length);
    await daemon.caughtUp();
    expect(daemon.service.counters()).toMatchObject(expected);
    expect(count(daemon, 'scans_complete')).toBe(WRONG.length);
    await daemon.stop();
    const kept = storedEntries(site).filter((entry) => entry.kind === 'reading');
    const sound = kept.filter(({ time_ms }) => (time_ms - START) % PERIOD_MS === 0);
    expect(sound).toHaveLength(3 * WRONG.length);
    expect(sound.filter(({ channel }) => channel === 'a').map(({ value }) => value)).toEqual(
      WRONG.map((_, i) => 300 + i),
    );
    // Of what came with a fault no number is believed, other than a sound neighbour in an array.
    const faulty = kept.filter(({ time_ms }) => (time_ms - START) % PERIOD_MS === 1);
    expect(
      faulty.filter(({ value }) => !Number.isNaN(value)).map(({ channel }) => channel),
    ).toEqual(['b', 'b']);
  }, 30_000);

  it('are told once by kind, in the log of a real daemon, with topic and a piece of the text', async () => {
    const { path } = siteFile({ mqtt: { embedded_port: 0 } });
    const daemon = new RockhourProcess(['run', '--config', path]);
    const [, page, broker] = / page=(\S+) broker=(\S+)/.exec(await daemon.ready())!;
    const client = await publisher(broker!);
    for (let i = 0; i < 50; i++) {
      await publish(client, 'plant/vellmoor/flow', { value: `hot ${i}` });
      await publish(client, 'plant/vellmoor/hot/axis', { values: [1, 2, 3] });
    }
    const counters = async () =>
      ((await (await fetch(`${page}api/counters`)).json()) as { counters: Record<string, number> })
        .counters;
    await waitFor('the counts', async () => (await counters()).messages === 100);
    expect(await counters()).toMatchObject({ malformed: 50, wrong_length: 50, readings: 0 });
    const said = daemon.stderr.split('\n').filter((line) => line.includes('"warn"'));
    const of = (kind: string) => said.filter((line) => line.includes(`"kind":"${kind}"`));
    expect(of('malformed')).toHaveLength(1);
    expect(of('malformed')[0]).toContain('plant/vellmoor/flow');
    expect(of('malformed')[0]).toContain('hot 0');
    expect(of('wrong_length')).toHaveLength(1);
    expect(await daemon.end('SIGTERM')).toBe(0);
  }, 60_000);
});

describe('a clock that is wrong', () => {
  it('is tolerated as far as the configuration says, and what lies beyond is counted, kept and shown', async () => {
    const at = (ahead_ms: number) => Math.floor((Date.now() + ahead_ms) / PERIOD_MS) * PERIOD_MS;
    for (const [tolerance_s, future] of [
      [3600, 0],
      [60, 3],
    ] as const) {
      const site = smallSite(null, { clock_tolerance_s: tolerance_s });
      const { daemon, broker, part } = await running(site);
      const client = await publisher(broker);
      await publishScan(client, at(-60_000), [300, 310, 320]);
      await publishScan(client, at(600_000), [301, 311, 321]);
      await counted(daemon, 'readings', 6);
      await daemon.caughtUp();
      expect(count(daemon, 'future')).toBe(future);
      if (future > 0) {
        expect(part('unit u').detail).toContain(
          "3 readings stamped ahead of this machine's clock were not used",
        );
      }
      await daemon.stop();
      expect(storedEntries(site).filter((entry) => entry.kind === 'reading')).toHaveLength(6);
    }
  });
});

describe.skipIf(!mosquitto)('a broker', () => {
  it('that refuses the login is said with its reason, tried again, and nothing is lost meanwhile', async () => {
    const service = await startMosquitto(mosquitto!);
    later(() => service.stop());
    // The subscription stands from a first run, so that the broker keeps what comes meanwhile.
    const site = smallSite(service.url);
    const first = await running(site);
    await waitFor('the broker', () => first.part('mqtt').ok);
    await first.daemon.stop();
    const client = await connectAsync(service.url);
    await publishScan(client, START, [300, 310, 320]);
    await client.endAsync();
    const open = await reconfigured(
      service,
      'mosquitto.conf',
      /^allow_anonymous true$/m,
      'allow_anonymous false',
    );
    const { daemon, part } = await running(site);
    await waitFor('the refusal', () => part('mqtt').detail.includes('ot authorized'));
    expect(part('mqtt').ok).toBe(false);
    expect(part('mqtt').detail).toMatch(/^no connection to .* \(.*ot authorized\); keeps trying$/);
    expect(count(daemon, 'readings')).toBe(0);
    await open();
    await waitFor('the broker', () => part('mqtt').ok, 30_000);
    await counted(daemon, 'readings', 3);
    await daemon.stop();
    expect(storedEntries(site).filter((entry) => entry.kind === 'reading')).toHaveLength(3);
  }, 60_000);

  it('that has messages on topics of an older configuration: told, counted, and no longer asked for', async () => {
    const service = await startMosquitto(mosquitto!);
    later(() => service.stop());
    const old = smallSite(service.url);
    const first = await running(old);
    await waitFor('the broker', () => first.part('mqtt').ok);
    await first.daemon.stop();
    const client = await publisher(service.url);
    await publish(client, 'in/e', { time: START, value: 1 });
    await publishScan(client, START, [300, 310, 320]);
    const site = { ...old, sources: old.sources.filter(({ topic }) => topic !== 'in/e') };
    const { daemon, part } = await running(site);
    await waitFor('the broker', () => part('mqtt').ok);
    await counted(daemon, 'readings', 3);
    await counted(daemon, 'unknown_topic', 1);
    // The broker may have one more on its way when it is told.
    const sent: number[] = [];
    for (let i = 1; i < 20 && (i < 3 || sent.at(-1) !== sent.at(-2)); i++) {
      await publish(client, 'in/e', { time: START + i, value: i });
      await publishScan(client, START + i * PERIOD_MS, [300, 310, 320]);
      await counted(daemon, 'readings', 3 * (i + 1));
      sent.push(count(daemon, 'unknown_topic'));
    }
    expect(sent.at(-1)).toBe(sent.at(-2));
    expect(sent.length).toBeLessThan(10);
  }, 60_000);
});

describe.skipIf(!influxd)('an InfluxDB that refuses the login', () => {
  it('is shown with its reason and raises the alert; once it accepts, it gets every estimate', async () => {
    const service = await startInflux(influxd!, await freePort());
    later(() => service.stop());
    await reconfigured(service, 'influxdb.conf', /^log-enabled = false$/m, 'auth-enabled = true');
    const login = 'u=keeper&p=of-keys';
    const ask = async (query: string) => {
      const url = `${service.url}/query?${login}&db=rock&q=${encodeURIComponent(query)}`;
      return (await (await fetch(url, { method: 'POST' })).json()) as {
        results: { series?: { values: [string, number][] }[] }[];
      };
    };
    // Of a user who does not exist yet InfluxDB says the same as of a wrong password.
    await ask("CREATE USER keeper WITH PASSWORD 'of-keys' WITH ALL PRIVILEGES");
    const influx = {
      url: service.url,
      database: 'rock',
      username: 'rockhour',
      password: 'of rocks',
      batch_points: 5000,
    };
    const { daemon, broker, part } = await running(smallSite(null, { influx }));
    const client = await publisher(broker);
    for (let i = 0; i < 10; i++) await publishScan(client, START + i * PERIOD_MS, [i, i, i]);
    await counted(daemon, 'scans', 10);
    await waitFor('the refusal', () => !part('influxdb').ok);
    const { detail } = part('influxdb');
    expect(detail).toMatch(/^it refuses the login of influx.username and its password \(401: /);
    expect(detail).toMatch(/; \d+ entries wait in the local store, none is lost$/);
    expect(detail).not.toContain('of rocks');
    await waitFor('the alert', () =>
      daemon.service.standing().some(({ kind }) => kind === 'database_unreachable'),
    );
    expect(count(daemon, 'influx_set_aside')).toBe(0);
    expect(count(daemon, 'influx_points')).toBe(0);
    // The right password, in the end.
    await ask("CREATE USER rockhour WITH PASSWORD 'of rocks' WITH ALL PRIVILEGES");
    await waitFor(
      'an empty outbox',
      () => part('influxdb').detail === '0 entries to forward',
      40_000,
    );
    const { results } = await ask('select count(state_of_charge) from rockhour_unit');
    expect(results[0]!.series![0]!.values[0]![1]).toBe(10);
    console.info(`refused login, as the health shows it: ${detail}`);
  }, 90_000);
});
