import { readFileSync } from 'node:fs';
import { connectAsync } from 'mqtt';
import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest';
import { MqttLink } from '../../../src/adapters/mqtt/link.js';
import type { ClientTls } from '../../../src/config/site.js';
import { makeCertificates } from '../../support/certificates.js';
import { requireProgram } from '../../support/requirements.js';
import { type Service, startMosquitto } from '../../support/services.js';

const mosquitto = requireProgram('mosquitto');
const openssl = requireProgram('openssl');
const text = (file: string) => readFileSync(file, 'utf8');

describe.skipIf(!mosquitto || !openssl)('the link to a broker that wants certificates', () => {
  const made = makeCertificates();
  let tls: ClientTls;
  const links: MqttLink[] = [];
  const services: Service[] = [];
  let broker: Service;

  const start = async (name: string, hosts: string[], ended = false): Promise<Service> => {
    const { cert, key } = made.make(name, hosts, ended);
    const service = await startMosquitto(mosquitto!, undefined, [
      ...[`cafile ${made.ca}`, `certfile ${cert}`, `keyfile ${key}`],
      ...['require_certificate true', 'use_identity_as_username true'],
    ]);
    services.push(service);
    return service;
  };
  beforeAll(async () => {
    const client = made.make('client', []);
    tls = {
      ...{ ca: text(made.ca), cert: text(client.cert), key: text(client.key) },
      server_name: null,
    };
    broker = await start('broker', ['127.0.0.1', 'localhost']);
  });
  afterEach(async () => {
    await Promise.all(links.splice(0).map((link) => link.stop()));
  });
  afterAll(async () => {
    await Promise.all(services.map((service) => service.stop()));
  });

  /** What a link with these certificates says first: up, or why not. */
  function firstWord({ port }: Service, certificates: ClientTls | null): Promise<string> {
    return new Promise((resolve) => {
      const link = new MqttLink({
        ...{ client_id: 'under-test', username: null, password: null, protocol: 5, qos: 1 },
        ...{ topics: ['in/a'], will: { topic: 'out/heartbeat', payload: 'offline' } },
        url: () => `mqtts://127.0.0.1:${port}`,
        tls: certificates,
        receive: ({ payload }) => resolve(`came ${payload}`),
        up: () => resolve('up'),
        down: resolve,
        refused: (reason) => resolve(`refused ${reason}`),
      });
      links.push(link);
      link.start();
    });
  }

  it('comes in with its own, and messages go through', async () => {
    expect(await firstWord(broker, tls)).toBe('up');
    const { ca, cert, key } = tls;
    const other = await connectAsync(`mqtts://127.0.0.1:${broker.port}`, {
      ...{ ca: ca!, cert: cert!, key: key! },
    });
    const seen = new Promise((resolve) =>
      other.once('message', (_, payload) => resolve(`${payload}`)),
    );
    await other.subscribeAsync('out/b');
    await links[0]!.deliver('out/b', 'through', 5000);
    expect(await seen).toBe('through');
    await other.endAsync();
  });

  it('says what is wrong with a certificate: of whom, for whom, until when', async () => {
    const [ended, elsewhere] = await Promise.all([
      start('ended', ['127.0.0.1'], true),
      start('elsewhere', ['elsewhere.example']),
    ]);
    const stranger = makeCertificates();
    const theirs = stranger.make('stranger', []);
    const words = await Promise.all([
      firstWord(ended, tls),
      firstWord(elsewhere, tls),
      firstWord(broker, { ...tls, ca: null }),
      firstWord(broker, { ...tls, ca: text(stranger.ca) }),
      firstWord(elsewhere, { ...tls, server_name: 'elsewhere.example' }),
      firstWord(broker, { ...tls, cert: text(theirs.cert), key: text(theirs.key) }),
    ]);
    expect(words[0]).toMatch(/^the server's certificate has ended/);
    expect(words[1]).toMatch(/^the server's certificate is for another host .*127\.0\.0\.1/);
    expect(words[2]).toMatch(/^the server's certificate is of an authority not in ca_file/);
    expect(words[3]).toMatch(/^the server's certificate is of an authority not in ca_file/);
    expect(words[4]).toBe('up');
    expect(words[5]).toMatch(
      /^the server does not believe the authority of rockhour's certificate/,
    );
  });

  it('without a certificate of its own says that one is wanted', async () => {
    const said = await firstWord(broker, { ...tls, cert: null, key: null });
    expect(said).toMatch(/wants a certificate of rockhour|closed/);
  });
});
