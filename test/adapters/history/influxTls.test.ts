import { readFileSync } from 'node:fs';
import { request } from 'node:https';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { InfluxForwarder } from '../../../src/adapters/history/influxForwarder.js';
import type { ClientTls } from '../../../src/config/site.js';
import { makeCertificates } from '../../support/certificates.js';
import { temporaryFolder } from '../../support/folders.js';
import { requireProgram } from '../../support/requirements.js';
import { type Service, startInflux } from '../../support/services.js';
import { event } from './unit.js';

const influxd = requireProgram('influxd');
const openssl = requireProgram('openssl');
const PASSWORD = 'p4ss-of-the-forwarder';
const STORE = {
  ...{ keep_readings_days: 90, keep_estimates_days: 730, thin_after_days: 30, thin_to_s: 600 },
  checkpoint_every_s: 600,
};

describe.skipIf(!influxd || !openssl)('the forwarder to an InfluxDB with TLS and users', () => {
  const made = makeCertificates();
  let ca: string;
  let tls: ClientTls;
  let influx: Service;
  const ending: (() => Promise<unknown>)[] = [];

  beforeAll(async () => {
    ca = readFileSync(made.ca, 'utf8');
    tls = { ca, cert: null, key: null, server_name: null };
    // The name of the certificate is another than the address: server_name says which.
    const { cert, key } = made.make('database', ['database.example']);
    influx = await startInflux(influxd!, undefined, [
      ...['https-enabled = true', `https-certificate = "${cert}"`, `https-private-key = "${key}"`],
      'auth-enabled = true',
    ]);
    ending.push(() => influx.stop());
    await query(`CREATE USER rock WITH PASSWORD '${PASSWORD}' WITH ALL PRIVILEGES`);
  });
  afterAll(async () => {
    for (const end of ending.reverse()) await end();
  });

  function query(q: string): Promise<string> {
    const path = `/query?db=rock&u=rock&p=${PASSWORD}&q=${encodeURIComponent(q)}`;
    const options = { ca, servername: 'database.example', method: 'POST', agent: false } as const;
    return new Promise((resolve, reject) => {
      const asked = request(influx.url + path, options, (answer) => {
        let body = '';
        answer.on('data', (chunk) => {
          body += chunk;
        });
        answer.on('end', () => resolve(body));
      });
      asked.on('error', reject).end();
    });
  }

  /** A forwarder with one event to forward, and the first that it says. */
  function forward(certificates: ClientTls | null, password: string) {
    const history = new History(join(temporaryFolder('influx'), 'history.sqlite'), STORE as never);
    history.start();
    history.events.add(event(Date.UTC(2026, 0, 31), 'raised'));
    const told: string[] = [];
    const forwarder = new InfluxForwarder({
      config: {
        ...{ url: influx.url, database: 'rock', username: 'rock', password },
        ...{ batch_points: 5000, tls: certificates },
      },
      outbox: () => history.outbox,
      count: () => undefined,
      down: (reason) => told.push(reason),
      up: () => told.push('up'),
      refused: (reason) => told.push(`refused ${reason}`),
    });
    ending.push(async () => {
      await forwarder.stop();
      history.stop();
    });
    forwarder.start();
    return { told, history };
  }

  it('writes with name and password, where the certificate is of ca_file and for server_name', async () => {
    const good = forward({ ...tls, server_name: 'database.example' }, PASSWORD);
    await expect.poll(() => good.history.outbox.backlog, { timeout: 5000 }).toBe(0);
    expect(good.told).toEqual([]);
    expect(await query('SHOW MEASUREMENTS')).toContain('rockhour_');
  });

  it('says what is wrong with certificate or password, and never the password', async () => {
    const ways = [
      forward(tls, PASSWORD),
      forward(null, PASSWORD),
      forward({ ...tls, server_name: 'database.example' }, `${PASSWORD}-not`),
    ];
    await expect
      .poll(() => ways.map(({ told }) => told.length), { timeout: 5000 })
      .toEqual([1, 1, 1]);
    const [host, authority, login] = ways.map(({ told }) => told[0]!);
    expect(host).toMatch(/^the server's certificate is for another host/);
    expect(authority).toMatch(/^the server's certificate is of an authority not in ca_file/);
    expect(login).toMatch(/refuses the login of influx.username/);
    expect(JSON.stringify(ways.map(({ told }) => told))).not.toContain(PASSWORD);
  });
});
