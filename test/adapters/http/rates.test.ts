import { afterEach, describe, expect, it } from 'vitest';
import { Access } from '../../../src/access/access.js';
import type { HttpTuning } from '../../../src/adapters/http/tuning.js';
import { holders } from '../../access/holders.js';
import { testApp } from './httpApp.js';

const { tokens, list } = holders();
const ends: (() => Promise<unknown>)[] = [];
afterEach(async () => {
  for (const end of ends.splice(0)) await end();
});

/** An app with tokens, or open to its own machine, and who asks there from where. */
async function asked(isOpen: boolean, tuning: Partial<HttpTuning>) {
  const access = new Access(isOpen ? [] : list);
  const { app } = await testApp({ access, tuning });
  ends.push(() => app.close());
  const ask = (url: string, by: { token?: string; from?: string } = {}) =>
    app.inject({
      ...{ url, remoteAddress: by.from ?? '10.0.0.1' },
      headers: {
        host: 'localhost',
        ...(by.token === undefined ? {} : { authorization: `Bearer ${by.token}` }),
      },
    });
  /** Counted with a token that has asked for nothing else, on a route that is not limited. */
  const counted = async () => {
    const { body } = await ask('/metrics', isOpen ? {} : { token: tokens.configure });
    return Number(
      /rockhour_http_faults_total\{code="too_many_requests"\} (\d+)/.exec(body)?.[1] ?? Number.NaN,
    );
  };
  return { ask, counted };
}

const CEILING = 4;

describe('floods', () => {
  it('of a token are refused until when it says, and counted; nobody else is touched', async () => {
    const { ask, counted } = await asked(false, { questions_per_min: CEILING });
    const { view, acknowledge } = tokens;
    expect(await counted()).toBe(0);
    const codes: number[] = [];
    // From many addresses, over many routes, also one that is not there: it is one token.
    for (const [i, url] of [
      ...['/api/units', '/api/units/north', '/api/alarms', '/api/events', '/api/units'],
      ...['/api/units/nowhere', '/'],
    ].entries()) {
      codes.push((await ask(url, { token: view, from: `10.0.1.${i}` })).statusCode);
    }
    expect(codes).toEqual([200, 200, 200, 200, 429, 429, 429]);
    const late = await ask('/api/units', { token: view });
    expect(late.statusCode).toBe(429);
    expect(Number(late.headers['retry-after'])).toBeGreaterThan(0);
    expect(Number(late.headers['retry-after'])).toBeLessThanOrEqual(60);
    expect(late.json().error).toMatchObject({
      ...{ code: 'too_many_requests', field: null, expected: `at most ${CEILING} a minute` },
    });
    expect(late.body).not.toContain(view);
    expect(await counted()).toBe(4);

    // The same address under another token, and without one.
    expect((await ask('/api/units', { token: acknowledge })).statusCode).toBe(200);
    expect((await ask('/')).statusCode).toBe(200);
    // Probes and scrapes of the flooded token go on.
    for (const url of ['/api/health', '/metrics', '/api/live', '/api/ready']) {
      expect([url, (await ask(url, { token: view })).statusCode]).toEqual([url, 200]);
    }
  });

  it('of an address without a token are refused likewise, and touch no token there', async () => {
    const { ask, counted } = await asked(false, { questions_per_min: CEILING });
    const codes: number[] = [];
    for (let i = 0; i < CEILING + 2; i++) codes.push((await ask('/')).statusCode);
    expect(codes).toEqual([200, 200, 200, 200, 429, 429]);
    expect(Number((await ask('/api/login')).headers['retry-after'])).toBeGreaterThan(0);
    expect(await counted()).toBe(3);
    expect((await ask('/api/units', { token: tokens.view })).statusCode).toBe(200);
    expect((await ask('/', { from: '10.0.0.2' })).statusCode).toBe(200);
  });

  it('of what needs a token, by an address that has none, count as well', async () => {
    const { ask } = await asked(false, { questions_per_min: CEILING });
    const codes: number[] = [];
    for (const url of [
      '/api/units',
      '/api/alarms',
      '/nothing/here',
      '/api/units',
      '/',
      '/api/units',
    ])
      codes.push((await ask(url)).statusCode);
    expect(codes).toEqual([401, 401, 404, 401, 429, 429]);
  });

  it('where no tokens are set, are refused by address', async () => {
    const { ask, counted } = await asked(true, { questions_per_min: CEILING });
    const codes: number[] = [];
    for (let i = 0; i < CEILING + 2; i++) codes.push((await ask('/api/units')).statusCode);
    expect(codes).toEqual([200, 200, 200, 200, 429, 429]);
    expect(await counted()).toBe(2);
    expect((await ask('/api/units', { from: '10.0.0.2' })).statusCode).toBe(200);
    // An IPv6 network is one asker: it has 2^64 addresses to choose from.
    for (let i = 0; i < CEILING; i++) await ask('/api/units', { from: `2001:db8::${i + 1}` });
    expect((await ask('/api/units', { from: '2001:db8::99' })).statusCode).toBe(429);
    expect((await ask('/api/units', { from: '2001:db8:0:1::1' })).statusCode).toBe(200);
  });

  it('by a page of somewhere else, in the browser of an operator, use up nothing of theirs', async () => {
    const access = new Access([]);
    const { app } = await testApp({ access, tuning: { questions_per_min: CEILING } });
    ends.push(() => app.close());
    const ask = async (headers: Record<string, string>, url = '/api/units') =>
      (await app.inject({ url, headers: { host: 'localhost:8080', ...headers } })).statusCode;
    const foreign = { 'sec-fetch-site': 'cross-site', 'sec-fetch-mode': 'no-cors' };
    const frame = { ...foreign, 'sec-fetch-mode': 'navigate', 'sec-fetch-dest': 'iframe' };
    const stream = { ...foreign, 'sec-fetch-mode': 'cors', accept: 'text/event-stream' };
    for (let i = 0; i < CEILING; i++) {
      expect(await ask(foreign)).toBe(403);
      expect(await ask(foreign, '/api/units/north/hours?power_MW=1')).toBe(403);
      expect(await ask(frame, '/')).toBe(403);
      expect(await ask(stream, '/api/stream')).toBe(403);
      expect(await ask({ ...foreign, 'sec-fetch-site': 'same-site' })).toBe(403);
    }
    // Another program of this machine changes nothing by a form or a script, even as JSON.
    const post = (headers: Record<string, string>) =>
      app.inject({
        ...{ method: 'POST', url: '/api/alarms/acknowledge', payload: '{}' },
        headers: { host: 'localhost:8080', 'content-type': 'application/json', ...headers },
      });
    for (const headers of [{ origin: 'http://elsewhere' }, { origin: 'null' }, foreign]) {
      const answer = await post(headers as Record<string, string>);
      expect([answer.statusCode, answer.json().error.code]).toEqual([403, 'other_origin']);
    }
    // A link leads here, the page asks for itself, a program as well.
    const link = { ...foreign, 'sec-fetch-mode': 'navigate', 'sec-fetch-dest': 'document' };
    expect(await ask(link, '/')).toBe(200);
    expect(await ask({ 'sec-fetch-site': 'same-origin' })).toBe(200);
    expect((await post({ origin: 'http://localhost:8080' })).statusCode).toBe(400);
    expect(await ask({})).toBe(200);
    expect(await ask({})).toBe(429);
  });

  it('of what rolls the stores forward have a lower ceiling, for each token its own', async () => {
    const { ask } = await asked(false, { hours_per_min: 2 });
    const url = '/api/units/north/hours?power_MW=1';
    const codes: number[] = [];
    for (let i = 0; i < 4; i++) codes.push((await ask(url, { token: tokens.view })).statusCode);
    expect(codes).toEqual([200, 200, 429, 429]);
    expect((await ask(url, { token: tokens.acknowledge })).statusCode).toBe(200);
    expect((await ask('/api/units', { token: tokens.view })).statusCode).toBe(200);
  });
});
