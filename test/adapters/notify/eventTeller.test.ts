import { connectAsync } from 'mqtt';
import { afterEach, describe, expect, it } from 'vitest';
import { EmbeddedBroker } from '../../../src/adapters/mqtt/broker.js';
import { MqttLink } from '../../../src/adapters/mqtt/link.js';
import { EventTeller } from '../../../src/adapters/notify/eventTeller.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { freePort } from '../../support/ports.js';
import { waitFor } from '../../support/wait.js';

const ends: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
});

const event = (no: number) =>
  ({ id: `u/valve_leaks/s${no}`, unit: 'u', subject: `s${no}` }) as WatchEvent;

/** A queue as the history has it, in memory. */
function queueOf(count: number) {
  const all = Array.from({ length: count }, (_, i) => ({ seq: i + 1, event: event(i + 1) }));
  let cursor = 0;
  return {
    read: (most: number) => all.filter(({ seq }) => seq > cursor).slice(0, most),
    moveTo: (seq: number) => {
      cursor = seq;
    },
    get cursor() {
      return cursor;
    },
  };
}

function linkTo(url: string): MqttLink {
  const link = new MqttLink({
    ...{ url: () => url, client_id: 'teller', username: null, password: null, protocol: 4 },
    ...{ qos: 1, topics: [], will: { topic: 'p/heartbeat', payload: 'offline' } },
    ...{ receive: () => undefined, up: () => undefined, down: () => undefined },
    refused: () => undefined,
  });
  ends.push(() => link.stop());
  return link;
}

describe('events told over MQTT', () => {
  it('wait for a broker that is away, then come in order, none lost', async () => {
    const port = await freePort();
    const link = linkTo(`mqtt://127.0.0.1:${port}`);
    const queue = queueOf(120);
    const counts = { events_told: 0, events_told_failures: 0 };
    const teller = new EventTeller({
      ...{ prefix: 'p', queue },
      deliver: (topic, payload) => link.deliver(topic, payload, 5000),
      count: (name) => counts[name]++,
    });
    link.start();
    teller.start();
    ends.push(() => teller.stop());
    await waitFor('a try that fails', () => counts.events_told_failures > 0);
    expect(queue.cursor).toBe(0);
    const broker = new EmbeddedBroker('127.0.0.1', port);
    await broker.start();
    ends.push(() => broker.stop());
    const listener = await connectAsync(`mqtt://127.0.0.1:${port}`);
    ends.push(() => listener.endAsync(true));
    const came: string[] = [];
    let retained = 0;
    listener.on('message', (topic, payload, { retain }) => {
      if (retain) retained++;
      came.push(`${topic} ${(JSON.parse(payload.toString()) as WatchEvent).subject}`);
    });
    await listener.subscribeAsync('p/u/event', { qos: 1 });
    await waitFor('all to be told', () => queue.cursor === 120, 20_000);
    const expected = Array.from({ length: 120 }, (_, i) => `p/u/event s${i + 1}`);
    // Those told before the listener had subscribed are nobody's: it is not retained.
    await waitFor('the last to come', () => came.at(-1) === expected.at(-1));
    expect(came).toEqual(expected.slice(-came.length));
    expect(counts.events_told).toBe(120);
    expect(retained).toBe(0);
  }, 40_000);

  it('are told again where the word of the broker did not come', async () => {
    const queue = queueOf(2);
    const tried: string[] = [];
    let refuse = true;
    const teller = new EventTeller({
      ...{ prefix: 'p', queue, count: () => undefined },
      deliver: (_, payload) => {
        tried.push((JSON.parse(payload) as WatchEvent).subject);
        if (!refuse || tried.length < 2) return Promise.resolve();
        refuse = false;
        return Promise.reject(new Error('no answer'));
      },
    });
    teller.start();
    ends.push(() => teller.stop());
    await waitFor('both to be told', () => queue.cursor === 2);
    expect(tried).toEqual(['s1', 's2', 's2']);
  });
});
