import { createServer, type RequestListener, type Server } from 'node:http';
import { createServer as createSecureServer, type Server as SecureServer } from 'node:https';
import type { Socket } from 'node:net';
import { CertificateWatch } from '../../access/certificateWatch.js';
import { Places } from '../../access/places.js';
import { LEAST_TLS } from '../../access/tls.js';
import type { ServerTls } from '../../config/site.js';
import type { HttpTuning } from './tuning.js';
import { Unread } from './unread.js';

/** Request line and headers together [bytes]; Node answers more with 431. */
const MOST_HEADER_BYTES = 16 * 1024;

/** Servers of one app: Node's, with their limits; for `localhost` there are two of them. */
export class Servers {
  private readonly secure: SecureServer[] = [];
  private readonly watch: CertificateWatch | null;
  private readonly places: Places;
  private readonly unread: Unread;
  private looking: NodeJS.Timeout | null = null;

  constructor(
    private readonly tuning: HttpTuning,
    private readonly tls: ServerTls | null,
    say: {
      info(text: string): void;
      error(text: string): void;
    },
  ) {
    this.places = new Places(tuning.connections_each_most);
    this.unread = new Unread(tuning);
    this.watch =
      tls &&
      new CertificateWatch({
        ...{ path: 'http.tls', cert_file: tls.cert_file, key_file: tls.key_file },
        every_ms: tuning.certificate_look_ms,
        take: (cert, key) => {
          const context = { cert, key, minVersion: LEAST_TLS } as const;
          for (const server of this.secure) server.setSecureContext(context);
        },
        ...say,
      });
  }

  /** Slow senders of headers and bodies are ended, idle connections too; the number is bounded. */
  readonly make = (handle: RequestListener): Server => {
    const handler: RequestListener = (question, answer) => {
      if (this.unread.take(question, answer)) handle(question, answer);
    };
    const { headers_ms, request_ms, idle_ms, look_ms, connections_most } = this.tuning;
    const limits = {
      headersTimeout: headers_ms,
      requestTimeout: request_ms,
      connectionsCheckingInterval: look_ms,
      maxHeaderSize: MOST_HEADER_BYTES,
    };
    let server: Server;
    if (this.tls === null) server = createServer(limits, handler);
    else {
      const { cert, key } = this.tls;
      const secure = createSecureServer(
        { ...limits, cert, key, minVersion: LEAST_TLS, handshakeTimeout: headers_ms },
        handler,
      );
      this.secure.push(secure);
      server = secure;
    }
    server.maxConnections = connections_most;
    server.on('connection', (socket: Socket) => this.places.take(socket));
    server.on('drop', () => {
      this.places.refused += 1;
    });
    server.setTimeout(idle_ms);
    return server;
  };

  /** Connections that were ended at once, as there were too many. */
  get refused(): number {
    return this.places.refused;
  }

  /** Connections that were ended as their answers were not read. */
  get unreadEnded(): number {
    return this.unread.ended;
  }

  start(): void {
    this.watch?.start();
    this.looking ??= setInterval(() => this.unread.look(), this.tuning.look_ms).unref();
  }

  stop(): void {
    this.watch?.stop();
    if (this.looking !== null) clearInterval(this.looking);
    this.looking = null;
  }
}

const STATUS: Readonly<Record<string, readonly [status: number, reason: string, words: string]>> = {
  HPE_HEADER_OVERFLOW: [
    431,
    'Request Header Fields Too Large',
    `address and headers have more than ${MOST_HEADER_BYTES} bytes`,
  ],
  ERR_HTTP_REQUEST_TIMEOUT: [
    408,
    'Request Timeout',
    'the question did not come to its end in time',
  ],
};

/** What is no HTTP at all, too long or too slow, answered in the form of all errors. */
export function answerClientError(error: NodeJS.ErrnoException, socket: Socket): void {
  if (error.code === 'ECONNRESET' || socket.destroyed || !socket.writable) {
    socket.destroy();
    return;
  }
  const [status, reason, message] = STATUS[error.code ?? ''] ?? [
    400,
    'Bad Request',
    'this is not HTTP that can be read',
  ];
  const fault = { code: 'unreadable_body', message, field: null, value: null, expected: null };
  const body = JSON.stringify({ error: fault });
  const lines = [
    `HTTP/1.1 ${status} ${reason}`,
    'content-type: application/json; charset=utf-8',
    `content-length: ${Buffer.byteLength(body)}`,
    'connection: close',
  ];
  socket.end(`${lines.join('\r\n')}\r\n\r\n${body}`);
}
