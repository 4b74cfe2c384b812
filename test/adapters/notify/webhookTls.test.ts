import { readFileSync } from 'node:fs';
import { afterEach, describe, expect, it } from 'vitest';
import type { QueuedEvent } from '../../../src/adapters/notify/queueLoop.js';
import { WebhookForwarder } from '../../../src/adapters/notify/webhookForwarder.js';
import type { ClientTls } from '../../../src/config/site.js';
import { makeCertificates } from '../../support/certificates.js';
import { requireProgram } from '../../support/requirements.js';
import { Receiver } from './receiver.js';

const NOW = Date.parse('2026-03-01T12:00:00Z');
const ends: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
});

describe.skipIf(!requireProgram('openssl'))('a webhook with TLS', () => {
  const made = makeCertificates();
  const trust = (ca_file: string, server_name: string | null = null): ClientTls => {
    return { ca: readFileSync(ca_file, 'utf8'), cert: null, key: null, server_name };
  };

  async function receiver(name: string, hosts: string[], ended = false) {
    const { cert, key } = made.make(name, hosts, ended);
    const one = new Receiver(() => 200, { cert, key });
    ends.push(() => one.stop());
    return { receiver: one, url: await one.start() };
  }

  /** The first that is said of one event: delivered, or why not. */
  function firstWord(url: string, tls: ClientTls | null): Promise<string> {
    const one = {
      seq: 1,
      event: {
        ...{ id: 'u/valve_leaks/s', unit: 'u', class: 'alert', priority: 'medium' },
        ...{ transition: 'raised', time: new Date(NOW).toISOString() },
      },
    } as QueuedEvent;
    let waiting = [one];
    return new Promise((resolve) => {
      const forwarder = new WebhookForwarder({
        config: {
          ...{ id: 'w', url, tls, secret: null, send: ['alarm', 'alert'], timeout_s: 5 },
          ...{ least_priority: 'low', oldest_h: 24 },
        },
        site: 'Site',
        queue: {
          read: () => waiting,
          moveTo: () => {
            waiting = [];
          },
        },
        now: () => NOW,
        count: (name) => name === 'webhook_sent' && resolve('delivered'),
        ...{ down: resolve, up: () => undefined, refused: resolve },
      });
      ends.push(() => forwarder.stop());
      forwarder.start();
    });
  }

  it('is delivered where its authority is the one named, for the name that is expected', async () => {
    const here = await receiver('here', ['127.0.0.1']);
    expect(await firstWord(here.url, trust(made.ca))).toBe('delivered');
    expect(JSON.parse(here.receiver.got[0]!.body)).toMatchObject({ type: 'alert.raised' });
    const other = await receiver('other', ['messages.example']);
    expect(await firstWord(other.url, trust(made.ca, 'messages.example'))).toBe('delivered');
  });

  it('goes to nobody else: what is wrong with the certificate is said, and nothing is sent', async () => {
    const stranger = makeCertificates();
    const here = await receiver('known', ['127.0.0.1']);
    const other = await receiver('elsewhere', ['messages.example']);
    const old = await receiver('old', ['127.0.0.1'], true);
    const words = await Promise.all([
      firstWord(here.url, null),
      firstWord(here.url, trust(stranger.ca)),
      firstWord(other.url, trust(made.ca)),
      firstWord(old.url, trust(made.ca)),
    ]);
    expect(words[0]).toMatch(/^the server's certificate is of an authority not in ca_file/);
    expect(words[1]).toMatch(/^the server's certificate is of an authority not in ca_file/);
    expect(words[2]).toMatch(/^the server's certificate is for another host .*127\.0\.0\.1/);
    expect(words[3]).toMatch(/^the server's certificate has ended/);
    for (const { receiver: one } of [here, other, old]) expect(one.got).toEqual([]);
  });
});
