import { readFileSync, writeFileSync } from 'node:fs';
import { Agent, request } from 'node:https';
import { connect } from 'node:net';
import { join } from 'node:path';
import { connect as connectSecurely } from 'node:tls';
import { pino } from 'pino';
import { afterEach, describe, expect, it } from 'vitest';
import { createHttpServer, type HttpServer } from '../../../src/adapters/http/server.js';
import type { HttpTuning } from '../../../src/adapters/http/tuning.js';
import type { HttpConfig } from '../../../src/config/site.js';
import { makeCertificates } from '../../support/certificates.js';
import { temporaryFolder } from '../../support/folders.js';
import { requireProgram } from '../../support/requirements.js';
import { testApp } from './httpApp.js';
import { ScriptedPlant } from './scriptedPlant.js';

const servers: HttpServer[] = [];
afterEach(async () => {
  await Promise.all(servers.splice(0).map((server) => server.stop()));
});

async function listen(tuning: Partial<HttpTuning> = {}, config: Partial<HttpConfig> = {}) {
  const pageFolder = temporaryFolder('page');
  writeFileSync(join(pageFolder, 'index.html'), '<!doctype html><title>page</title>');
  const logged: string[] = [];
  const log = pino({ level: 'info' }, { write: (line: string) => void logged.push(line) });
  const server = createHttpServer(
    new ScriptedPlant(),
    { host: '127.0.0.1', port: 0, path_prefix: '', ...config },
    { log, pageFolder, tuning },
  );
  servers.push(server);
  const { url } = await server.start();
  return { url, port: Number(new URL(url).port), logged };
}

/** All that comes back on a connection that sends this, until it is ended. */
function exchange(port: number, text: string): Promise<string> {
  return new Promise((resolve) => {
    const socket = connect(port, '127.0.0.1', () => socket.write(text));
    let came = '';
    socket.on('data', (chunk) => {
      came += chunk;
    });
    socket.on('error', () => undefined);
    socket.on('close', () => resolve(came));
  });
}

describe('the server ends', () => {
  it('headers and bodies that trickle, and connections beyond its number', async () => {
    const quick = { headers_ms: 60, request_ms: 120, look_ms: 20 };
    const { port } = await listen(quick);
    const slowHead = await exchange(port, 'GET /api/units HTTP/1.1\r\nHost: 127.0.0.1\r\nX-A: ');
    expect(slowHead).toMatch(/^HTTP\/1\.1 408 .*unreadable_body/s);
    const slowBody = await exchange(
      port,
      'POST /api/login HTTP/1.1\r\nHost: 127.0.0.1\r\nContent-Type: application/json\r\nContent-Length: 99\r\n\r\n{"',
    );
    expect(slowBody).toMatch(/^HTTP\/1\.1 408 /);

    const narrow = await listen({ connections_most: 2 });
    const open = [1, 2].map(() => connect(narrow.port, '127.0.0.1'));
    await Promise.all(open.map((one) => new Promise((resolve) => one.once('connect', resolve))));
    const live = 'GET /api/live HTTP/1.1\r\nHost: 127.0.0.1\r\nConnection: close\r\n\r\n';
    expect(await exchange(narrow.port, live)).toBe('');
    for (const one of open) one.destroy();
    // Places are given back.
    await expect.poll(() => exchange(narrow.port, live)).toMatch(/^HTTP\/1\.1 200 /);
  });

  it('connections of an address that has its share already, and counts them', async () => {
    const { url, port } = await listen({ connections_each_most: 2 });
    const open = [1, 2].map(() => connect(port, '127.0.0.1'));
    await Promise.all(open.map((one) => new Promise((resolve) => one.once('connect', resolve))));
    const live = 'GET /api/live HTTP/1.1\r\nHost: 127.0.0.1\r\nConnection: close\r\n\r\n';
    expect(await exchange(port, live)).toBe('');
    for (const one of open) one.destroy();
    // Places are given back.
    await expect.poll(() => exchange(port, live)).toMatch(/^HTTP\/1\.1 200 /);
    const { counters } = await (await fetch(`${url}api/counters`)).json();
    expect(counters.http_connections_refused).toBeGreaterThan(0);
  });

  it('who asks on without reading the answers, or reads nothing of one for too long, and counts them', async () => {
    const question = 'GET /api/openapi.json HTTP/1.1\r\nHost: 127.0.0.1\r\n\r\n';
    const deaf = (port: number, questions: number) => {
      const socket = connect(port, '127.0.0.1', () => socket.write(question.repeat(questions)));
      socket.on('error', () => undefined);
      socket.pause();
      return socket;
    };
    const ended = async (url: string) =>
      (await (await fetch(`${url}api/counters`)).json()).counters.http_unread_ended as number;
    // All five are in one piece, and Node would answer them at once.
    const { port, url } = await listen();
    const five = await exchange(port, question.repeat(5));
    expect(five.match(/HTTP\/1\.1 200 /g) ?? []).not.toHaveLength(5);
    expect(await ended(url)).toBe(1);
    const four = question.repeat(3) + question.replace('\r\n\r\n', '\r\nConnection: close\r\n\r\n');
    expect((await exchange(port, four)).match(/HTTP\/1\.1 200 /g)).toHaveLength(4);

    // The system takes some MB for a client that does not read; of ten times four more than that waits.
    const narrow = await listen({ unread_most_bytes: 400_000 });
    const sockets: ReturnType<typeof deaf>[] = [];
    for (let n = 0; n < 60 && (await ended(narrow.url)) === 0; n++) {
      for (let more = 0; more < 4; more++) sockets.push(deaf(narrow.port, 4));
      await new Promise((resolve) => setTimeout(resolve, 20));
    }
    expect(await ended(narrow.url)).toBeGreaterThan(0);
    for (const socket of sockets) socket.destroy();

    const patient = await listen({ unread_ms: 100, look_ms: 20, waiting_each_most: 1e6 });
    const slow = deaf(patient.port, 4);
    for (let n = 0; n < 200 && (await ended(patient.url)) === 0; n++) {
      // Until the system takes no more for it.
      slow.write(question);
      await new Promise((resolve) => setTimeout(resolve, 20));
    }
    expect(await ended(patient.url)).toBeGreaterThan(0);
    slow.destroy();
  }, 30_000);

  it('what is too long in its head, or no HTTP, in the form of all faults', async () => {
    const { port } = await listen();
    const ask = (path: string, header = '') =>
      exchange(
        port,
        `GET ${path} HTTP/1.1\r\nHost: 127.0.0.1\r\nConnection: close\r\n${header}\r\n`,
      );
    const long = 'x'.repeat(20_000);
    for (const answer of [await ask(`/api/units?a=${long}`), await ask('/', `X-A: ${long}\r\n`)]) {
      expect(answer).toMatch(/^HTTP\/1\.1 431 /);
      expect(JSON.parse(answer.split('\r\n\r\n')[1]!).error.code).toBe('unreadable_body');
    }
    expect(await exchange(port, 'nonsense\r\n\r\n')).toMatch(/^HTTP\/1\.1 400 /);
  });
});

describe('a request body', () => {
  it('is bounded on every route that takes one', async () => {
    const { app } = await testApp();
    await app.ready();
    const { paths } = app.swagger() as { paths: Record<string, object> };
    const posts = Object.entries(paths).flatMap(([path, methods]) =>
      'post' in methods ? [path.replace('{unit}', 'north')] : [],
    );
    expect(posts.length).toBeGreaterThan(7);
    const big = JSON.stringify({ id: 'x'.repeat(300 * 1024) });
    for (const url of posts) {
      const headers = { 'content-type': 'application/json' };
      const answer = await app.inject({ method: 'POST', url, headers, payload: big });
      expect([url, answer.statusCode]).toEqual([url, 413]);
    }
    await app.close();
  });

  it.each([
    '{"__proto__": {"polluted": true}, "id": "a", "who": "b"}',
    '{"id": "a", "who": "b", "__proto__": {"polluted": true}}',
    '{"id": {"__proto__": {"polluted": true}}, "who": "b"}',
    '{"constructor": {"prototype": {"polluted": true}}, "id": "a", "who": "b"}',
    '{"id": "__proto__", "who": "constructor"}',
  ])('%s changes no prototype', async (payload) => {
    const { app, get } = await testApp();
    const headers = { 'content-type': 'application/json' };
    for (const url of ['/api/alarms/acknowledge', '/api/units/north/offers']) {
      const { statusCode } = await app.inject({ method: 'POST', url, headers, payload });
      expect([400, 404]).toContain(statusCode);
    }
    expect(({} as { polluted?: unknown }).polluted).toBeUndefined();
    for (const query of [
      '__proto__[polluted]=1',
      '__proto__=1',
      'constructor.prototype.polluted=1',
    ]) {
      expect((await get(`/api/alarms?${query}`)).statusCode).toBeLessThan(500);
    }
    for (const unit of ['__proto__', 'constructor', 'toString', 'hasOwnProperty']) {
      expect((await get(`/api/units/${unit}`)).statusCode).toBe(404);
      expect((await get(`/api/units/${unit}/history`)).statusCode).toBe(404);
    }
    expect(({} as { polluted?: unknown }).polluted).toBeUndefined();
    await app.close();
  });
});

describe('paths', () => {
  it('lead nowhere but to the files of the page', async () => {
    const { port } = await listen();
    for (const path of [
      '/../../../../etc/passwd',
      '/..%2f..%2f..%2f..%2fetc%2fpasswd',
      '/%2e%2e/%2e%2e/%2e%2e/etc/passwd',
      '/%252e%252e%252fetc/passwd',
      '/..\\..\\etc\\passwd',
      '/assets/..%2f..%2f..%2fetc%2fpasswd',
      '/index.html%00.js',
      '/api/units/..%2f..%2fetc%2fpasswd',
      '/api/units/north/../../../etc/passwd',
      '/api/units/%2e%2e/report',
    ]) {
      const answer = await exchange(
        port,
        `GET ${path} HTTP/1.1\r\nHost: 127.0.0.1\r\nConnection: close\r\n\r\n`,
      );
      expect(answer, path).toMatch(/^HTTP\/1\.1 40[04] /);
      expect(answer).not.toContain('root:');
    }
  });
});

describe.skipIf(!requireProgram('openssl'))('with TLS', () => {
  const made = makeCertificates();
  const authority = () => readFileSync(made.ca);

  /** Status and headers of an answer, and the name in the certificate it came by. */
  function ask(url: string) {
    const agent = new Agent({ ca: authority(), keepAlive: false });
    return new Promise<{ status: number; hsts: string; name: string }>((resolve, reject) => {
      const asked = request(`${url}api/live`, { agent }, (answer) => {
        answer.resume();
        const { subject } = (
          answer.socket as unknown as { getPeerCertificate(): { subject: { CN: string } } }
        ).getPeerCertificate();
        const hsts = String(answer.headers['strict-transport-security']);
        resolve({ status: answer.statusCode ?? 0, hsts, name: subject.CN });
      });
      asked.on('error', reject).end();
    });
  }

  it('answers by 1.2 or later, says so for later, and takes over a new certificate', async () => {
    const first = made.make('first', ['127.0.0.1']);
    const second = made.make('second', ['127.0.0.1']);
    const folder = temporaryFolder('tls');
    const [cert_file, key_file] = [join(folder, 'cert'), join(folder, 'key')];
    const put = ({ cert, key }: typeof first) => {
      writeFileSync(cert_file, readFileSync(cert));
      writeFileSync(key_file, readFileSync(key));
      const read = (file: string) => readFileSync(file, 'utf8');
      return { cert_file, key_file, cert: read(cert_file), key: read(key_file) };
    };
    const { url, port, logged } = await listen({ certificate_look_ms: 20 }, { tls: put(first) });
    expect(url).toMatch(/^https:/);
    expect(await ask(url)).toEqual({
      ...{ status: 200, hsts: 'max-age=15768000', name: 'first' },
    });
    const old = await new Promise<{ code?: string }>((resolve) => {
      const socket = connectSecurely({
        ...{ host: '127.0.0.1', port, ca: authority(), minVersion: 'TLSv1', maxVersion: 'TLSv1.1' },
        ciphers: 'DEFAULT@SECLEVEL=0',
      });
      socket.on('error', resolve);
      socket.on('secureConnect', () => resolve({ code: 'let in' }));
    });
    expect(old.code).toBe('ERR_SSL_TLSV1_ALERT_PROTOCOL_VERSION');

    put(second);
    await expect.poll(async () => (await ask(url)).name, { timeout: 5000 }).toBe('second');
    writeFileSync(cert_file, 'no certificate');
    await expect.poll(() => logged.join()).toContain('goes on with the certificate before');
    expect((await ask(url)).name).toBe('second');
    expect(logged.join()).not.toContain('PRIVATE KEY');
  });
});
