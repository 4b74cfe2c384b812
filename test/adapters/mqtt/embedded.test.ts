import { copyFileSync, readFileSync } from 'node:fs';
import { connect as connectPlainly, type Socket } from 'node:net';
import { join } from 'node:path';
import { connect as connectSecurely } from 'node:tls';
import { connect, type IClientOptions } from 'mqtt';
import { afterEach, describe, expect, it } from 'vitest';
import type { BrokerOptions } from '../../../src/adapters/mqtt/broker.js';
import { PacketSizes } from '../../../src/adapters/mqtt/packetSizes.js';
import { holders } from '../../access/holders.js';
import { makeCertificates } from '../../support/certificates.js';
import { temporaryFolder } from '../../support/folders.js';
import { mulberry } from '../../support/random.js';
import { requireProgram } from '../../support/requirements.js';
import { READING, startOwnBroker } from './ownBroker.js';

const { access, tokens } = holders();
const feed: IClientOptions = { username: 'a_feed', password: tokens.feed };
const ends: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ends.splice(0).reverse()) await end();
});

const start = (options: BrokerOptions = {}) =>
  startOwnBroker((end) => ends.push(end), { access, ...options });

describe('sizes of packets', () => {
  it('are told of the first that is too great, wherever the bytes were cut', () => {
    const random = mulberry(1);
    /** Its first byte, its length in sevens of bits, the rest. */
    const packet = (bytes: number) => {
      const length: number[] = [];
      for (let left = bytes; left > 0 || length.length === 0; left >>= 7) {
        length.push((left & 0x7f) | (left > 0x7f ? 0x80 : 0));
      }
      return Buffer.concat([Buffer.from([0x30, ...length]), Buffer.alloc(bytes, 0xff)]);
    };
    for (let round = 0; round < 200; round++) {
      const sizes = Array.from({ length: 5 }, () => Math.floor(random() ** 4 * 40_000));
      const packets = sizes.map(packet);
      const ping = Buffer.from([0xc0, 0]);
      const bytes = Buffer.concat(packets.flatMap((one) => [one, ping]));
      const most = Math.floor(random() * 30_000) + 2;
      const seen = new PacketSizes();
      let found = 0;
      for (let at = 0; at < bytes.length && found === 0; ) {
        const next = at + 1 + Math.floor(random() ** 3 * 20_000);
        found = seen.see(bytes.subarray(at, next), most);
        at = next;
      }
      expect(found).toBe(packets.find((one) => one.length > most)?.length ?? 0);
    }
  });
});

describe('its own broker', () => {
  it('cuts off who sends too great a packet, says who, and the others stay', async () => {
    const { open, refused, came } = await start({ packet_most_bytes: 20_000 });
    const [gateway, other] = [await open(feed), await open({ ...feed, clientId: 'other' })];
    await gateway.publishAsync(READING, Buffer.alloc(19_900), { qos: 1 });
    await expect.poll(() => came).toEqual(['19900 bytes']);
    // In one piece with a good one ahead of it, and far too great to come in one piece.
    for (const [client, bytes] of [
      [gateway, 20_001],
      [await open({ ...feed, clientId: 'third' }), 3_000_000],
    ] as const) {
      client.publish(READING, Buffer.alloc(bytes), { qos: 1 });
      await expect.poll(() => client.connected).toBe(false);
    }
    expect(refused).toEqual([
      expect.stringMatching(/^packets: a packet of 20\d\d\d bytes from a_feed at 127.0.0.1, more/),
      expect.stringMatching(
        /^packets: a packet of 30\d{5} bytes from a_feed at .* more than 20000$/,
      ),
    ]);
    await other.publishAsync(READING, 'still here', { qos: 1 });
    await expect.poll(() => came).toEqual(['19900 bytes', 'still here']);
  });

  it('keeps little of who has not logged in, and ends while such are connected', async () => {
    const { broker, port, refused } = await start();
    const socket = (bytes?: Buffer) => {
      const one: Socket = connectPlainly(port, '127.0.0.1');
      one.on('error', () => undefined);
      if (bytes !== undefined) one.write(bytes);
      ends.push(() => one.destroy());
      return new Promise<void>((resolve) => one.once('close', () => resolve()));
    };
    const silent = socket();
    // The head of a CONNECT of 100,000 bytes.
    await socket(Buffer.from([0x10, 0xa0, 0x8d, 0x06, 0, 4, 0x4d, 0x51, 0x54, 0x54]));
    expect(refused).toEqual(['packets: a packet of 100004 bytes from 127.0.0.1, more than 65536']);
    await broker.stop();
    await silent;
  });
});

describe.skipIf(!requireProgram('openssl'))('its own broker with TLS', () => {
  const made = makeCertificates();
  const folder = temporaryFolder('embedded');
  const [cert_file, key_file] = [join(folder, 'cert'), join(folder, 'key')];
  const put = (name: string) => {
    const { cert, key } = made.make(name, ['127.0.0.1']);
    copyFileSync(key, key_file);
    copyFileSync(cert, cert_file);
    const text = (file: string) => readFileSync(file, 'utf8');
    return { cert_file, key_file, cert: text(cert_file), key: text(key_file) };
  };
  const ca = () => readFileSync(made.ca);

  it('takes readings by TLS with a token, of nobody else, and takes over a new certificate', async () => {
    const said: string[] = [];
    const { broker, port, open, refused, came } = await start({
      ...{ tls: put('first'), certificate_look_ms: 20, packet_most_bytes: 20_000 },
      ...{ info: (text) => said.push(text), error: (text) => said.push(text) },
    });
    expect(broker.url).toBe(`mqtts://127.0.0.1:${port}`);
    const gateway = await open({ ...feed, ca: ca() });
    await gateway.publishAsync(READING, '1', { qos: 1 });
    await expect.poll(() => came).toEqual(['1']);

    await expect(open({ ca: ca() })).rejects.toThrow(/authorized/i);
    // Of an authority that the client does not know.
    await expect(open(feed)).rejects.toThrow(/certificate/);
    const plain = connect(`mqtt://127.0.0.1:${port}`, { ...feed, reconnectPeriod: 0 });
    let isIn = false;
    plain.on('connect', () => {
      isIn = true;
    });
    plain.on('error', () => undefined);
    await new Promise<void>((resolve) => plain.once('close', () => resolve()));
    expect(isIn).toBe(false);
    const old = connectSecurely({
      ...{ host: '127.0.0.1', port, ca: ca(), maxVersion: 'TLSv1.1', minVersion: 'TLSv1' },
      ciphers: 'DEFAULT@SECLEVEL=0',
    });
    const ended = await new Promise((resolve) => {
      old.on('error', resolve);
      old.on('secureConnect', () => resolve('let in'));
    });
    expect(ended).toMatchObject({ code: 'ERR_SSL_TLSV1_ALERT_PROTOCOL_VERSION' });
    await expect
      .poll(() => [...refused].sort())
      .toEqual([
        'handshakes: 127.0.0.1: speaks no TLS',
        'handshakes: 127.0.0.1: unsupported protocol',
        expect.stringMatching(/^handshakes: a client that left: /),
        expect.stringMatching(/^logins: /),
      ]);

    gateway.publish(READING, Buffer.alloc(30_000), { qos: 1 });
    await expect.poll(() => gateway.connected).toBe(false);
    expect(refused.at(-1)).toMatch(/^packets: a packet of 30\d\d\d bytes from a_feed/);

    const named = () =>
      new Promise<string>((resolve) => {
        const socket = connectSecurely({ host: '127.0.0.1', port, ca: ca() }, () => {
          resolve(String(socket.getPeerCertificate().subject.CN));
          socket.destroy();
        });
      });
    expect(await named()).toBe('first');
    put('second');
    await expect.poll(named).toBe('second');
    expect(said.at(-1)).toBe('mqtt.embedded_tls: takes over the new certificate');
    expect(came).toEqual(['1']);
  });
});
