import { readFileSync } from 'node:fs';
import { createServer, type IncomingMessage, type RequestListener, type Server } from 'node:http';
import { createServer as createSecureServer } from 'node:https';
import type { AddressInfo } from 'node:net';

export interface Received {
  readonly headers: IncomingMessage['headers'];
  readonly body: string;
}

/** A receiver over HTTP that answers as it is told, by the number of the request (from 0). */
export class Receiver {
  readonly got: Received[] = [];
  private server: Server | null = null;

  /**
   * @param answer status, or null: never answers
   * @param tls files of its certificate; without them it speaks plain HTTP
   */
  constructor(
    private readonly answer: (n: number, body: string) => number | null,
    private readonly tls?: { readonly cert: string; readonly key: string },
  ) {}

  async start(port = 0): Promise<string> {
    const { tls } = this;
    const listener: RequestListener = (request, response) => {
      let body = '';
      request.on('data', (chunk) => {
        body += chunk;
      });
      request.on('end', () => {
        const status = this.answer(this.got.length, body);
        this.got.push({ headers: request.headers, body });
        if (status === null) return;
        if (status === 302) response.setHeader('location', '/elsewhere');
        response.writeHead(status).end('{}');
      });
    };
    const server =
      tls === undefined
        ? createServer(listener)
        : createSecureServer(
            { cert: readFileSync(tls.cert), key: readFileSync(tls.key) },
            listener,
          );
    this.server = server;
    await new Promise<void>((resolve) => server.listen(port, '127.0.0.1', resolve));
    return `http${tls === undefined ? '' : 's'}://127.0.0.1:${(server.address() as AddressInfo).port}/hook`;
  }

  async stop(): Promise<void> {
    const { server } = this;
    this.server = null;
    if (server === null) return;
    server.closeAllConnections();
    await new Promise((resolve) => server.close(resolve));
  }
}
