import { RockhourError, reasonOf } from '../errors.js';

/** How long a daemon may take: hours are computed while it waits, in about a second. */
const PATIENCE_MS = 30_000;

/** The message of rockhour's own error body, or the start of whatever else came back. */
function complaint(body: string): string {
  try {
    const { error } = JSON.parse(body) as { error?: { message?: unknown } };
    if (typeof error?.message === 'string') return error.message;
  } catch {
    // Not JSON, so not rockhour: a proxy or another server.
  }
  return body.trim().slice(0, 200) || 'an empty body';
}

/**
 * Asks a running daemon's HTTP API.
 * @param base address of the daemon with its path prefix, such as http://127.0.0.1:8080
 * @param path path below it with its query
 * @param body what is posted as JSON; without it the question is a GET
 * @throws RockhourError DAEMON_UNREACHABLE, DAEMON_REFUSED, or USAGE for an address that is none
 */
export async function askDaemon(base: string, path: string, body?: object): Promise<unknown> {
  if (!URL.canParse(base) || !/^https?:$/.test(new URL(base).protocol)) {
    throw new RockhourError(
      'USAGE',
      `--url is ${JSON.stringify(base)}; expected an address such as http://127.0.0.1:8080`,
    );
  }
  const address = base.replace(/\/+$/, '') + path;
  const question = `${body === undefined ? 'GET' : 'POST'} ${address}`;
  let status: number;
  let text: string;
  try {
    const response = await fetch(address, {
      ...(body === undefined ? {} : { method: 'POST', body: JSON.stringify(body) }),
      headers: {
        accept: 'application/json',
        ...(body === undefined ? {} : { 'content-type': 'application/json' }),
      },
      signal: AbortSignal.timeout(PATIENCE_MS),
    });
    status = response.status;
    text = await response.text();
  } catch (error) {
    // fetch wraps what the network said.
    const inner = error instanceof Error && error.cause !== undefined ? error.cause : error;
    throw new RockhourError('DAEMON_UNREACHABLE', `${question} got no answer: ${reasonOf(inner)}`, {
      cause: error,
    });
  }
  if (status !== 200) {
    throw new RockhourError(
      'DAEMON_REFUSED',
      `${question} was answered with ${status}: ${complaint(text)}`,
    );
  }
  try {
    return JSON.parse(text);
  } catch (error) {
    throw new RockhourError(
      'DAEMON_REFUSED',
      `${question} was not answered in JSON but with ${JSON.stringify(text.slice(0, 80))}`,
      { cause: error, advice: 'Check that the address is that of a rockhour daemon.' },
    );
  }
}
