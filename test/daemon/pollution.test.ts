import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { Door } from '../../src/adapters/mqtt/door.js';
import { TopicSet } from '../../src/adapters/mqtt/topicRules.js';
import { parseSite } from '../../src/config/parse.js';
import { holders } from '../access/holders.js';
import { EdgeNode } from '../adapters/mqtt/sparkplug/edge.js';
import { count, counted, makeDaemon, publisher, publishScan, storedEntries } from './harness.js';
import { PERIOD_MS, smallSite } from './site.js';

const demo = readFileSync(new URL('../../config/demo.yaml', import.meta.url), 'utf8');
const START = Math.floor((Date.now() - 3_600_000) / PERIOD_MS) * PERIOD_MS;
const EARLIER = START - 2 * PERIOD_MS;
const NAMES = ['__proto__', 'constructor', 'prototype', 'toString', 'hasOwnProperty'];
const HOSTILE = [
  '{"__proto__": {"value": 1, "time": 1, "polluted": true}}',
  `{"constructor": {"prototype": {"polluted": true}}, "value": 1, "time": ${EARLIER}}`,
  '{"value": {"__proto__": {"polluted": true}}}',
  `{"value": 1, "quality": "__proto__", "time": ${EARLIER}}`,
  `{"value": 1, "quality": "constructor", "time": ${EARLIER}}`,
  '{"value": 1, "time": "__proto__"}',
  '{"value": "toString"}',
  '{"values": {"__proto__": [1]}}',
  '["__proto__"]',
  '"__proto__"',
];

/** What every object has: it is the same before and behind, and empty objects have nothing more. */
function common() {
  const own = [Object.prototype, Array.prototype, Function.prototype, Buffer.prototype].map((one) =>
    Reflect.ownKeys(one).map(String),
  );
  const seen: string[] = [];
  for (const key in {}) seen.push(key);
  return JSON.stringify([own, seen, ({} as { polluted?: unknown }).polluted]);
}

describe('nothing that every object has is changed', () => {
  it('by readings and commands over MQTT, and the scans beside them are made', async () => {
    const before = common();
    const site = smallSite(null);
    const daemon = makeDaemon(site);
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    for (const payload of HOSTILE) {
      for (const topic of ['in/a', 'in/b', 'rockhour/u/alarms/command']) {
        await client.publishAsync(topic, payload, { qos: 1 });
      }
    }
    for (const name of NAMES) {
      const command = `{"action": "${name}", "id": "u/${name}/x", "who": "${name}", "why": "x"}`;
      await client.publishAsync('rockhour/u/alarms/command', command, { qos: 1 });
      await client.publishAsync(`in/${name}`, '{"value": 1}', { qos: 1, retain: true });
      await client.publishAsync(name, '{"value": 1}', { qos: 1, retain: true });
      const other = await publisher(broker);
      await other.subscribeAsync([name, `${name}/#`], { qos: 1 });
      await other.unsubscribeAsync(name);
      await other.endAsync();
    }
    for (let n = 0; n < 4; n++) await publishScan(client, START + n * PERIOD_MS, [n, n, n, n]);
    await expect.poll(() => count(daemon, 'scans')).toBeGreaterThanOrEqual(3);
    expect(count(daemon, 'malformed')).toBeGreaterThan(5);
    await daemon.stop();
    const values = storedEntries(site).flatMap((one) => (one.kind === 'reading' ? [one] : []));
    expect(values.filter(({ channel }) => !['a', 'b', 'c', 'e'].includes(channel))).toEqual([]);
    expect(common()).toBe(before);
  }, 30_000);

  it('by metrics, devices and nodes of Sparkplug B', async () => {
    const before = common();
    const group = { group: 'Quarry', node: 'PLC1', device: 'Bed' };
    const sparkplug = ['a', 'b', 'c', 'e'].map((channel) => ({
      ...{ unit: 'u', channel, metric: `Bed/${channel}`, ...group },
    }));
    const site = smallSite(null, { sources: [], sparkplug });
    const daemon = makeDaemon(site);
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    const edge = new EdgeNode();
    const say = ({ topic, payload }: { topic: string; payload: Buffer }) =>
      client.publishAsync(topic, payload, { qos: 1 });
    const evil = NAMES.map((name, i) => ({
      ...{ name, alias: 200 + i, type: 'Double' as const, value: i },
    }));
    const good = ['a', 'b', 'c', 'e'].map((id, i) => ({
      ...{ name: `Bed/${id}`, type: 'Double' as const, value: i, alias: i + 1 },
    }));
    await say(edge.birth(Date.now(), evil));
    await say(edge.deviceBirth('Bed', Date.now(), [...evil, ...good]));
    for (const name of NAMES) await say(edge.deviceBirth(name, Date.now(), evil));
    for (const name of NAMES) {
      const other = new EdgeNode('Quarry', name);
      await say(other.birth(Date.now(), evil));
      await say(new EdgeNode(name, 'PLC1').birth(Date.now(), evil));
    }
    await counted(daemon, 'sparkplug_births', 2);
    await say(edge.data('Bed', Date.now(), [...evil, ...good]));
    await expect.poll(() => count(daemon, 'readings')).toBeGreaterThanOrEqual(4);
    await daemon.stop();
    expect(common()).toBe(before);
  }, 30_000);

  it('by a command that is signed with the name of a token', () => {
    const before = common();
    const { access, tokens } = holders();
    const door = new Door({
      ...{ access, own_ids: [], out_prefix: 'rockhour', commands: ['c'] },
      readings: new TopicSet([]),
      refused: () => undefined,
    });
    const client = { id: 'x' } as never;
    door.rules.authenticate?.(
      client,
      'a_configure',
      Buffer.from(tokens.configure),
      () => undefined,
    );
    const text = '{"__proto__": {"action": "acknowledge", "who": "boss"}, "id": "a"}';
    const packet = { cmd: 'publish', topic: 'c', payload: Buffer.from(text) } as never;
    door.rules.authorizePublish?.(client, packet, () => undefined);
    const signed = JSON.parse((packet as { payload: Buffer }).payload.toString());
    // What it takes from elsewhere is no action, and who says so is the token alone.
    expect(signed.who).toMatch(/^a_configure/);
    expect(Object.hasOwn(signed, 'action')).toBe(false);
    expect(common()).toBe(before);
  });

  it.each([
    ['a key at the top', '__proto__: {polluted: true}', '__proto__'],
    ['a key within', 'http: {__proto__: {polluted: true}}', 'http.__proto__'],
    ['a constructor', 'constructor: {prototype: {polluted: true}}', 'constructor'],
    ['a key of an anchor', 'http: &a {__proto__: {port: 1}}\nstore: *a', 'http.__proto__'],
    ['a merge key', 'http: &a {port: 1}\nstore: {<<: *a}', 'store.<<'],
    ['a merge key with a prototype', 'mqtt: {<<: {__proto__: {polluted: true}}}', 'mqtt.<<'],
    ['a name', 'units: [{id: __proto__}]', 'units[0].id'],
    ['a channel', demo.replace('id: flow', 'id: __proto__'), 'units[0].channels[0].id'],
  ])('by a configuration with %s, and the fault names its field', (_, text, field) => {
    const before = common();
    const { faults } = parseSite(text, '.', {});
    expect(faults?.map(({ path }) => path)).toContain(field);
    expect(common()).toBe(before);
  });

  it('and aliases that grow without end are refused before they do', () => {
    const levels = Array.from({ length: 12 }, (_, n) =>
      n === 0
        ? 'a0: &a0 [x]'
        : `a${n}: &a${n} [${Array(10)
            .fill(`*a${n - 1}`)
            .join(', ')}]`,
    );
    const before = process.memoryUsage().heapUsed;
    const { faults } = parseSite(levels.join('\n'), '.', {});
    expect(faults?.[0]?.found).toBe('aliases (*) that cannot be followed');
    expect(process.memoryUsage().heapUsed - before).toBeLessThan(100e6);
    for (const deep of ['['.repeat(1e5), 'a: '.concat('{b: '.repeat(2e4))]) {
      expect(parseSite(deep, '.', {}).faults?.length).toBeGreaterThan(0);
    }
  });
});
