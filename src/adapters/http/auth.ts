import type { FastifyReply, FastifyRequest } from 'fastify';
import type { Access, Holder } from '../../access/access.js';
import type { LoginFailures } from '../../access/failures.js';
import { networkOf } from '../../access/places.js';
import { covers, type Rank } from '../../access/role.js';
import { TOKEN_PATTERN } from '../../access/token.js';
import { recordedWho } from '../../access/who.js';
import { HttpFault } from './faults.js';
import { countRefused } from './rates.js';
import type { HttpApp } from './routes.js';

/** What a route asks of whoever calls it; `public`: nothing. */
export type RouteRole = Rank | 'public';

declare module 'fastify' {
  interface FastifyContextConfig {
    /** Least role; a route without one cannot be declared. */
    role?: RouteRole;
  }
  interface FastifyRequest {
    /** Whose token came with the request; null where none did, or none is asked for. */
    holder: Holder | null;
  }
}

export const COOKIE = 'rockhour_login';
/** A page of a control room is not logged out in the night [s]: thirty days. */
const COOKIE_AGE_S = 30 * 86_400;

export interface Entrance {
  readonly access: Access;
  readonly failures: LoginFailures;
  /** A proxy in front does the log-in: it may call this machine by any name. */
  readonly login_by_proxy: boolean;
  readonly prefix: string;
  readonly isSecure: boolean;
}

export interface Guard {
  /** Routes declared meanwhile are files of the page, which a library declares: open to all. */
  publicly(declare: () => Promise<void>): Promise<void>;
}

const CHALLENGE = 'Bearer realm="rockhour"';

/**
 * Lets in whom the route of a request is for: refuses to declare a route without a role, finds
 * out whose token came along (header first, then cookie), and answers 401 or 403 before anything
 * else is done. A request that changes something by the cookie has to come from the page itself.
 */
export function addGuard(app: HttpApp, entrance: Entrance): Guard {
  let isPage = false;
  app.decorateRequest('holder', null);
  app.addHook('onRoute', (route) => {
    const { method, url, config } = route;
    if (config?.role !== undefined) return;
    if (isPage) {
      route.config = { ...config, role: 'public' };
      return;
    }
    throw new RangeError(
      `config.role of ${method} ${url} is missing: every route declares its role`,
    );
  });
  app.addHook('onRequest', async (request, reply) => {
    refuseForeignPage(request);
    const role = request.routeOptions.config.role ?? 'public';
    const { access } = entrance;
    if (access.isOpen) {
      if (!entrance.login_by_proxy) requireLocalName(request);
      return;
    }
    const bearer = bearerOf(request.headers.authorization);
    const shown = bearer ?? cookieOf(request.headers.cookie);
    request.holder = shown === null ? null : access.holderOf(shown);
    if (role === 'public' || request.is404) return;
    if (request.holder === null) {
      const refusal = refuseToken(entrance, request, reply, shown !== null);
      if (refusal.statusCode === 401) await countRefused(request, reply);
      throw refusal;
    }
    if (!covers(request.holder.role, role)) await countRefused(request, reply);
    requireRole(request.holder, role);
    if (bearer === null && !isReading(request.method)) requireOwnPage(request);
  });
  // Before the body is held against its schema, which wants a name.
  app.addHook('preValidation', async (request) => {
    const { holder, body } = request;
    if (holder === null || request.routeOptions.config.role === 'public') return;
    if (!/\/api\/alarms\/[a-z-]+$/.test(request.routeOptions.url ?? '')) return;
    if (typeof body !== 'object' || body === null || Array.isArray(body)) return;
    (body as { who?: unknown }).who = recordedWho(holder, (body as { who?: unknown }).who);
  });
  return {
    async publicly(declare) {
      isPage = true;
      await declare();
      isPage = false;
    },
  };
}

/** @throws HttpFault 403 where the holder may not do this */
export function requireRole(holder: Holder | null, role: Rank): void {
  if (holder === null || covers(holder.role, role)) return;
  const { name, role: own } = holder;
  throw new HttpFault(
    403,
    'not_allowed',
    `the token ${name} is for ${own}; this needs one for ${role}`,
    { field: 'role', value: own, expected: role },
  );
}

/** 401, or 429 where wrong tokens come by the dozen; the token itself is never shown. */
export function refuseToken(
  { failures }: Entrance,
  request: FastifyRequest,
  reply: FastifyReply,
  isWrong: boolean,
): HttpFault {
  reply.header('www-authenticate', CHALLENGE);
  const expected = 'a token that rockhour admit has made, as Authorization: Bearer TOKEN';
  if (!isWrong) {
    const words = 'log in first: this needs a token, and none came along';
    return new HttpFault(401, 'not_logged_in', words, { field: 'authorization', expected });
  }
  const wait_s = failures.add(networkOf(request.ip));
  if (wait_s > 0) {
    reply.header('retry-after', String(wait_s));
    const words = `too many wrong tokens from this address; try again in ${wait_s} s`;
    return new HttpFault(429, 'too_many_requests', words, { field: 'authorization', expected });
  }
  const words = 'nobody is known by this token: it is wrong, or was taken back';
  return new HttpFault(401, 'not_logged_in', words, { field: 'authorization', expected });
}

const isReading = (method: string) => method === 'GET' || method === 'HEAD';

/** The token of `Authorization: Bearer TOKEN`; '' where another scheme came, null without. */
function bearerOf(header: string | undefined): string | null {
  if (header === undefined) return null;
  return /^Bearer +([^\s]+) *$/i.exec(header)?.[1] ?? '';
}

function cookieOf(header: string | undefined): string | null {
  for (const part of header?.split(';') ?? []) {
    const [name, value] = part.trim().split('=', 2);
    if (name === COOKIE && value !== undefined && value !== '') return value;
  }
  return null;
}

/**
 * The page's own requests name the page: by Sec-Fetch-Site where the browser sends it, which no
 * proxy changes, else by an Origin that is the address it was asked under.
 * @throws HttpFault 403
 */
export function requireOwnPage({ headers }: FastifyRequest): void {
  const { origin, host } = headers;
  const site = headers['sec-fetch-site'];
  const isOwn = site !== undefined ? site === 'same-origin' : isOrigin(origin, host);
  if (isOwn) return;
  throw new HttpFault(
    403,
    'other_origin',
    'a log-in by cookie changes things only from the page itself',
    {
      field: site === undefined ? 'origin' : 'sec-fetch-site',
      value: String(site ?? origin ?? null),
      expected: 'the page of this address; programs send Authorization: Bearer',
    },
  );
}

/**
 * A page of somewhere else may send somebody here, by a link; all else that it asks for, it asks
 * blindly: to do something in the name of the operator at whose browser it is, or to use up what
 * this machine may ask. It is turned away before it is counted. A program says neither of the two.
 * @throws HttpFault 403
 */
function refuseForeignPage({ headers, method }: FastifyRequest): void {
  // No page can send this one along without asking first, and nobody answers that question.
  if (headers.authorization !== undefined) return;
  const { origin, host } = headers;
  const [site, mode, dest] = ['site', 'mode', 'dest'].map((part) => headers[`sec-fetch-${part}`]);
  if (site === undefined) {
    if (isReading(method) || origin === undefined || isOrigin(origin, host)) return;
  } else {
    if (site === 'same-origin' || site === 'none') return;
    if (isReading(method) && mode === 'navigate' && (dest ?? 'document') === 'document') return;
  }
  throw new HttpFault(403, 'other_origin', 'a page of another address asks for this', {
    field: site === undefined ? 'origin' : 'sec-fetch-site',
    value: String(site ?? origin),
    expected: 'the page of this address; programs send neither',
  });
}

function isOrigin(origin: string | undefined, host: string | undefined): boolean {
  return origin !== undefined && URL.canParse(origin) && new URL(origin).host === host;
}

const LOCAL_NAME = /^(localhost|127(\.\d{1,3}){3}|\[::1\]|\[?::ffff:127\.[\d.]+\]?)(:\d+)?$/i;

/**
 * Without tokens only this machine is served, and it is asked for by a name of its own: a page of
 * somewhere else whose name was made to lead here (DNS rebinding) is not.
 * @throws HttpFault 403
 */
function requireLocalName({ headers }: FastifyRequest): void {
  const { host } = headers;
  if (host === undefined || LOCAL_NAME.test(host)) return;
  throw new HttpFault(
    403,
    'other_origin',
    'without tokens rockhour answers only to names of this machine',
    {
      field: 'host',
      value: host,
      expected: 'localhost or 127.0.0.1; behind a proxy with a log-in http.login_by_proxy: true',
    },
  );
}

/**
 * The cookie of a log-in, or, without a token, its end. Secure where the page itself came by TLS,
 * of rockhour's own or of a proxy: the browser's Origin says so.
 */
export function loginCookie(
  { prefix, isSecure }: Entrance,
  request: FastifyRequest,
  token: string | null,
): string {
  const parts = [
    `${COOKIE}=${token ?? ''}`,
    `Path=${prefix}/`,
    `Max-Age=${token === null ? 0 : COOKIE_AGE_S}`,
    'HttpOnly',
    'SameSite=Strict',
  ];
  if (isSecure || request.headers.origin?.startsWith('https:')) parts.push('Secure');
  return parts.join('; ');
}

const EVERY_TOKEN = new RegExp(TOKEN_PATTERN, 'g');
/** Takes tokens out of an answer that quotes what was sent, wherever they stood there. */
export function withoutTokens<T>(body: T): T {
  const text = JSON.stringify(body);
  return TOKEN_PATTERN.test(text) ? (JSON.parse(text.replace(EVERY_TOKEN, '***')) as T) : body;
}
