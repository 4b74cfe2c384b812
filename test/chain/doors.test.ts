import { readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { request } from 'node:https';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { connectAsync, type MqttClient } from 'mqtt';
import { afterEach, describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { ROLES, type Role } from '../../src/access/role.js';
import { holders } from '../access/holders.js';
import { EdgeNode } from '../adapters/mqtt/sparkplug/edge.js';
import { Receiver } from '../adapters/notify/receiver.js';
import { RockhourProcess } from '../daemon/processes.js';
import { siteFile } from '../daemon/siteFile.js';
import { makeCertificates } from '../support/certificates.js';
import { temporaryFolder } from '../support/folders.js';
import { freePort } from '../support/ports.js';
import { requireProgram } from '../support/requirements.js';

const DEMO = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));
const PLANTED = { influx: 'planted-influx-41c7', webhook: 'planted-webhook-08be' };
const UNIT = '/api/units/vellmoor';
const ends: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
});

/** What each role, and nobody, is answered: a row for each kind of route in the table of all. */
const SEEN = [
  ['GET', '/api/live', { nobody: 200, feed: 200, view: 200, acknowledge: 200, configure: 200 }],
  ['GET', '/api/login', { nobody: 200, feed: 200, view: 200, acknowledge: 200, configure: 200 }],
  ['GET', UNIT, { nobody: 401, feed: 403, view: 200, acknowledge: 200, configure: 200 }],
  ['GET', '/metrics', { nobody: 401, feed: 403, view: 200, acknowledge: 200, configure: 200 }],
  [
    ...['POST', '/api/alarms/acknowledge'],
    { nobody: 401, feed: 403, view: 403, acknowledge: 404, configure: 404 },
  ],
  [
    ...['POST', '/api/alarms/out-of-service'],
    { nobody: 401, feed: 403, view: 403, acknowledge: 403, configure: 404 },
  ],
  [
    ...['GET', `${UNIT}/backup`],
    { nobody: 401, feed: 403, view: 403, acknowledge: 403, configure: 200 },
  ],
] as [string, string, Record<Role | 'nobody', number>][];

/** The demonstration's unit with its flow from an edge node, and an alert as soon as it may be. */
function units(): object[] {
  const site = parse(readFileSync(DEMO, 'utf8')) as { units: { channels: { id: string }[] }[] };
  const flow = { group: 'Quarry', node: 'PLC1', device: 'Loop' };
  return site.units.map((unit) => ({
    ...unit,
    estimator: { cells: 40 },
    watch: { database_down: { on_delay_s: 0, off_delay_s: 0 } },
    channels: unit.channels.map((channel) =>
      channel.id === 'flow'
        ? { ...channel, payload: 'sparkplug', metric: 'Loop/Flow', sparkplug: flow }
        : channel,
    ),
  }));
}

describe.skipIf(!requireProgram('openssl'))('all doors of a daemon at once', () => {
  it('let in who may, carry a reading through, tell who is to be told, and show no secret', async () => {
    const made = makeCertificates();
    const server = made.make('rockhour', ['127.0.0.1', 'localhost']);
    const ca = readFileSync(made.ca);
    const { tokens, list } = holders();
    const secrets = temporaryFolder('planted');
    const at = (name: keyof typeof PLANTED) => {
      writeFileSync(join(secrets, name), `${PLANTED[name]}\n`, { mode: 0o600 });
      return join(secrets, name);
    };
    const own = { cert_file: server.cert, key_file: server.key };
    const receiver = new Receiver(() => 200, made.make('receiver', ['127.0.0.1']));
    const hook = await receiver.start();
    ends.push(() => receiver.stop());
    const { path, folder } = siteFile({
      units: units(),
      mqtt: {
        ...{ embedded_port: 0, embedded_tls: own },
        sparkplug_node: { group: 'Quarry', node: 'rockhour' },
      },
      // Nobody listens there, which is what the receiver is told of.
      influx: {
        ...{ url: `http://127.0.0.1:${await freePort()}`, username: 'rock' },
        password_file: at('influx'),
      },
      notify: {
        webhooks: [
          { id: 'hook', url: hook, secret_file: at('webhook'), tls: { ca_file: made.ca } },
        ],
      },
      http: { port: 0, tls: own, tokens: list },
    } as Record<string, object>);
    const daemon = new RockhourProcess(['run', '--config', path, '--log-level', 'trace']);
    ends.push(() => daemon.end('SIGKILL'));
    const ready = await daemon.ready();
    const [, page, broker] = /page=(\S+) broker=(\S+)/.exec(ready)!;
    expect([page, broker]).toEqual([
      expect.stringMatching(/^https:/),
      expect.stringMatching(/^mqtts:/),
    ]);

    const said: string[] = [];
    const ask = (method: string, route: string, token?: string, body?: object) =>
      new Promise<{ status: number; body: string }>((resolve, reject) => {
        const asked = request(new URL(route, page), {
          ...{ method, ca, agent: false },
          headers: {
            ...(token === undefined ? {} : { authorization: `Bearer ${token}` }),
            ...(body === undefined ? {} : { 'content-type': 'application/json' }),
          },
        });
        asked.on('error', reject);
        asked.on('response', (answer) => {
          const parts: Buffer[] = [];
          answer.on('data', (part: Buffer) => parts.push(part));
          answer.on('end', () => {
            const text = Buffer.concat(parts).toString('latin1');
            said.push(JSON.stringify(answer.rawHeaders), text);
            resolve({ status: answer.statusCode ?? 0, body: text });
          });
        });
        asked.end(body === undefined ? undefined : JSON.stringify(body));
      });
    const counters = async () =>
      JSON.parse((await ask('GET', '/api/counters', tokens.view)).body).counters;

    // In: an edge node tells the flow, another gateway the rest; by TLS, with the token of a feed.
    const enter = async (role: Role, password = tokens[role]): Promise<MqttClient> => {
      const client = await connectAsync(broker!, {
        ...{ username: `a_${role}`, password, ca, reconnectPeriod: 0 },
      });
      client.on('message', (topic, payload) => said.push(`${topic} ${payload}`));
      ends.push(() => client.endAsync(true));
      return client;
    };
    await expect(enter('feed', `${tokens.feed}-not`)).rejects.toThrow(/authorized/i);
    const [edge, gateway, viewer] = [await enter('feed'), await enter('feed'), await enter('view')];
    await viewer.subscribeAsync('rockhour/#', { qos: 1 });
    const node = new EdgeNode('Quarry', 'PLC1');
    const now = Date.now();
    for (const { topic, payload } of [
      node.birth(now - 40_000),
      node.deviceBirth('Loop', now - 40_000, [{ name: 'Loop/Flow', type: 'Double', value: 17.25 }]),
    ]) {
      await edge.publishAsync(topic, payload, { qos: 0 });
    }
    for (const time of [now - 40_000, now - 10_000]) {
      const say = (topic: string, content: object) =>
        gateway.publishAsync(`plant/vellmoor/${topic}`, JSON.stringify({ time, ...content }), {
          qos: 1,
        });
      for (const string of ['axis', 'middle', 'rim']) {
        await say(`hot/${string}`, { values: Array.from({ length: 14 }, (_, i) => 450 - i) });
        await say(`cold/${string}`, { values: Array.from({ length: 14 }, (_, i) => -120 + i) });
      }
      await say('mode', { value: 'charge' });
      await say('power', { value: 1.5 });
    }
    await expect
      .poll(
        async () => {
          const { body } = await ask('GET', UNIT, tokens.view);
          return (JSON.parse(body) as { flow_kg_s?: number }).flow_kg_s;
        },
        { timeout: 15_000 },
      )
      .toBe(17.25);
    expect(await counters()).toMatchObject({
      ...{ broker_logins_refused: 1, broker_publishes_refused: 0, sparkplug_births: 2 },
    });
    // Out: as an edge node itself, and to the receiver, signed.
    await expect.poll(async () => (await counters()).sparkplug_own_births).toBeGreaterThan(0);
    await expect.poll(() => receiver.got.length).toBeGreaterThan(0);
    expect(receiver.got[0]!.body).toContain('"database_unreachable"');
    expect(receiver.got[0]!.headers['webhook-signature']).toMatch(/^v1,/);
    const isTold = (text: string) => text.startsWith('rockhour/vellmoor/state {');
    await expect.poll(() => said.some(isTold)).toBe(true);

    // Each role on a route of each kind.
    for (const [method, route, seen] of SEEN) {
      const found: Record<string, number> = {};
      for (const who of ['nobody', ...ROLES] as const) {
        const token = who === 'nobody' ? undefined : tokens[who];
        const body = method === 'POST' ? { id: 'u/none/such', why: 'x' } : undefined;
        found[who] = (await ask(method, route, token, body)).status;
      }
      expect([method, route, found]).toEqual([method, route, seen]);
    }
    for (const route of [`/api/nothing/${tokens.view}`, `/api/units?token=${tokens.view}`]) {
      await ask('GET', route, tokens.view);
    }
    await ask('GET', '/api/health', tokens.view);

    expect(await daemon.end('SIGTERM')).toBe(0);
    const files = readdirSync(folder).map((name) => readFileSync(join(folder, name), 'latin1'));
    expect(files.length).toBeGreaterThan(1);
    const forAll = readdirSync(folder).filter((name) => statSync(join(folder, name)).mode & 7);
    expect([statSync(folder).mode & 7, forAll]).toEqual([0, []]);
    const everything = [daemon.stdout, daemon.stderr, ...said, ...files].join('\n');
    const key = readFileSync(server.key, 'utf8').split('\n')[1]!;
    const planted = { ...PLANTED, ...tokens, key };
    const shown = Object.entries(planted).filter(([, secret]) => everything.includes(secret));
    expect(shown.map(([name]) => name)).toEqual([]);
    expect(list.filter(({ hash }) => everything.includes(hash))).toEqual([]);
    expect(receiver.got.map(({ body }) => body).join()).not.toContain(PLANTED.webhook);
  }, 60_000);
});
