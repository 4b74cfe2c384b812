import { type ChildProcess, spawn } from 'node:child_process';
import { writeFileSync } from 'node:fs';
import { connect } from 'node:net';
import { join } from 'node:path';
import { temporaryFolder } from './folders.js';
import { freePort } from './ports.js';
import { waitFor } from './wait.js';

/** A real service of a test's own, on a port of its own. `stop()` may be called twice. */
export interface Service {
  readonly port: number;
  readonly url: string;
  readonly folder: string;
  /** SIGTERM by default; SIGKILL is a power cut. */
  stop(signal?: NodeJS.Signals): Promise<void>;
  /** Starts it again on the same port and folder. */
  start(): Promise<void>;
}

class ProcessService implements Service {
  private child: ChildProcess | null = null;
  private said = '';

  constructor(
    readonly port: number,
    readonly url: string,
    readonly folder: string,
    private readonly command: string,
    private readonly args: readonly string[],
    private readonly ready: () => Promise<boolean>,
  ) {}

  async start(): Promise<void> {
    const child = spawn(this.command, [...this.args], { stdio: ['ignore', 'pipe', 'pipe'] });
    this.child = child;
    for (const stream of [child.stdout, child.stderr]) {
      stream?.on('data', (chunk: Buffer) => {
        this.said = (this.said + chunk.toString()).slice(-4000);
      });
    }
    await waitFor(`${this.command} on port ${this.port}`, async () => {
      if (child.exitCode !== null) {
        throw new Error(`${this.command} ended with ${child.exitCode}: ${this.said}`);
      }
      return this.ready();
    });
  }

  async stop(signal: NodeJS.Signals = 'SIGTERM'): Promise<void> {
    const child = this.child;
    this.child = null;
    if (child === null || child.exitCode !== null || child.signalCode !== null) return;
    const ended = new Promise((resolve) => child.once('exit', resolve));
    child.kill(signal);
    await ended;
  }
}

function accepts(port: number): Promise<boolean> {
  return new Promise((resolve) => {
    const socket = connect(port, '127.0.0.1');
    socket.once('connect', () => {
      socket.destroy();
      resolve(true);
    });
    socket.once('error', () => resolve(false));
  });
}

/** How a broker should keep what a subscriber has not taken yet, and where. */
export interface BrokerOptions {
  /** `default`: mosquitto's own limits, 20 in flight and 1000 queued. */
  readonly limits?: 'raised' | 'default';
  /** Folder of its own; a new one else. */
  readonly folder?: string;
}

/**
 * mosquitto as a site would run it: nothing lost to a slow subscriber or to its own restart.
 * @param own further lines of its configuration, for its one listener
 */
export async function startMosquitto(
  program: string,
  port?: number,
  own: readonly string[] = [],
  options: BrokerOptions = {},
): Promise<Service> {
  const at = port ?? (await freePort());
  const folder = options.folder ?? temporaryFolder('mosquitto');
  const config = join(folder, 'mosquitto.conf');
  // Started by root, mosquitto would change to a user of its own, who may not write the folder.
  const lines = [
    `listener ${at} 127.0.0.1`,
    'allow_anonymous true',
    ...(options.limits === 'default' ? [] : ['max_queued_messages 1000000']),
    'persistence true',
    `persistence_location ${folder}/`,
    'autosave_interval 1',
    ...own,
  ];
  if (process.getuid?.() === 0) lines.push('user root');
  writeFileSync(config, `${lines.join('\n')}\n`);
  const service = new ProcessService(
    at,
    `mqtt://127.0.0.1:${at}`,
    folder,
    program,
    ['-c', config],
    () => accepts(at),
  );
  await service.start();
  return service;
}

/**
 * InfluxDB 1.x with an empty data folder.
 * @param own further lines of its section [http]; with https among them it is asked by TLS
 */
export async function startInflux(
  program: string,
  port?: number,
  own: readonly string[] = [],
  folder = temporaryFolder('influx'),
): Promise<Service> {
  const at = port ?? (await freePort());
  const rpc = await freePort();
  const config = join(folder, 'influxdb.conf');
  const lines = [
    'reporting-disabled = true',
    `bind-address = "127.0.0.1:${rpc}"`,
    '[meta]',
    `dir = "${folder}/meta"`,
    '[data]',
    `dir = "${folder}/data"`,
    `wal-dir = "${folder}/wal"`,
    'index-version = "tsi1"',
    '[http]',
    `bind-address = "127.0.0.1:${at}"`,
    'log-enabled = false',
    ...own,
  ];
  writeFileSync(config, `${lines.join('\n')}\n`);
  const service = new ProcessService(
    at,
    `${own.some((line) => line.startsWith('https-enabled')) ? 'https' : 'http'}://127.0.0.1:${at}`,
    folder,
    program,
    ['run', '-config', config],
    async () => {
      if (own.length > 0) return accepts(at);
      try {
        return (await fetch(`http://127.0.0.1:${at}/ping`)).status === 204;
      } catch {
        return false;
      }
    },
  );
  await service.start();
  return service;
}
