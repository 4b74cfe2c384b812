import { createHmac } from 'node:crypto';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { signedHeaders } from '../../../src/adapters/notify/signature.js';
import {
  type WebhookCount,
  WebhookForwarder,
  type WebhookOptions,
} from '../../../src/adapters/notify/webhookForwarder.js';
import type { WebhookConfig } from '../../../src/config/site.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { Receiver } from './receiver.js';

const NOW = Date.parse('2026-03-01T12:00:00Z');
const STORE = {
  ...{ folder: '', keep_readings_days: 1, keep_estimates_days: 1, thin_after_days: 1 },
  ...{ thin_to_s: 600, checkpoint_every_s: 600 },
};
const ends: (() => unknown)[] = [];

afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
});

function event(no: number, part: Partial<WatchEvent> = {}): WatchEvent {
  return {
    ...{ id: `u/valve_leaks/s${no}`, unit: 'u', kind: 'valve_leaks', class: 'alert' },
    ...{ priority: 'medium', subject: `s${no}`, transition: 'raised', value: no, limit: 1 },
    ...{ time: new Date(NOW - 60_000 + no).toISOString(), message: `event ${no}` },
    ...part,
  } as WatchEvent;
}

function historyIn(folder: string): History {
  const history = new History(join(folder, 'history.sqlite'), STORE);
  history.start();
  ends.push(() => history.stop());
  return history;
}

function folder(): string {
  const made = mkdtempSync(join(tmpdir(), 'rockhour-hook-'));
  ends.push(() => rmSync(made, { recursive: true }));
  return made;
}

interface Bench {
  readonly counts: Partial<Record<WebhookCount, number>>;
  readonly said: string[];
  readonly forwarder: WebhookForwarder;
}

function begin(
  history: History,
  config: Partial<WebhookConfig> & { url: string },
  part: Partial<WebhookOptions> = {},
): Bench {
  const queue = history.eventQueue('webhook w');
  queue.start();
  const counts: Bench['counts'] = {};
  const said: string[] = [];
  const forwarder = new WebhookForwarder({
    config: {
      ...{ id: 'w', secret: null, send: ['alarm', 'alert'], least_priority: 'low' },
      ...{ timeout_s: 5, oldest_h: 24, ...config },
    },
    ...{ site: 'Site', queue, now: () => NOW },
    count: (name, by) => {
      counts[name] = (counts[name] ?? 0) + by;
    },
    down: (reason) => said.push(`down: ${reason}`),
    up: () => said.push('up'),
    refused: (reason) => said.push(`refused: ${reason}`),
    ...part,
  });
  ends.push(() => forwarder.stop());
  forwarder.start();
  return { counts, said, forwarder };
}

async function receiverThat(answer: (n: number, body: string) => number | null) {
  const receiver = new Receiver(answer);
  const url = await receiver.start();
  ends.push(() => receiver.stop());
  return { receiver, url };
}

const data = (body: string) => (JSON.parse(body) as { data: WatchEvent }).data;

describe('signature', () => {
  it('is that of the worked example of Standard Webhooks', () => {
    // Secret, id, time, body and signature of the specification's own example.
    const secret = 'whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw';
    const [id, time, body] = ['msg_p5jXN8AQM9LWM0D4loKWxJek', 1614265330, '{"test": 2432232314}'];
    const headers = signedHeaders(secret, id, time, body);
    expect(headers['webhook-signature']).toBe('v1,g0hM9SsE+OTPJTGt/tmIKtSyZlE3uFJELVlNIOLJ1OE=');
  });

  it('takes a secret without prefix as it stands, and gives none without a secret', () => {
    const key = createHmac('sha256', 'plain words').update('a.12.{}').digest('base64');
    expect(signedHeaders('plain words', 'a', 12.9, '{}')['webhook-signature']).toBe(`v1,${key}`);
    expect(signedHeaders(null, 'a', 12, '{}')).not.toHaveProperty('webhook-signature');
  });
});

describe('webhook', () => {
  it('delivers events in order, signed, and begins with what comes after it was configured', async () => {
    const history = historyIn(folder());
    history.events.add(event(0));
    const { receiver, url } = await receiverThat(() => 204);
    const { counts } = begin(history, { url, secret: 's3cret' });
    for (const no of [1, 2, 3]) history.events.add(event(no));
    await expect.poll(() => receiver.got.length, { timeout: 5000 }).toBe(3);
    expect(receiver.got.map(({ body }) => data(body).value)).toEqual([1, 2, 3]);
    const { headers, body } = receiver.got[1]!;
    expect(JSON.parse(body)).toMatchObject({ type: 'alert.raised', data: { site: 'Site' } });
    const signed = `${headers['webhook-id']}.${headers['webhook-timestamp']}.${body}`;
    const key = createHmac('sha256', 's3cret').update(signed).digest('base64');
    expect(headers['webhook-signature']).toBe(`v1,${key}`);
    await expect.poll(() => counts.webhook_sent).toBe(3);
  });

  it('tries again after an outage without losing or reordering, and says so once', async () => {
    const history = historyIn(folder());
    const { receiver, url } = await receiverThat((n) => [503, 302, 429, 401][n] ?? 200);
    const { counts, said } = begin(history, { url }, { retry_least_ms: 20 });
    history.events.add(event(1));
    history.events.add(event(2));
    await expect.poll(() => counts.webhook_sent, { timeout: 8000 }).toBe(2);
    expect(receiver.got.map(({ body }) => data(body).value)).toEqual([1, 1, 1, 1, 1, 2]);
    // A receiver knows a repeated message by its id.
    expect(new Set(receiver.got.map(({ headers }) => headers['webhook-id'])).size).toBe(2);
    expect(said).toEqual(['down: it answers 503', 'up']);
    expect(counts.webhook_failures).toBe(4);
  });

  it('gives a receiver that never answers up in time, and goes on after a restart where it was', async () => {
    const place = folder();
    const history = historyIn(place);
    const silent = await receiverThat(() => null);
    const first = begin(history, { url: silent.url, timeout_s: 0.2 });
    history.events.add(event(1));
    await expect
      .poll(() => first.said, { timeout: 5000 })
      .toEqual(['down: no answer within 0.2 s']);
    await first.forwarder.stop();
    history.stop();
    const again = historyIn(place);
    const { receiver, url } = await receiverThat(() => 200);
    begin(again, { url });
    await expect.poll(() => receiver.got.length, { timeout: 5000 }).toBe(1);
    expect(data(receiver.got[0]!.body).value).toBe(1);
    expect(again.eventQueue('webhook w').backlog).toBe(0);
  });

  it('sets aside what the receiver refuses as such, leaves out what is too old or not wanted, and counts', async () => {
    const history = historyIn(folder());
    const { receiver, url } = await receiverThat((_, body) => (data(body).value === 2 ? 422 : 200));
    const { counts, said } = begin(history, {
      ...{ url, send: ['alert'], least_priority: 'medium', oldest_h: 1 },
    });
    const old = new Date(NOW - 2 * 3_600_000).toISOString();
    history.events.add(event(1, { time: old }));
    history.events.add(event(2));
    history.events.add(event(3, { class: 'alarm' }));
    history.events.add(event(4, { priority: 'low' }));
    history.events.add(event(5));
    await expect.poll(() => history.eventQueue('webhook w').backlog, { timeout: 5000 }).toBe(0);
    expect(receiver.got.map(({ body }) => data(body).value)).toEqual([2, 5]);
    expect(counts).toEqual({ webhook_expired: 1, webhook_set_aside: 1, webhook_sent: 1 });
    expect(said).toEqual(['refused: u/valve_leaks/s2 raised: it answers 422']);
  });

  it('loses nothing of an alert that was shelved before the receiver was back', async () => {
    const place = folder();
    const history = historyIn(place);
    const away = await receiverThat(() => 503);
    const first = begin(history, { url: away.url });
    history.events.add(event(1));
    await expect.poll(() => first.said.length, { timeout: 5000 }).toBe(1);
    const { id } = event(1);
    const say = (one: History, action: 'shelve' | 'unshelve', at: number) =>
      one.alarms.command({ id, action, who: 'mara', hours: 1, why: 'known' }, at);
    say(history, 'shelve', NOW);
    await first.forwarder.stop();
    history.stop();
    const again = historyIn(place);
    const { receiver, url } = await receiverThat(() => 200);
    begin(again, { url });
    say(again, 'unshelve', NOW + 1000);
    say(again, 'shelve', NOW + 2000);
    again.events.add(
      event(1, { transition: 'returned', time: new Date(NOW + 3000).toISOString() }),
    );
    await expect.poll(() => receiver.got.length, { timeout: 5000 }).toBe(3);
    const got = receiver.got.map(({ body }) => JSON.parse(body));
    expect(got.map(({ type }) => type)).toEqual(['alert.raised', 'alert.raised', 'alert.returned']);
    expect(got.map(({ data }) => data.again)).toEqual([undefined, 'unshelved', undefined]);
    expect(got[1].timestamp).toBe(new Date(NOW + 1000).toISOString());
  });

  it('says what happened where nobody listens, not that a fetch has failed', async () => {
    const history = historyIn(folder());
    const { receiver, url } = await receiverThat(() => 200);
    await receiver.stop();
    const { said } = begin(history, { url });
    history.events.add(event(1));
    await expect.poll(() => said[0], { timeout: 5000 }).toContain('ECONNREFUSED');
  });

  it('says that nobody speaks TLS there, not which line of OpenSSL has failed', async () => {
    const history = historyIn(folder());
    const { url } = await receiverThat(() => 200);
    const { said } = begin(history, { url: url.replace('http:', 'https:') });
    history.events.add(event(1));
    await expect.poll(() => said[0], { timeout: 5000 }).toContain('it answers without TLS');
    expect(said[0]).not.toContain('\n');
  });
});
