import { RockhourError, reasonOf } from '../errors.js';

/** How long a daemon may take: hours are computed while it waits, in about a second. */
const PATIENCE_MS = 30_000;

/** Refusals that say nothing of the question: who may ask, too slowly, too often. */
const NOT_THE_QUESTION: ReadonlySet<number> = new Set([401, 403, 407, 408, 429]);

/** The token of whoever asks: from the environment, for a command line is seen by everybody. */
function tokenHeader(): { authorization?: string } {
  const token = process.env.ROCKHOUR_TOKEN;
  return token === undefined || token === '' ? {} : { authorization: `Bearer ${token}` };
}

/** The message of rockhour's own error body; null where another program wrote the body. */
function ownWords(body: string): string | null {
  try {
    const { error } = JSON.parse(body) as { error?: { code?: unknown; message?: unknown } };
    if (error?.code === 'unknown_route') return null;
    if (typeof error?.message === 'string') return error.message;
  } catch {
    // Not JSON, so not rockhour: a proxy or another server.
  }
  return null;
}

/** Those words, or the start of whatever else came back. */
function complaint(body: string): string {
  return ownWords(body) ?? (body.trim().slice(0, 200) || 'an empty body');
}

/**
 * Asks a running daemon's HTTP API.
 * @param base address of the daemon with its path prefix, such as http://127.0.0.1:8080
 * @param path path below it with its query
 * @param body what is posted as JSON; without it the question is a GET
 * @throws RockhourError DAEMON_UNREACHABLE, DAEMON_REFUSED, or USAGE for an address that is none and for
 *   a question that the daemon finds wrong, in its words
 */
export async function askDaemon(base: string, path: string, body?: object): Promise<unknown> {
  const text = await fetchDaemon(base, path, {
    ...(body === undefined ? {} : { method: 'POST', body: JSON.stringify(body) }),
    headers: {
      accept: 'application/json',
      ...(body === undefined ? {} : { 'content-type': 'application/json' }),
    },
  });
  return jsonOf(base, text.toString('utf8'));
}

export interface Sent {
  readonly method?: 'POST' | 'PUT';
  readonly body?: string | Uint8Array<ArrayBuffer>;
  readonly headers: Readonly<Record<string, string>>;
  readonly patience_ms?: number;
}

/** The body of a daemon's answer; throws as `askDaemon`. */
export async function fetchDaemon(base: string, path: string, sent: Sent): Promise<Buffer> {
  const { patience_ms = PATIENCE_MS, ...request } = sent;
  if (!URL.canParse(base) || !/^https?:$/.test(new URL(base).protocol)) {
    throw new RockhourError(
      'USAGE',
      `--url is ${JSON.stringify(base)}; expected an address such as http://127.0.0.1:8080`,
    );
  }
  const address = base.replace(/\/+$/, '') + path;
  const question = `${sent.method ?? 'GET'} ${address}`;
  let status: number;
  let bytes: Buffer;
  try {
    const response = await fetch(address, {
      ...request,
      headers: { ...sent.headers, ...tokenHeader() },
      signal: AbortSignal.timeout(patience_ms),
    });
    status = response.status;
    bytes = Buffer.from(await response.arrayBuffer());
  } catch (error) {
    // fetch wraps what the network said.
    const inner = error instanceof Error && error.cause !== undefined ? error.cause : error;
    throw new RockhourError('DAEMON_UNREACHABLE', `${question} got no answer: ${reasonOf(inner)}`, {
      cause: error,
    });
  }
  if (status === 200) return bytes;
  const text = bytes.toString('utf8');
  if (status >= 400 && status < 500 && !NOT_THE_QUESTION.has(status) && ownWords(text) !== null) {
    throw new RockhourError('USAGE', complaint(text), {
      advice: `The daemon at ${base} says so; mend the question.`,
    });
  }
  throw new RockhourError(
    'DAEMON_REFUSED',
    `${question} was answered with ${status}: ${complaint(text)}`,
  );
}

export function jsonOf(base: string, text: string): unknown {
  try {
    return JSON.parse(text);
  } catch (error) {
    throw new RockhourError(
      'DAEMON_REFUSED',
      `${base} has not answered in JSON but with ${JSON.stringify(text.slice(0, 80))}`,
      { cause: error, advice: 'Check that the address is that of a rockhour daemon.' },
    );
  }
}
