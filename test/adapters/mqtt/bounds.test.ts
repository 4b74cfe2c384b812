import { connect as connectPlainly, type Socket } from 'node:net';
import { setFlagsFromString } from 'node:v8';
import { runInNewContext } from 'node:vm';
import { connectAsync, type MqttClient } from 'mqtt';
import { afterEach, describe, expect, it } from 'vitest';
import type { Delivery } from '../../../src/adapters/mqtt/link.js';
import { MessageQueue, packetBytes } from '../../../src/adapters/mqtt/messageQueue.js';
import { Sessions } from '../../../src/adapters/mqtt/sessions.js';
import { mulberry } from '../../support/random.js';
import { READING, startOwnBroker } from './ownBroker.js';

setFlagsFromString('--expose-gc');
const collect = runInNewContext('gc') as () => void;
const ends: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
});
const later = (end: () => unknown) => void ends.push(end);

const MEMORY = 8_000_000;
const start = (options: Parameters<typeof startOwnBroker>[1] = {}) =>
  startOwnBroker(later, { memory_most_bytes: MEMORY, ...options });

/** What comes to a client, from now on. */
function heard(client: MqttClient): string[] {
  const topics: string[] = [];
  client.on('message', (topic) => topics.push(topic));
  return topics;
}

/** What this process keeps, once garbage is gone: of buffers only after a while [bytes]. */
async function kept(): Promise<number> {
  for (let round = 0; round < 3; round++) {
    await new Promise((resolve) => setTimeout(resolve, 100));
    collect();
  }
  const { heapUsed, external } = process.memoryUsage();
  return heapUsed + external;
}

describe('a queue of messages', () => {
  it('finds them by number and by identifier as a list looked through from its beginning does', () => {
    const random = mulberry(3);
    const queue = new MessageQueue();
    const list: { no: number; messageId?: number }[] = [];
    let no = 0;
    for (let step = 0; step < 20_000; step++) {
      const way = random();
      if (way < 0.45) {
        const packet = { cmd: 'publish', topic: `t${no}`, payload: Buffer.alloc(no % 7) };
        queue.add(++no, packet);
        list.push({ no });
      } else if (way < 0.7) {
        const next = list.find(({ messageId }) => messageId === undefined);
        if (next === undefined) continue;
        // Identifiers come again while those before them are on their way.
        next.messageId = next.no % 50;
        queue.name(next.no, next.messageId);
      } else {
        const messageId = Math.floor(random() * 50);
        const at = list.findIndex((one) => one.messageId === messageId);
        const taken = queue.acknowledged(messageId);
        expect(taken?.messageId).toBe(at < 0 ? undefined : messageId);
        if (at >= 0) list.splice(at, 1);
      }
      expect(queue.size).toBe(list.length);
    }
    expect(list.length).toBeGreaterThan(100);
    expect(queue.all().map(({ messageId }) => messageId)).toEqual(list.map((o) => o.messageId));
    expect(queue.bytes).toBe(queue.all().reduce((sum, one) => sum + packetBytes(one), 0));
  });
});

describe('sessions', () => {
  const bounds = { sessions_most: 3, queued_most_bytes: 1e6, own_queued_most_bytes: 1e6 };

  it('give way after an hour of absence, are given up after a week, and rockhour never waits', () => {
    let now = 0;
    const dropped: string[] = [];
    const sessions = new Sessions(
      bounds,
      (id) => dropped.push(id),
      () => now,
    );
    for (const id of ['a', 'b', 'c']) expect(sessions.enter(id, true, false)).toBe(true);
    expect(sessions.enter('d', true, false)).toBe(false);
    expect(sessions.enter('rockhour', true, true)).toBe(true);
    // One without a session takes no place.
    expect(sessions.enter('guest', false, false)).toBe(true);
    sessions.leave('guest', true);
    sessions.leave('b', true);
    now += 1000;
    sessions.leave('a', true);
    now += 3_599_999;
    expect(sessions.enter('d', true, false)).toBe(true);
    expect(dropped).toEqual(['b']);
    expect(sessions.enter('e', true, false)).toBe(false);
    // Its own is back in time, of a longer absence nothing is left.
    expect(sessions.enter('a', true, false)).toBe(true);
    sessions.leave('c', true);
    now += 7 * 86_400_000;
    sessions.expire();
    expect(dropped).toEqual(['b', 'c']);
    expect(sessions.count).toBe(3);
    // With nothing to come back to it is no session.
    sessions.leave('d', false);
    expect(sessions.count).toBe(2);
  });
});

describe('what its own broker keeps', () => {
  it('retained, has a bound that rockhour itself is not within', async () => {
    const { open, refused, link } = await start();
    const client = await open();
    for (let n = 0; n < 40; n++) {
      const payload = Buffer.alloc(100_000, n);
      await client.publishAsync(`kept/${n}`, payload, { retain: true, qos: 1 });
    }
    expect(refused).toHaveLength(21);
    expect(refused[0]).toMatch(/^retained: of mqttjs_\w+ to kept\/19: too much is kept$/);
    for (let n = 0; n < 5; n++) link.publish(`rockhour/u${n}/state`, 'x'.repeat(50_000));
    const late = await open();
    const topics = heard(late);
    await late.subscribeAsync(['kept/#', 'rockhour/u3/state']);
    const wanted = [...Array.from({ length: 19 }, (_, n) => `kept/${n}`), 'rockhour/u3/state'];
    await expect.poll(() => topics).toEqual(wanted);
    // Room comes back, and a greater one in the place of another is counted as such.
    const say = (bytes: number) =>
      client.publishAsync('kept/0', 'x'.repeat(bytes), { retain: true, qos: 1 });
    for (const bytes of [0, 90_000, 250_000]) await say(bytes);
    await expect.poll(() => refused.length).toBe(22);
    expect(refused[21]).toMatch(/to kept\/0: too much/);
  });

  it('for those that are away, has a bound for each and for all', async () => {
    const { open, refused, came } = await start();
    const away = async (clientId: string) => {
      const client = await open({ clientId, clean: false });
      await client.subscribeAsync('wanted/#', { qos: 1 });
      await client.endAsync();
    };
    await away('one');
    const client = await open();
    for (let n = 0; n < 30; n++) {
      await client.publishAsync(`wanted/${n}`, Buffer.alloc(50_000), { qos: 1 });
    }
    // Of 8 MB a quarter waits for others, of this a quarter for one.
    await expect.poll(() => refused.length).toBe(21);
    expect(refused[0]).toBe('queued: for one to wanted/9: too much waits');
    const back = await open({ clientId: 'one', clean: false, connectTimeout: 5000 });
    await expect.poll(() => back.connected).toBe(true);
    for (const id of ['two', 'three', 'four', 'five', 'six']) await away(id);
    refused.splice(0);
    for (let n = 0; n < 10; n++) {
      await client.publishAsync(`wanted/${n}`, Buffer.alloc(50_000), { qos: 1 });
    }
    await client.publishAsync(READING, 'heard', { qos: 1 });
    await expect.poll(() => came).toEqual(['heard']);
    const full = refused.filter((text) => text.startsWith('queued: '));
    expect(full.length).toBeGreaterThan(10);
    expect(full.length).toBeLessThan(30);
  });

  it('of sessions and subscriptions is told to the client by the word that MQTT has for it', async () => {
    const { open, refused } = await start();
    await expect(open({ clientId: 'x'.repeat(257) })).rejects.toThrow(/Identifier rejected/i);
    for (let n = 0; n < 256; n++) {
      const one = await open({ clientId: `s${n}`, clean: false });
      await one.subscribeAsync('a', { qos: 1 });
      await one.endAsync();
    }
    await expect(open({ clientId: 's256', clean: false })).rejects.toThrow(/Server unavailable/i);
    const [again, other] = [await open({ clientId: 's7', clean: false }), await open()];
    expect(refused).toEqual([
      expect.stringMatching(/^sessions: x{120}\.\.\.: an id of 257 characters, more than 256$/),
      'sessions: s256: there are 256 sessions',
    ]);
    refused.splice(0);
    const filters = Array.from({ length: 300 }, (_, n) => `f/${n}`);
    const granted = await other.subscribeAsync(filters).catch((error: unknown) => error);
    expect(refused).toHaveLength(44);
    expect(String(granted)).toMatch(/subscribe/i);
    const topics = heard(other);
    await again.publishAsync('f/255', '', { qos: 1 });
    await again.publishAsync('f/256', '', { qos: 1 });
    await other.unsubscribeAsync('f/0');
    await other.subscribeAsync('f/256');
    await again.publishAsync('f/256', '', { qos: 1 });
    await expect.poll(() => topics).toEqual(['f/255', 'f/256']);
    // What was refused is not kept for a session either, whatever stood beside it.
    await expect(again.subscribeAsync(['ok', `long/${'x'.repeat(1024)}`])).rejects.toThrow();
    await other.publishAsync(`long/${'x'.repeat(1024)}`, '', { qos: 1 });
    await other.publishAsync('ok', '', { qos: 1 });
    expect(refused.at(-1)).toMatch(/^subscriptions: s7 of long\/x+\.\.\.: a filter of 1029 char/);
  }, 30_000);

  it('does not grow with what is sent to it', async () => {
    const { open, broker } = await start();
    const client = await open();
    const flood = async (from: number, size: number) => {
      for (let n = from; n < from + 60; n++) {
        // Not one that is kept until the end of the test.
        const id = { clientId: `away${n % 20}`, clean: n % 3 === 0, reconnectPeriod: 0 };
        const away = await connectAsync(broker.url, id);
        await away.subscribeAsync([`q/#`, `own/${n}`], { qos: 1 });
        await away.endAsync();
        const payload = Buffer.alloc(size, n);
        await client.publishAsync(`q/${n}`, payload, { qos: 1, retain: true });
        await client.publishAsync(`q/small/${n}`, 'x', { qos: 2, retain: true });
      }
    };
    await flood(0, 100_000);
    const before = await kept();
    for (let round = 1; round <= 3; round++) await flood(60 * round, 100_000);
    // 18 MB came in, of which 14 sessions would have kept all.
    expect((await kept()) - before).toBeLessThan(MEMORY);
  }, 60_000);

  it('for rockhour makes publishers wait, and loses and doubles nothing', async () => {
    const waiting: Delivery[] = [];
    let isBehind = true;
    const { open, refused, came } = await start({
      take: (delivery) => {
        if (isBehind) waiting.push(delivery);
        else delivery.acknowledge?.();
      },
    });
    const [client, other] = [await open(), await open()];
    let acknowledged = 0;
    const all = Array.from({ length: 1000 }, (_, n) => {
      const payload = Buffer.alloc(10_000, ' ');
      payload.write(String(n));
      const by = n % 2 === 0 ? client : other;
      return by.publishAsync(READING, payload, { qos: 1 }).then(() => acknowledged++);
    });
    // 4 MB wait for rockhour, and what a piece from the network brings beyond.
    await expect.poll(() => refused.some((text) => text.startsWith('held: '))).toBe(true);
    await expect.poll(() => waiting.length).toBeGreaterThan(380);
    await new Promise((resolve) => setTimeout(resolve, 300));
    expect(acknowledged).toBeLessThan(600);
    isBehind = false;
    for (const { acknowledge } of waiting.splice(0)) acknowledge?.();
    await Promise.all(all);
    await expect.poll(() => came.length).toBe(1000);
    expect(refused.filter((text) => !text.startsWith('held: '))).toEqual([]);
  }, 30_000);
});

describe('a client of its own broker', () => {
  it('that does not take what it wants holds nobody up, and is ended', async () => {
    const { open, refused, came } = await start({
      slow: { unsent_most_bytes: 500_000, patience_ms: 700, look_ms: 50 },
    });
    const [publisher, deaf, slow] = [await open(), await open(), await open()];
    for (const client of [deaf, slow]) {
      await client.subscribeAsync('much/#');
      (client.stream as Socket).pause();
    }
    const closed = [deaf, slow].map(
      (client) => new Promise<void>((resolve) => client.stream.once('close', resolve)),
    );
    // More than the system takes for it, so that a part waits here.
    let n = 0;
    while (!refused.some((text) => text.startsWith('slow: '))) {
      publisher.publish('much/x', Buffer.alloc(100_000), { qos: 0 });
      // Each of these goes to rockhour behind one that the deaf ones do not take.
      await publisher.publishAsync(READING, String(n++), { qos: 1 });
      expect(n).toBeLessThan(1000);
    }
    await expect.poll(() => came.length).toBe(n);
    await expect.poll(() => refused.length, { timeout: 5000 }).toBe(2);
    expect(refused[0]).toMatch(
      /^slow: mqttjs_\w+ at 127\.0\.0\.1: .*\d+ bytes (that )?wait for it/,
    );
    for (const client of [deaf, slow]) (client.stream as Socket).resume();
    await Promise.all(closed);
    expect(publisher.connected).toBe(true);
  }, 30_000);

  it('that stops in the middle of a packet, or takes nothing of a little, is ended in time', async () => {
    const { open, refused, port } = await start({ slow: { patience_ms: 300, look_ms: 30 } });
    const [idle, half] = [await open({ keepalive: 0 }), await open({ keepalive: 0 })];
    const closed = new Promise<void>((resolve) => half.stream.once('close', resolve));
    // The head of a PUBLISH of 1000 bytes.
    (half.stream as Socket).write(Buffer.from([0x30, 0xe8, 0x07, 0, 1, 0x61]));
    await closed;
    expect(refused).toEqual([
      expect.stringMatching(/^slow: mqttjs_\w+ at 127.0.0.1: it does not come to the end of a/),
    ]);
    expect([idle.connected, port > 0]).toEqual([true, true]);
  });

  it('finds no place where its address has 256, while rockhour has its own, and one once one left', async () => {
    const { refused, port, broker } = await start();
    const sockets: Socket[] = [];
    const knock = () => {
      const socket = connectPlainly(port, '127.0.0.1');
      socket.on('error', () => undefined);
      ends.push(() => socket.destroy());
      return new Promise<Socket>((resolve) => socket.once('connect', () => resolve(socket)));
    };
    for (let n = 0; n < 256; n++) sockets.push(await knock());
    const beyond = await knock();
    await new Promise<void>((resolve) => beyond.once('close', () => resolve()));
    expect(refused).toEqual(['connections: 127.0.0.1: it has 256 already']);
    expect(sockets.some((socket) => socket.destroyed)).toBe(false);
    const inside = broker.inside();
    expect(inside.destroyed).toBe(false);
    inside.destroy();
    sockets[0]?.destroy();
    await expect
      .poll(async () => {
        const socket = await knock();
        await new Promise((resolve) => setTimeout(resolve, 20));
        return socket.destroyed;
      })
      .toBe(false);
  });
});
