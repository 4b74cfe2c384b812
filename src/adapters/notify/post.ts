import { request as ask, type IncomingMessage, type RequestOptions } from 'node:http';
import { request as askSecurely } from 'node:https';
import { clientTlsOptions } from '../../access/tls.js';
import type { ClientTls } from '../../config/site.js';

export interface Post {
  readonly url: string;
  readonly headers: Readonly<Record<string, string>>;
  readonly body: string;
  /** null: the authorities that Node brings along, and the host of the url. */
  readonly tls: ClientTls | null;
  /** Cuts it short; its reason is what the promise is rejected with. */
  readonly signal: AbortSignal;
}

/**
 * Posts one message. A redirect is an answer like any other: it would carry what is said to where
 * nobody configured it.
 *
 * @returns the status of the answer; its body is not read
 */
export function post({ url, headers, body, tls, signal }: Post): Promise<number> {
  const options: RequestOptions = {
    method: 'POST',
    // A connection of its own: events are rare, and one left open would be ended by the receiver.
    agent: false,
    headers: { ...headers, 'content-length': String(Buffer.byteLength(body)) },
    signal,
  };
  return new Promise((resolve, reject) => {
    const answered = (answer: IncomingMessage) => {
      resolve(answer.statusCode ?? 0);
      // Only now: what comes of a connection that we end ourselves is told to nobody.
      answer.on('error', () => undefined).destroy();
    };
    const asked = url.startsWith('https:')
      ? askSecurely(url, { ...options, ...clientTlsOptions(tls) }, answered)
      : ask(url, options, answered);
    asked.on('error', (thrown) => reject(signal.aborted ? signal.reason : thrown));
    asked.end(body);
  });
}
