import { connect } from 'node:net';
import { FAULT_CODES } from '../../src/adapters/http/faults.js';
import { type Rolls, randomBytesOf } from './rolls.js';

const METHODS = [
  'GET',
  'GET',
  'GET',
  'POST',
  'PUT',
  'DELETE',
  'HEAD',
  'OPTIONS',
  'PATCH',
  'TRACE',
  'X',
];
/** Cheap ones often, those that roll the stores forward seldom: they take seconds each. */
const PATHS = [
  'api/health',
  'api/units',
  'api/counters',
  'api/events',
  'api/alarms',
  'api/alarms/report',
  'metrics',
  'api/units/UNIT',
  'api/units/UNIT/profile',
  'api/units/UNIT/history',
  'api/units/UNIT/cycles',
  'api/units/UNIT/watch',
  'api/units/UNIT/offers/history',
  'api/units/UNIT/playback',
  'api/alarms/acknowledge',
  'api/alarms/shelve',
  'api/openapi.json',
  '',
  'index.html',
  'assets/',
  'login',
  'api/units/UNIT/offers',
  'api/units/UNIT/schedule',
];
const DEAR = ['api/units/UNIT/hours', 'api/units/UNIT/headroom', 'api/units/UNIT/capability'];
const ODD = [
  '../../etc/passwd',
  '..%2f..%2fetc%2fpasswd',
  '%2e%2e/%2e%2e/package.json',
  '%00',
  '%',
  '%zz',
  '//',
  '\\..\\',
  '__proto__',
  'constructor',
  'a'.repeat(3000),
  '%F0%9F%94%A5',
  ';',
  '?',
  '#',
  'api/../api/units',
  '.git/config',
];
const KEYS = [
  'from',
  'to',
  'power_MW',
  'series',
  'points',
  'limit',
  'format',
  'unit',
  'most',
  '__proto__',
  'x[]',
];
const VALUES = [
  '',
  '0',
  '-1',
  '1e999',
  'NaN',
  '9'.repeat(50),
  'null',
  '2026-01-01T00:00:00Z',
  '1970',
  '[object Object]',
  '%00',
  '%ff',
  "' OR 1=1",
  '<b>',
  '1,2,3',
  'csv',
  'json',
  'a'.repeat(500),
];
const TYPES = [
  'application/json',
  'application/json',
  'text/plain',
  'application/x-www-form-urlencoded',
  'multipart/form-data',
  'application/json; charset=utf-16',
  '',
  'text/csv',
];
const BODIES = [
  '',
  '{}',
  '[]',
  'null',
  '{"__proto__":{"admin":true}}',
  '{"constructor":{"prototype":{"x":1}}}',
  '{"id":1',
  '{"id":"vellmoor/data_stale/unit","who":""}',
  `{"who":"${'x'.repeat(17_000)}"}`,
  '['.repeat(5000),
  '{"powers_MW_el":[1e999]}',
  '{"powers_MW_el":[1],"block_min":1e9}',
  '{"time":"x","mw":-1}',
  '\u0000',
  '"\\ud800"',
];

/** A request as bytes on the wire. */
export function fuzzRequest(rolls: Rolls, unit: string): Buffer {
  if (rolls.below(40) === 0)
    return Buffer.concat([randomBytesOf(rolls, 40), Buffer.from('\r\n\r\n')]);
  const method = rolls.pick(METHODS);
  const drawn = rolls.below(300) === 0 ? rolls.pick(DEAR) : rolls.pick([...PATHS, ...ODD]);
  const named = drawn.replace('UNIT', rolls.below(5) === 0 ? rolls.pick(ODD) : unit);
  const path = rolls.below(12) === 0 ? `${named}/${rolls.pick(ODD)}` : named;
  const pairs = Array.from(
    { length: rolls.below(4) },
    () => `${rolls.pick(KEYS)}=${rolls.pick(VALUES)}`,
  );
  const body = Buffer.from(rolls.pick(BODIES));
  const headers = [
    `host: ${rolls.below(30) === 0 ? rolls.pick(ODD) : '127.0.0.1'}`,
    'connection: close',
    `accept-encoding: ${rolls.pick(['gzip', 'br', '*', 'identity;q=0', ''])}`,
    `accept: ${rolls.pick(['*/*', 'application/json', 'text/html', 'x/y', ''])}`,
    ...(rolls.below(6) === 0
      ? [`authorization: ${rolls.pick(['Bearer x', 'Basic eDp5', '', 'Bearer'])}`]
      : []),
    ...(rolls.below(10) === 0 ? [`x-${rolls.pick(KEYS)}: ${'y'.repeat(rolls.below(20_000))}`] : []),
    ...(rolls.below(10) === 0 ? [`cookie: rockhour=${rolls.pick(VALUES)}`] : []),
  ];
  if (!['GET', 'HEAD'].includes(method) || rolls.below(20) === 0) {
    headers.push(`content-type: ${rolls.pick(TYPES)}`);
    if (rolls.below(10) === 0)
      headers.push(`content-encoding: ${rolls.pick(['gzip', 'deflate', 'x'])}`);
    headers.push(`content-length: ${body.length}`);
  }
  const query = pairs.length > 0 ? `?${pairs.join('&')}` : '';
  const hasBody = headers.some((line) => line.startsWith('content-length'));
  const head = `${method} /${path}${query} HTTP/1.1\r\n${headers.join('\r\n')}\r\n\r\n`;
  return Buffer.concat([Buffer.from(head), ...(hasBody ? [body] : [])]);
}

export interface FuzzAnswer {
  readonly status: number;
  readonly head: string;
  readonly body: string;
}

/**
 * Sends bytes and reads what comes until the connection is closed.
 * @param from own address, which is what the daemon counts questions by
 */
export function send(port: number, request: Buffer, from: string): Promise<FuzzAnswer> {
  return new Promise((resolve, reject) => {
    const socket = connect({ port, host: '127.0.0.1', localAddress: from });
    const chunks: Buffer[] = [];
    const end = () => {
      const text = Buffer.concat(chunks).toString('utf8');
      const at = text.indexOf('\r\n\r\n');
      const status = Number(/^HTTP\/1\.1 (\d{3})/.exec(text)?.[1] ?? Number.NaN);
      resolve({ status, head: text.slice(0, at), body: text.slice(at + 4) });
    };
    socket.setTimeout(60_000, () => socket.destroy(new Error('no answer within a minute')));
    socket.on('data', (chunk) => chunks.push(chunk));
    socket.once('close', (failed) => {
      if (!failed || chunks.length > 0) end();
    });
    socket.once('error', (error) => {
      if (chunks.length === 0) reject(error);
    });
    socket.write(request);
  });
}

const CODES: readonly string[] = FAULT_CODES;
const FIELDS = ['code', 'expected', 'field', 'message', 'value'];

/** What of an answer is not as documented; null where all is. */
export function notDocumented({ status, head, body }: FuzzAnswer, isHead: boolean): string | null {
  if (!Number.isInteger(status)) return 'no HTTP answer';
  if (status >= 200 && status < 400) return null;
  if (status < 400 || status > 599) return `status ${status}`;
  if (isHead) return null;
  if (!/content-type: application\/json/i.test(head)) {
    // 503 of /api/health has the body of 200.
    return `status ${status} without JSON: ${body.slice(0, 100)}`;
  }
  const text = /transfer-encoding: chunked/i.test(head) ? dechunked(body) : body;
  let found: unknown;
  try {
    found = JSON.parse(text);
  } catch {
    return `status ${status} with a body that is no JSON: ${body.slice(0, 100)}`;
  }
  if (status === 503 && typeof found === 'object' && found !== null && 'parts' in found)
    return null;
  const error = (found as { error?: Record<string, unknown> }).error;
  if (!error || !CODES.includes(String(error.code)))
    return `status ${status}: ${text.slice(0, 200)}`;
  if (error.code === 'internal') return `an error of the daemon itself: ${text.slice(0, 200)}`;
  const keys = Object.keys(error).filter((key) => key !== 'others');
  return keys.sort().join() === FIELDS.join() ? null : `an error with the keys ${keys}`;
}

function dechunked(body: string): string {
  let rest = Buffer.from(body);
  let whole = '';
  for (;;) {
    const at = rest.indexOf('\r\n');
    const size = Number.parseInt(rest.subarray(0, at).toString(), 16);
    if (!(size > 0)) return whole;
    whole += rest.subarray(at + 2, at + 2 + size).toString();
    rest = rest.subarray(at + 4 + size);
  }
}
