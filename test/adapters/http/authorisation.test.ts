import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest';
import { covers, ROLES } from '../../../src/access/role.js';
import { COOKIE } from '../../../src/adapters/http/auth.js';
import { faultSchema } from '../../../src/adapters/http/schema/answers.js';
import { holders } from '../../access/holders.js';
import { testApp } from './httpApp.js';

/** Every route with the least role; what is not in this table is not served. */
const TABLE = {
  'GET /': 'public',
  'GET /api/live': 'public',
  'GET /api/ready': 'public',
  'GET /api/login': 'public',
  'POST /api/login': 'public',
  'POST /api/logout': 'public',
  'GET /api/openapi.json': 'view',
  'GET /metrics': 'view',
  'GET /api/health': 'view',
  'GET /api/counters': 'view',
  'GET /api/units': 'view',
  'GET /api/units/{unit}': 'view',
  'GET /api/units/{unit}/hours': 'view',
  'GET /api/units/{unit}/sensors': 'view',
  'GET /api/units/{unit}/headroom': 'view',
  'GET /api/units/{unit}/profile': 'view',
  'GET /api/units/{unit}/profiles': 'view',
  'GET /api/units/{unit}/history': 'view',
  'GET /api/units/{unit}/offers': 'view',
  'POST /api/units/{unit}/offers': 'view',
  'GET /api/units/{unit}/offers/history': 'view',
  'GET /api/units/{unit}/offers/history/{no}': 'view',
  'GET /api/units/{unit}/offers/report': 'view',
  'POST /api/units/{unit}/schedule': 'view',
  'GET /api/units/{unit}/capability': 'view',
  'GET /api/units/{unit}/balance': 'view',
  'GET /api/units/{unit}/watch': 'view',
  'GET /api/units/{unit}/watch/history': 'view',
  'GET /api/units/{unit}/cycles': 'view',
  'GET /api/units/{unit}/rewinds': 'view',
  'GET /api/units/{unit}/report': 'view',
  'GET /api/events': 'view',
  'GET /api/alarms': 'view',
  'GET /api/alarms/transitions': 'view',
  'GET /api/alarms/figures': 'view',
  'GET /api/stream': 'view',
  'POST /api/alarms/acknowledge': 'acknowledge',
  'POST /api/alarms/shelve': 'acknowledge',
  'POST /api/alarms/unshelve': 'acknowledge',
  'POST /api/alarms/reset': 'acknowledge',
  'POST /api/alarms/out-of-service': 'configure',
  'POST /api/alarms/return-to-service': 'configure',
  'GET /api/units/{unit}/backup': 'configure',
  'PUT /api/units/{unit}/backup': 'configure',
} as const;

const { access, tokens, list } = holders();
const bearer = (token: string) => ({ authorization: `Bearer ${token}` });
let built: Awaited<ReturnType<typeof testApp>>;
beforeAll(async () => {
  built = await testApp({ access, tuning: { wrong_tokens_per_min: 1_000 } });
  await built.app.ready();
});
afterAll(() => built.app.close());
afterEach(() => access.replace(list));

function ask(route: string, headers: Record<string, string> = {}, payload?: object) {
  const [method, path] = route.split(' ') as ['GET' | 'POST' | 'PUT', string];
  const url = path.replace('{unit}', 'north').replace('{no}', '1');
  // A stream would not end by itself.
  const accept = path === '/api/stream' ? { accept: 'text/html' } : {};
  const body = payload === undefined ? {} : { payload };
  return built.app.inject({ method, url, headers: { ...accept, ...headers }, ...body });
}

describe('every route and every role', () => {
  it('is in the table, and every route declares its role', async () => {
    const { paths } = built.app.swagger() as { paths: Record<string, Record<string, unknown>> };
    const described = Object.entries(paths).flatMap(([path, methods]) =>
      Object.keys(methods).map((method) => `${method.toUpperCase()} ${path}`),
    );
    const hidden = ['GET /', 'GET /api/openapi.json'];
    expect([...described, ...hidden].sort()).toEqual(Object.keys(TABLE).sort());
    const other = await testApp();
    expect(() => other.app.get('/api/forgotten', async () => 'secret')).toThrow(
      /declares its role/,
    );
    await other.app.close();
  });

  it.each(Object.entries(TABLE))('%s: %s', async (route, needed) => {
    const without = await ask(route);
    if (needed === 'public') expect(without.statusCode).not.toBe(401);
    else {
      expect(without.statusCode).toBe(401);
      expect(without.headers['www-authenticate']).toMatch(/^Bearer/);
      expect(faultSchema.strict().parse(without.json()).error.code).toBe('not_logged_in');
      expect((await ask(route, bearer(`${tokens.view}x`))).statusCode).toBe(401);
      expect((await ask(route, { authorization: `Basic ${btoa('a:b')}` })).statusCode).toBe(401);
    }
    for (const role of ROLES) {
      const { statusCode, body } = await ask(route, bearer(tokens[role]));
      const mayIn = needed === 'public' || covers(role, needed);
      const said = mayIn ? 'let in' : 'not_allowed';
      expect([role, statusCode === 403 ? JSON.parse(body).error.code : 'let in']).toEqual([
        role,
        said,
      ]);
      expect(statusCode).not.toBe(401);
    }
  });

  it('holds for HEAD as for GET, and an unknown path tells no more than without tokens', async () => {
    const head = (headers = {}) => built.app.inject({ method: 'HEAD', url: '/api/units', headers });
    expect((await head()).statusCode).toBe(401);
    expect((await head(bearer(tokens.view))).statusCode).toBe(200);
    expect((await built.get('/api/nothing')).statusCode).toBe(404);
  });

  it('lets nobody keep an offer who may only look', async () => {
    const route = 'GET /api/units/{unit}/offers';
    const offer = (role: keyof typeof tokens, keep: string) =>
      built.app.inject({
        url: `/api/units/north/offers?power_MW=1.2&keep=${keep}`,
        headers: bearer(tokens[role]),
      });
    expect(route in TABLE).toBe(true);
    expect((await offer('view', 'false')).statusCode).toBe(200);
    expect((await offer('view', 'true')).json().error.code).toBe('not_allowed');
    expect((await offer('acknowledge', 'true')).statusCode).toBe(200);
  });
});

describe('who is recorded', () => {
  let subjects = 0;
  const acknowledge = async (role: keyof typeof tokens, who?: string) => {
    const { id } = built.plant.raise({ kind: 'front_spread', subject: `s${subjects++}` });
    const payload = { id, ...(who === undefined ? {} : { who }) };
    return ask('POST /api/alarms/acknowledge', bearer(tokens[role]), payload);
  };

  it('is the name of the token, with the name given behind it', async () => {
    expect((await acknowledge('acknowledge')).json().who).toBe('a_acknowledge');
    expect((await acknowledge('acknowledge', 'Ada')).json().who).toBe('a_acknowledge (Ada)');
    // Nobody signs as the holder of another token.
    expect((await acknowledge('configure', 'a_acknowledge')).json().who).toBe(
      'a_configure (a_acknowledge)',
    );
    const long = await acknowledge('acknowledge', 'n'.repeat(60));
    expect(long.statusCode).toBe(400);
    expect(long.json().error.field).toBe('who');
  });
});

describe('the log-in of the page', () => {
  const login = (token: unknown, headers: Record<string, string> = {}) =>
    ask('POST /api/login', headers, { token } as object);
  const OWN = { 'sec-fetch-site': 'same-origin' };

  it('gives a cookie that scripts cannot read and other sites cannot send', async () => {
    const answer = await login(tokens.acknowledge, OWN);
    expect(answer.json()).toEqual({ asked: true, name: 'a_acknowledge', role: 'acknowledge' });
    const cookie = String(answer.headers['set-cookie']);
    expect(cookie.split('; ').slice(1)).toEqual([
      ...['Path=/', 'Max-Age=2592000', 'HttpOnly', 'SameSite=Strict'],
    ]);
    const byProxy = await login(tokens.view, {
      origin: 'https://localhost:8080',
      host: 'localhost:8080',
    });
    expect(byProxy.headers['set-cookie']).toContain('; Secure');
    const end = await ask('POST /api/logout', OWN);
    expect(end.headers['set-cookie']).toMatch(/^rockhour_login=; .*Max-Age=0/);
  });

  it('has the path of the prefix', async () => {
    const { app } = await testApp({ access, prefix: '/works/heat' });
    const answer = await app.inject({
      ...{ method: 'POST', url: '/works/heat/api/login' },
      payload: { token: tokens.view },
    });
    expect(answer.headers['set-cookie']).toContain('; Path=/works/heat/;');
    await app.close();
  });

  it('lets in by the cookie, which changes things from the page itself alone', async () => {
    const cookie = { cookie: `other=1; ${COOKIE}=${tokens.configure}` };
    expect((await ask('GET /api/units', cookie)).statusCode).toBe(200);
    expect((await ask('GET /api/login', cookie)).json().name).toBe('a_configure');
    const { id } = built.plant.raise({ kind: 'front_spread', subject: 'hot' });
    const post = async (headers: Record<string, string>) => {
      const answer = await ask('POST /api/alarms/acknowledge', { ...cookie, ...headers }, { id });
      return answer.statusCode === 403 ? answer.json().error.code : answer.statusCode;
    };
    const host = 'localhost:8080';
    for (const headers of [
      {},
      { 'sec-fetch-site': 'cross-site', origin: 'http://localhost:8080' },
      { 'sec-fetch-site': 'same-site' },
      { 'sec-fetch-site': 'none' },
      { origin: 'http://elsewhere' },
      { origin: 'null' },
      { origin: 'http://localhost:8081', host },
    ]) {
      expect(await post(headers as Record<string, string>)).toBe('other_origin');
    }
    expect(built.plant.acknowledged.map((one) => one.id)).not.toContain(id);
    expect(await post({ origin: 'http://localhost:8080', host })).toBe(200);
    // A header beside the cookie comes from a program.
    expect((await ask('GET /api/units', { ...cookie, ...bearer('wrong') })).statusCode).toBe(401);
  });

  it('turns away foreign pages, wrong tokens and those of gateways', async () => {
    expect((await login(tokens.view, { 'sec-fetch-site': 'cross-site' })).statusCode).toBe(403);
    expect((await login(tokens.view, { origin: 'http://elsewhere' })).statusCode).toBe(403);
    expect((await login('rockhour-wrong')).statusCode).toBe(401);
    const gateway = await login(tokens.feed);
    expect([gateway.statusCode, gateway.headers['set-cookie']]).toEqual([403, undefined]);
    for (const wrong of ['', 7, [tokens.view], 'x'.repeat(257)]) {
      const answer = await login(wrong);
      expect(answer.statusCode).toBe(400);
      expect(answer.body).not.toContain(tokens.view);
    }
    expect((await login('x'.repeat(2000))).statusCode).toBe(413);
  });
});

describe('live streams of one token', () => {
  it('leave places for others, and are given back', async () => {
    const { app, stream } = await testApp({ access, tuning: { streams_each_most: 1 } });
    const url = await app.listen({ host: '127.0.0.1', port: 0 });
    const open = (role: 'view' | 'acknowledge') => {
      const headers = { ...bearer(tokens[role]), accept: 'text/event-stream' };
      return fetch(`${url}/api/stream`, { headers });
    };
    const first = await open('view');
    const second = await open('view');
    expect([first.status, second.status]).toEqual([200, 503]);
    expect((await second.json()).error).toMatchObject({
      ...{ code: 'too_many_streams', expected: 'at most 1 streams with this token' },
    });
    const other = await open('acknowledge');
    expect(other.status).toBe(200);
    await first.body!.cancel();
    await expect.poll(() => stream.openOf('a_view')).toBe(0);
    const again = await open('view');
    expect(again.status).toBe(200);
    await Promise.all([other, again].map(({ body }) => body!.cancel()));
    await app.close();
  });
});

describe('a token that is taken back', () => {
  it('is refused from then on, and its stream ends; others go on', async () => {
    const url = await built.app.listen({ host: '127.0.0.1', port: 0 });
    built.stream.start();
    const open = async (role: 'view' | 'configure') => {
      const headers = { ...bearer(tokens[role]), accept: 'text/event-stream' };
      const reader = (await fetch(`${url}/api/stream`, { headers })).body!.getReader();
      await reader.read();
      return reader;
    };
    const [one, other] = [await open('view'), await open('configure')];
    expect(built.stream.open).toBe(2);
    access.replace(list.filter(({ role }) => role !== 'view'));
    let ended = false;
    while (!ended) ended = (await one.read()).done;
    await expect.poll(() => built.stream.open).toBe(1);
    expect((await ask('GET /api/units', bearer(tokens.view))).statusCode).toBe(401);
    expect((await ask('GET /api/units', bearer(tokens.configure))).statusCode).toBe(200);
    await other.cancel();
    await expect.poll(() => built.stream.open).toBe(0);
  });
});

describe('wrong tokens', () => {
  it('by the dozen are told to wait, and a right one of the same address is let in', async () => {
    const { app } = await testApp({ access, tuning: { wrong_tokens_per_min: 3 } });
    const status = async (token: string) =>
      (await app.inject({ url: '/api/units', headers: bearer(token) })).statusCode;
    const wrong = [1, 2, 3, 4, 5].map((i) => status(`rockhour-wrong${i}`));
    expect(await Promise.all(wrong)).toEqual([401, 401, 401, 429, 429]);
    const late = await app.inject({ url: '/api/units', headers: bearer('wrong') });
    expect(late.json().error.code).toBe('too_many_requests');
    expect(Number(late.headers['retry-after'])).toBeGreaterThan(0);
    expect(await status(tokens.view)).toBe(200);
    await app.close();
  });
});

describe('without tokens', () => {
  it('this machine is served under its own names, and nothing else unless a proxy logs in', async () => {
    const open = await testApp();
    const proxied = await testApp({ login_by_proxy: true });
    const status = async ({ app }: typeof open, host: string) =>
      (await app.inject({ url: '/api/units', headers: { host } })).statusCode;
    for (const host of ['localhost', 'localhost:8080', '127.0.0.1:8080', '[::1]:8080']) {
      expect(await status(open, host)).toBe(200);
    }
    for (const host of [
      'elsewhere',
      'localhost.elsewhere:8080',
      '127.0.0.1.elsewhere',
      'a@localhost',
    ]) {
      expect(await status(open, host)).toBe(403);
      expect(await status(proxied, host)).toBe(200);
    }
    const nothing = await open.app.inject({
      method: 'POST',
      url: '/api/login',
      payload: { token: 'x' },
    });
    expect(nothing.statusCode).toBe(409);
    expect((await open.get('/api/login')).json()).toEqual({ asked: false, name: null, role: null });
    await Promise.all([open.app.close(), proxied.app.close()]);
  });
});
