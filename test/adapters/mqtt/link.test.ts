import { once } from 'node:events';
import { type AddressInfo, createServer, type Socket } from 'node:net';
import { connectAsync, type MqttClient } from 'mqtt';
import { afterEach, describe, expect, it } from 'vitest';
import { EmbeddedBroker } from '../../../src/adapters/mqtt/broker.js';
import {
  type Delivery,
  type LinkOptions,
  MqttLink,
  RECEIVE_MAXIMUM,
} from '../../../src/adapters/mqtt/link.js';
import { freePort } from '../../support/ports.js';
import { requireProgram } from '../../support/requirements.js';
import { type Service, startMosquitto } from '../../support/services.js';
import { waitFor } from '../../support/wait.js';

const mosquitto = requireProgram('mosquitto');
/** mosquitto's default for max_inflight_messages. */
const IN_FLIGHT = 20;

const ending: (() => Promise<unknown>)[] = [];
afterEach(async () => {
  for (const end of ending.splice(0).reverse()) await end();
});

interface Harness {
  link: MqttLink;
  came: Delivery[];
  ups: number;
  downs: string[];
  refusals: string[];
}

function startLink(url: string, options: Partial<LinkOptions> = {}): Harness {
  const harness: Omit<Harness, 'link'> = { came: [], ups: 0, downs: [], refusals: [] };
  const link = new MqttLink({
    url: () => url,
    client_id: 'under-test',
    username: null,
    password: null,
    protocol: 4,
    qos: 1,
    topics: ['in/a'],
    will: { topic: 'out/heartbeat', payload: 'offline' },
    receive: (delivery) => harness.came.push(delivery),
    up: () => {
      harness.ups++;
    },
    down: (reason) => harness.downs.push(reason),
    refused: (reason) => harness.refusals.push(reason),
    ...options,
  });
  ending.push(() => link.stop());
  link.start();
  return Object.assign(harness, { link });
}

async function broker(): Promise<Service> {
  const service = await startMosquitto(mosquitto!);
  ending.push(() => service.stop());
  return service;
}

async function client(url: string): Promise<MqttClient> {
  const made = await connectAsync(url);
  ending.push(() => made.endAsync(true));
  return made;
}

async function send(by: MqttClient, from: number, to: number): Promise<void> {
  const sent: Promise<unknown>[] = [];
  for (let i = from; i < to; i++) sent.push(by.publishAsync('in/a', String(i), { qos: 1 }));
  await Promise.all(sent);
}

const pause = (ms: number) => new Promise((resolve) => setTimeout(resolve, ms));
const texts = (came: readonly Delivery[]) => came.map((one) => Number(one.payload.toString()));
const upTo = (end: number) => Array.from({ length: end }, (_, i) => i);

describe.skipIf(!mosquitto).each([4, 5] as const)(
  'the link to mosquitto, MQTT protocol %i',
  (protocol) => {
    const inFlight = protocol === 4 ? IN_FLIGHT : RECEIVE_MAXIMUM;

    it('hands on all that the broker lets in flight at once, and an acknowledgement brings more', async () => {
      const { url } = await broker();
      const { came, ...rest } = startLink(url, { protocol });
      await waitFor('the subscription', () => rest.link.connected);
      await send(await client(url), 0, inFlight + 64);
      await waitFor('all in flight', () => came.length === inFlight);
      await pause(200);
      expect(came).toHaveLength(inFlight);
      came[0]?.acknowledge?.();
      // mosquitto 2.0.11 sends another twenty on each PUBACK, not one.
      await waitFor('more', () => came.length > inFlight);
      let next = 1;
      await waitFor('all', () => {
        while (next < came.length) came[next++]?.acknowledge?.();
        return came.length === inFlight + 64;
      });
      expect(texts(came)).toEqual(upTo(inFlight + 64));
      expect(came.some((one) => one.duplicate)).toBe(false);
    });

    it('gets again after a crash what it had not acknowledged, and nothing else', async () => {
      const { url } = await broker();
      const first = startLink(url, { protocol });
      await waitFor('the subscription', () => first.link.connected);
      const publisher = await client(url);
      await send(publisher, 0, 10);
      await waitFor('ten', () => first.came.length === 10);
      for (const one of first.came.slice(0, 6)) one.acknowledge?.();
      await pause(50);
      // As the operating system would after a kill: no DISCONNECT goes out.
      (first.link as unknown as { client: MqttClient }).client.stream.destroy();
      await first.link.stop();
      await send(publisher, 10, 15);
      const second = startLink(url, { protocol });
      await waitFor('the rest', () => second.came.length >= 9);
      await pause(100);
      expect(texts(second.came)).toEqual([6, 7, 8, 9, 10, 11, 12, 13, 14]);
      expect(second.came.map((one) => one.duplicate)).toEqual([
        ...[true, true, true, true],
        ...[false, false, false, false, false],
      ]);
    });

    it('lets an acknowledgement of a lost connection go nowhere, so that none is taken for another message', async () => {
      const service = await broker();
      const { came, ups, ...rest } = startLink(service.url, { protocol });
      void ups;
      await waitFor('the subscription', () => rest.link.connected);
      const publisher = await client(service.url);
      await send(publisher, 0, 3);
      await waitFor('three', () => came.length === 3);
      const stale = came.splice(0);
      (rest.link as unknown as { client: MqttClient }).client.stream.destroy();
      await waitFor('the same three again', () => came.length === 3);
      for (const one of stale) one.acknowledge?.();
      await send(publisher, 3, inFlight + 20);
      await waitFor('all in flight', () => came.length === inFlight);
      await pause(100);
      // Had the stale ones counted, three more would have come.
      expect(texts(came)).toEqual(upTo(inFlight));
    });

    it('publishes retained, and the broker its last will when it is gone without a word', async () => {
      const { url } = await broker();
      const { link } = startLink(url, { protocol });
      await waitFor('the connection', () => link.connected);
      expect(link.publish('out/heartbeat', 'online')).toBe(true);
      for (let i = 0; i < 100; i++) link.publish('out/state', String(i));
      const seen = new Map<string, string>();
      await pause(100);
      const listener = await client(url);
      listener.on('message', (topic, payload) => seen.set(topic, payload.toString()));
      await listener.subscribeAsync('out/#', { qos: 1 });
      await waitFor('what is retained', () => seen.get('out/state') === '99');
      expect(seen.get('out/heartbeat')).toBe('online');
      (link as unknown as { client: MqttClient }).client.options.reconnectPeriod = 0;
      (link as unknown as { client: MqttClient }).client.stream.destroy();
      await waitFor('the last will', () => seen.get('out/heartbeat') === 'offline');
    });
  },
);

describe.skipIf(!mosquitto)('the link to a broker that comes and goes', () => {
  it('acknowledges what a session still held, though it comes before its own messages are through', async () => {
    const connack = [0x20, 2, 1, 0];
    const publish = (id: number) => [0x32, 9, 0, 4, ...Buffer.from('in/a'), 0, id, id];
    const puback = (id: number) => [0x40, 2, 0, id];
    const sockets: Socket[] = [];
    let said = Buffer.alloc(0);
    const server = createServer((socket) => {
      sockets.push(socket);
      said = Buffer.alloc(0);
      const isSecond = sockets.length > 1;
      socket.on('error', () => undefined);
      socket.once('data', () => {
        const held = isSecond ? [...publish(1), ...publish(2)] : [];
        socket.write(Buffer.from([...connack, ...held]));
        socket.on('data', (bytes) => {
          said = Buffer.concat([said, bytes]);
        });
      });
      ending.push(async () => socket.destroy());
    });
    server.listen(0, '127.0.0.1');
    await once(server, 'listening');
    ending.push(async () => server.close());
    const { port } = server.address() as AddressInfo;
    const { link, came, ...harness } = startLink(`mqtt://127.0.0.1:${port}`, { topics: [] });
    await waitFor('the link', () => link.connected);
    link.publish('out/state', 'x');
    await waitFor('its message', () => said.includes('out/state'));
    // Gone before it has acknowledged that: MQTT.js sends it again, and is not connected until then.
    sockets[0]!.destroy();
    await waitFor('what was held', () => came.length === 2);
    came[0]!.acknowledge!();
    await waitFor('its message again', () => said.includes('out/state'));
    const at = said.indexOf('out/state') + 'out/state'.length;
    expect(link.connected).toBe(false);
    sockets[1]!.write(Buffer.from([0x40, 2, said[at]!, said[at + 1]!]));
    await waitFor('the link again', () => link.connected);
    came[1]!.acknowledge!();
    for (const id of [1, 2]) {
      await waitFor(`acknowledgement ${id}`, () => said.includes(Buffer.from(puback(id))));
    }
    expect(harness.downs).toHaveLength(1);
  });

  it('ends at once what waits for the word of a broker that hangs, as it is ended itself', async () => {
    const server = createServer((socket) => {
      socket.on('error', () => undefined);
      socket.once('data', () => {
        socket.write(Buffer.from([0x20, 2, 0, 0]));
        socket.resume();
      });
      ending.push(async () => socket.destroy());
    });
    server.listen(0, '127.0.0.1');
    await once(server, 'listening');
    ending.push(async () => server.close());
    const { port } = server.address() as AddressInfo;
    const { link } = startLink(`mqtt://127.0.0.1:${port}`, { topics: [] });
    await waitFor('the link', () => link.connected);
    const told = link.deliver('out/event', 'x', 60_000).then(
      () => 'taken',
      (thrown: Error) => thrown.message,
    );
    await link.stop();
    expect(await told).toBe('the link was ended');
  });

  it('tells an outage once, keeps trying and subscribes again', async () => {
    const port = await freePort();
    const harness = startLink(`mqtt://127.0.0.1:${port}`);
    await waitFor('the first failure', () => harness.downs.length === 1);
    await pause(2500);
    expect(harness.downs).toHaveLength(1);
    expect(harness.downs[0]).toContain('ECONNREFUSED');
    expect(harness.link.publish('out/state', 'x')).toBe(false);
    const service = await startMosquitto(mosquitto!, port);
    ending.push(() => service.stop());
    await waitFor('the connection', () => harness.ups === 1);
    await service.stop();
    await waitFor('the outage', () => harness.downs.length === 2);
    await service.start();
    await waitFor('the second connection', () => harness.ups === 2);
    await send(await client(service.url), 0, 3);
    await waitFor('three messages', () => harness.came.length === 3);
    expect(harness.downs).toHaveLength(2);
  });
});

describe('the embedded broker', () => {
  it('carries messages at least once to the link, and names a port that is taken', async () => {
    const own = new EmbeddedBroker('127.0.0.1', 0);
    await own.start();
    ending.push(() => own.stop());
    const { came, link } = startLink(own.url);
    await waitFor('the subscription', () => link.connected);
    await send(await client(own.url), 0, 200);
    let next = 0;
    await waitFor('all', () => {
      while (next < came.length) came[next++]?.acknowledge?.();
      return came.length >= 200;
    });
    expect(texts(came)).toEqual(upTo(200));
    const taken = Number(new URL(own.url).port);
    await expect(new EmbeddedBroker('127.0.0.1', taken).start()).rejects.toThrow(
      new RegExp(`cannot listen on 127.0.0.1:${taken}`),
    );
  });

  it('ends while clients are connected', async () => {
    const own = new EmbeddedBroker('127.0.0.1', 0);
    await own.start();
    const { link } = startLink(own.url);
    await waitFor('the subscription', () => link.connected);
    await own.stop();
    await own.stop();
    await waitFor('the outage', () => !link.connected);
  });
});
