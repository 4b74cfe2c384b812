import { createHash } from 'node:crypto';
import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { Socket } from 'node:net';

/**
 * `pass`: as InfluxDB answers. `hang`: never an answer, though every other write is applied. `error`:
 * 500. `refuse`: a hundredth of the points is refused for good, the rest written (a partial write, 400).
 */
export type DatabaseMood = 'pass' | 'hang' | 'error' | 'refuse';

/** One point in so many is refused, the same ones at each try. */
const REFUSED_ONE_IN = 100;
const MEASUREMENT = 'rockhour_unit';

/** HTTP in front of a real InfluxDB, with faults of its own. */
export class FaultyDatabase {
  mood: DatabaseMood = 'pass';
  /** Lines of the unit's own measurement that were refused for good. */
  readonly refused = new Set<string>();
  /** Requests answered otherwise than InfluxDB would have. */
  faults = 0;
  private server: Server | null = null;
  private readonly sockets = new Set<Socket>();

  constructor(
    private readonly port: number,
    private readonly behind: string,
  ) {}

  get url(): string {
    return `http://127.0.0.1:${this.port}`;
  }

  async start(): Promise<void> {
    const server = createServer((request, response) => {
      this.answer(request, response).catch(() => response.destroy());
    });
    server.on('connection', (socket) => {
      this.sockets.add(socket);
      socket.once('close', () => this.sockets.delete(socket));
    });
    this.server = server;
    await new Promise<void>((resolve, reject) => {
      server.once('error', reject);
      server.listen(this.port, '127.0.0.1', resolve);
    });
  }

  /** Gone: connections are cut, new ones refused. */
  async stop(): Promise<void> {
    const { server } = this;
    this.server = null;
    if (!server) return;
    const closed = new Promise((resolve) => server.close(resolve));
    for (const socket of this.sockets) socket.destroy();
    await closed;
  }

  private async answer(request: IncomingMessage, response: ServerResponse): Promise<void> {
    const chunks: Buffer[] = [];
    for await (const chunk of request) chunks.push(chunk as Buffer);
    const body = Buffer.concat(chunks).toString();
    const { mood } = this;
    if (mood === 'hang') {
      this.faults++;
      if (this.faults % 2 === 0) await this.pass(request, body);
      return;
    }
    if (mood === 'error') {
      this.faults++;
      response.writeHead(500).end('{"error":"out of order"}');
      return;
    }
    const isWrite = request.url?.startsWith('/write') ?? false;
    if (mood === 'refuse' && isWrite) {
      const lines = body.split('\n');
      const bad = lines.filter(isRefused);
      if (bad.length > 0) {
        this.faults++;
        for (const line of bad) if (line.startsWith(MEASUREMENT)) this.refused.add(line);
        const good = lines.filter((line) => !isRefused(line)).join('\n');
        if (good !== '') await this.pass(request, good);
        const error = `partial write: points beyond retention policy dropped=${bad.length}`;
        response.writeHead(400, { 'content-type': 'application/json' });
        response.end(JSON.stringify({ error }));
        return;
      }
    }
    const { status, text, headers } = await this.pass(request, body);
    response.writeHead(status, headers).end(text);
  }

  private async pass(request: IncomingMessage, body: string) {
    const hasBody = request.method === 'POST';
    const answer = await fetch(`${this.behind}${request.url}`, {
      method: request.method ?? 'GET',
      ...(hasBody ? { body } : {}),
      ...(hasBody && request.headers['content-type']
        ? { headers: { 'content-type': request.headers['content-type'] } }
        : {}),
    });
    const version = answer.headers.get('x-influxdb-version');
    const type = answer.headers.get('content-type');
    return {
      status: answer.status,
      // 204 has none.
      text: await answer.text(),
      headers: {
        ...(version === null ? {} : { 'x-influxdb-version': version }),
        ...(type === null ? {} : { 'content-type': type }),
      },
    };
  }
}

function isRefused(line: string): boolean {
  if (line === '') return false;
  return createHash('sha1').update(line).digest().readUInt32BE(0) % REFUSED_ONE_IN === 0;
}
