import { connectAsync, type MqttClient } from 'mqtt';
import { describe, expect, it } from 'vitest';
import { hashOf, makeToken } from '../../src/access/token.js';
import type { SiteConfig, SparkplugSource } from '../../src/config/site.js';
import { EdgeNode, outside, type Sent } from '../adapters/mqtt/sparkplug/edge.js';
import { StrictHost } from '../adapters/mqtt/sparkplug/strictHost.js';
import { requireProgram } from '../support/requirements.js';
import { type Service, startMosquitto } from '../support/services.js';
import { counted, later, makeDaemon, publisher, publishScan, storedEntries } from './harness.js';
import { smallSite } from './site.js';

const mosquitto = requireProgram('mosquitto');

async function broker(): Promise<Service> {
  const service = await startMosquitto(mosquitto!);
  later(() => service.stop());
  return service;
}

const source = (channel: string): SparkplugSource => ({
  ...{ unit: 'u', channel, metric: `Bed/${channel}` },
  ...{ group: 'Quarry', node: 'PLC1', device: 'Bed' },
});
/** The small site with all channels by Sparkplug, as a plant of edge nodes alone has them. */
function edgeSite(url: string | null): SiteConfig {
  return smallSite(url, { sources: [], sparkplug: ['a', 'b', 'c', 'e'].map(source) });
}

const say = (client: MqttClient, { topic, payload }: Sent) =>
  client.publishAsync(topic, payload, { qos: 0 });
const metrics = (value: number, withAlias = true) =>
  ['a', 'b', 'c', 'e'].map((id, i) => ({
    ...{ name: `Bed/${id}`, type: 'Double' as const, value: value + i },
    ...(withAlias ? { alias: 100 + i } : {}),
  }));
/** The same by alias alone. */
const byAlias = (value: number) =>
  metrics(value).map(({ name: _, ...rest }) => rest as typeof rest & { name: string });

/** A plant's edge node at a real broker, which is born when it is asked to. */
async function plant(url: string, edge: EdgeNode, value: () => number) {
  const client = await publisher(url);
  const asked: string[] = [];
  const birth = async () => {
    await say(client, edge.birth(Date.now()));
    await say(client, edge.deviceBirth('Bed', Date.now(), metrics(value())));
  };
  client.on('message', (topic, payload) => {
    const [metric] = outside.decodePayload(payload).metrics ?? [];
    asked.push(`${topic} ${metric?.name} ${metric?.value}`);
    void birth();
  });
  await client.subscribeAsync(edge.topic('NCMD', null), { qos: 1 });
  return { client, asked, birth };
}

describe.skipIf(!mosquitto)('edge nodes at a real broker', () => {
  it('are asked for a birth, give data by alias, die and come back, over a restart of rockhour', async () => {
    const { url } = await broker();
    const edge = new EdgeNode();
    let value = 10;
    const { client, asked, birth } = await plant(url, edge, () => value);
    const site = edgeSite(url);
    const first = makeDaemon(site);
    await first.start();
    await counted(first, 'sparkplug_births', 2);
    expect(asked).toEqual(['spBv1.0/Quarry/NCMD/PLC1 Node Control/Rebirth true']);
    value = 20;
    await say(client, edge.data('Bed', Date.now(), byAlias(value)));
    await counted(first, 'sparkplug_data', 1);
    await say(client, edge.death());
    await counted(first, 'sparkplug_made_missing', 4);
    // The edge node comes back by another connection.
    edge.bdSeq = 1;
    value = 30;
    await birth();
    await counted(first, 'sparkplug_births', 4);
    await first.caughtUp();
    await first.stop();

    // What it says while rockhour is away is lost: QoS 0.
    await say(client, edge.data('Bed', Date.now(), byAlias(35)));
    const second = makeDaemon(site);
    await second.start();
    value = 40;
    await counted(second, 'sparkplug_births', 2);
    expect(asked).toHaveLength(2);
    expect(second.service.counters()).toMatchObject({
      ...{ sparkplug_seq_gaps: 0, sparkplug_unknown_aliases: 0, sparkplug_made_missing: 4 },
    });
    await second.stop();
    const told = storedEntries(site).flatMap((entry) =>
      entry.kind === 'reading' && entry.channel === 'a' ? [entry.value] : [],
    );
    expect(told.slice(0, 5)).toEqual([10, 20, Number.NaN, 30, Number.NaN]);
    expect(told[5]).toBeGreaterThanOrEqual(30);
  });

  it('have their births and deaths mixed with topics of JSON', async () => {
    const { url } = await broker();
    const edge = new EdgeNode();
    const { client } = await plant(url, edge, () => 1);
    const site = smallSite(url, { sparkplug: [source('e')] });
    const daemon = makeDaemon({
      ...site,
      sources: site.sources.filter(({ channels }) => !channels.includes('e')),
    });
    await daemon.start();
    await counted(daemon, 'sparkplug_births', 2);
    const now = Date.now();
    await publishScan(client, now, [1, 2, 3]);
    await counted(daemon, 'readings', 4);
    const parts = daemon.service.health().filter(({ name }) => name.startsWith('edge node'));
    expect(parts).toEqual([{ name: 'edge node Quarry/PLC1', ok: true, detail: 'alive' }]);
    await say(client, edge.deviceDeath('Bed', now + 1));
    await counted(daemon, 'sparkplug_made_missing', 1);
    expect(daemon.service.health().find(({ name }) => name.startsWith('edge node'))).toMatchObject({
      ...{ ok: false, detail: 'Bed dead' },
    });
  });
});

describe('its own broker, once it asks for tokens', () => {
  it('lets a feed be an edge node: born, and dead by its will', async () => {
    const token = makeToken();
    const site = edgeSite(null);
    const daemon = makeDaemon({
      ...site,
      mqtt: { ...site.mqtt, sparkplug_node: { group: 'Out', node: 'rockhour' } },
      http: { ...site.http, tokens: [{ name: 'plc', role: 'feed', hash: hashOf(token) }] },
    });
    const { broker: url } = await daemon.start();
    const edge = new EdgeNode();
    const { topic, payload } = edge.death();
    const client = await connectAsync(url, {
      ...{ username: 'plc', password: token, reconnectPeriod: 0 },
      will: { topic, payload, qos: 1, retain: false },
    });
    later(() => client.endAsync(true));
    await say(client, edge.birth(Date.now()));
    await say(client, edge.data('Bed', Date.now(), byAlias(1)));
    await counted(daemon, 'sparkplug_before_birth', 1);
    await say(client, edge.deviceBirth('Bed', Date.now(), metrics(1)));
    await counted(daemon, 'readings', 4);
    client.stream.destroy();
    await counted(daemon, 'sparkplug_made_missing', 4);
    // rockhour's own node came in by its link's log-in.
    await counted(daemon, 'sparkplug_own_births', 1);
    expect(daemon.service.counters()).toMatchObject({
      ...{ sparkplug_births: 2, sparkplug_deaths: 1, broker_publishes_refused: 0 },
    });
  });
});

describe.skipIf(!mosquitto)('rockhour as an edge node at a real broker', () => {
  const own = (url: string, folder?: string): SiteConfig => {
    const site = smallSite(url, folder === undefined ? {} : { folder });
    return { ...site, mqtt: { ...site.mqtt, sparkplug_node: { group: 'Out', node: 'rockhour' } } };
  };

  async function watcher(url: string) {
    const host = new StrictHost();
    const client = await publisher(url);
    client.on('message', (topic, payload, packet) => {
      if (!topic.includes('CMD')) host.receive(topic, payload, packet.retain, packet.qos);
    });
    await client.subscribeAsync('spBv1.0/Out/#', { qos: 1 });
    const kinds = () => host.heard.map(({ kind }) => kind);
    const rebirth = () =>
      client.publishAsync(
        'spBv1.0/Out/NCMD/rockhour',
        Buffer.from(
          outside.encodePayload({
            metrics: [{ name: 'Node Control/Rebirth', type: 'Boolean', value: true }],
          }),
        ),
      );
    return { host, client, kinds, rebirth };
  }

  it('keeps the order of births and data, the sequence, and counts its connections over restarts', async () => {
    const { url } = await broker();
    const { host, client, kinds, rebirth } = await watcher(url);
    const site = own(url);
    const first = makeDaemon(site);
    await first.start();
    await expect.poll(kinds, { timeout: 5000 }).toEqual(['NBIRTH']);
    const now = Math.floor(Date.now() / 30_000) * 30_000;
    for (let i = 4; i >= 0; i--) {
      await publishScan(client, now - i * 30_000, [i, 2, 3]);
      await counted(first, 'scans_complete', 5 - i);
    }
    await expect.poll(() => kinds().filter((kind) => kind === 'DDATA').length).toBeGreaterThan(0);
    await rebirth();
    await expect.poll(() => host.of('NBIRTH').length, { timeout: 5000 }).toBe(2);
    await expect.poll(() => host.of('DBIRTH').length).toBe(2);
    await first.stop();
    await expect.poll(() => kinds().at(-1)).toBe('NDEATH');

    const second = makeDaemon(site);
    await second.start();
    await expect.poll(() => host.of('NBIRTH').length, { timeout: 5000 }).toBe(3);
    expect(host.of('NBIRTH').map(({ bdSeq }) => bdSeq)).toEqual([0, 0, 1]);
    expect(host.wrongs).toEqual([]);
  });

  it('is told dead by its will, and is born anew with the next number', async () => {
    const service = await broker();
    const site = own(service.url);
    const daemon = makeDaemon(site);
    await daemon.start();
    const part = () =>
      daemon.service.health().find(({ name }) => name === 'own edge node Out/rockhour')!;
    await expect.poll(() => part().ok, { timeout: 5000 }).toBe(true);
    const { host, client } = await watcher(service.url);
    // Whoever comes with its client id pushes it out: the broker then says its will.
    const clientId = 'rockhour-test-sparkplug';
    const other = await connectAsync(service.url, { clientId, reconnectPeriod: 0 });
    later(() => other.endAsync(true));
    await expect.poll(() => host.of('NDEATH').length, { timeout: 5000 }).toBe(1);
    expect(host.of('NDEATH')[0]!.bdSeq).toBe(0);
    await expect.poll(() => host.of('NBIRTH').length, { timeout: 5000 }).toBe(1);
    expect(host.of('NBIRTH')[0]!.bdSeq).toBe(1);
    await client.endAsync(true);
  });

  it('comes back after the broker was away', async () => {
    const service = await broker();
    const daemon = makeDaemon(own(service.url));
    await daemon.start();
    await counted(daemon, 'sparkplug_own_births', 1);
    await service.stop();
    await service.start();
    await counted(daemon, 'sparkplug_own_births', 2);
    const { host, rebirth } = await watcher(service.url);
    await rebirth();
    await expect.poll(() => host.of('NBIRTH').length, { timeout: 5000 }).toBe(1);
    expect(host.of('NBIRTH')[0]!.bdSeq).toBe(1);
  });
});
