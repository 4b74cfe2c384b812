import { createServer, type Server, type Socket } from 'node:net';
import { Duplex } from 'node:stream';
import { createServer as createSecureServer, type Server as SecureServer } from 'node:tls';
import type { Client } from 'aedes';
import { CertificateWatch } from '../../access/certificateWatch.js';
import { Places } from '../../access/places.js';
import { LEAST_TLS } from '../../access/tls.js';
import type { ServerTls } from '../../config/site.js';
import { RockhourError, reasonOf } from '../../errors.js';
import { type Bounded, BoundedBroker } from './boundedBroker.js';
import { Door, type DoorOptions } from './door.js';
import { connectedPair } from './inside.js';
import { PacketSizes } from './packetSizes.js';
import { SLOW_BOUNDS, type SlowBounds, SlowClients } from './slowClients.js';

export interface BrokerOptions {
  /** Absent or null: plain TCP. */
  readonly tls?: ServerTls | null;
  /** Greatest packet with its header [bytes]; absent: as large as MQTT has them. */
  readonly packet_most_bytes?: number;
  /** Most that is kept for clients, retained or waiting [bytes]. */
  readonly memory_most_bytes?: number;
  readonly slow?: Partial<SlowBounds>;
  readonly certificate_look_ms?: number;
  /** A client was cut off, or not let in, or something is not kept for it. */
  refused?(what: 'packets' | 'connections' | 'handshakes' | 'slow' | Bounded, text: string): void;
  /** Publishers have to wait. */
  held?(text: string): void;
  info?(text: string): void;
  error?(text: string): void;
}

/** Connections at the same time; more are closed at once. */
const MOST_CONNECTIONS = 512;
/** Of these from one address: nobody takes all places alone. */
const MOST_EACH = 256;
/** Whoever has not logged in may not make us keep more than this: a CONNECT with its will [bytes]. */
const MOST_BEFORE_LOGIN = 65_536;
/** A client says who it is by then, and has finished the handshake of TLS [ms]. */
const LOGIN_MS = 10_000;
const CERTIFICATE_LOOK_MS = 30_000;
const MEMORY_BYTES = 64_000_000;
/** A connection on which nothing comes is asked for whether it still is one [ms]. */
const ALIVE_MS = 60_000;
/** MQTT 3.1.1, 2.2.3, with its header. */
const MOST_OF_MQTT = 268_435_460;

/**
 * The broker that rockhour brings along where the configuration names none: MQTT 3.1.1, in
 * memory. It asks for tokens where there are any. It is for trying out and for a plant whose gateways
 * can publish to this machine; what it holds is gone when the process ends.
 */
export class EmbeddedBroker {
  private aedes: BoundedBroker | null = null;
  private slow: SlowClients | null = null;
  private server: Server | SecureServer | null = null;
  private readonly sockets = new Set<Socket>();
  private watch: CertificateWatch | null = null;
  private listensOn = 0;
  private readonly door: Door | null;

  /** @param port 0 = any free one */
  constructor(
    private readonly host: string,
    private readonly port: number,
    /** Without it nobody is asked who they are. */
    door: DoorOptions | null = null,
    private readonly options: BrokerOptions = {},
  ) {
    this.door = door && new Door(door);
  }

  /** What rockhour's own links log in with. */
  get login(): { readonly username: string; readonly password: string } | null {
    return this.door?.login ?? null;
  }

  /** Where it can be reached from this machine. */
  get url(): string {
    const host = this.host.includes(':') ? `[${this.host}]` : this.host;
    return `mqtt${this.options.tls ? 's' : ''}://${host}:${this.listensOn}`;
  }

  /** A connection within the process, for rockhour's own links. Closed at once where it is stopped. */
  readonly inside = (): Duplex => {
    const { aedes } = this;
    if (aedes === null) return new Duplex({ read: () => undefined }).destroy();
    const [far, near] = connectedPair();
    aedes.take(near, true);
    return far;
  };

  /** @throws RockhourError PORT_IN_USE */
  async start(): Promise<void> {
    if (this.server) return;
    const { door } = this;
    const { memory_most_bytes = MEMORY_BYTES, refused, held } = this.options;
    const aedes = new BoundedBroker({ connectTimeout: LOGIN_MS }, door?.rules ?? {}, {
      memory_most_bytes,
      refused: (what, text) => refused?.(what, text),
      held: (text) => held?.(text),
      turnedAway: (client) => door?.left(client),
    });
    await aedes.listen();
    if (door) {
      aedes.on('clientDisconnect', (client) => door.left(client));
      aedes.on('connectionError', (client) => door.left(client));
      door.start();
    }
    const slow = new SlowClients(
      { ...SLOW_BOUNDS, ...this.options.slow },
      (client, socket, why) => {
        refused?.('slow', `${this.nameOf(client)}${socket.remoteAddress}: ${why}`);
        // What waits for it is thrown away with it.
        socket.destroy();
      },
      () => aedes.isHolding,
    );
    this.slow = slow;
    slow.start();
    const server = this.makeServer((socket) => this.take(aedes, slow, socket));
    try {
      await new Promise<void>((resolve, reject) => {
        server.once('error', reject);
        server.listen(this.port, this.host, resolve);
      });
    } catch (thrown) {
      aedes.close();
      slow.stop();
      door?.stop();
      throw new RockhourError(
        'PORT_IN_USE',
        `the embedded MQTT broker cannot listen on ${this.host}:${this.port}: ${reasonOf(thrown)}`,
        {
          cause: thrown,
          advice:
            'Stop the program that holds the port, set mqtt.embedded_port, or name a broker in mqtt.url.',
        },
      );
    }
    const address = server.address();
    this.listensOn = typeof address === 'object' && address ? address.port : this.port;
    this.aedes = aedes;
    this.server = server;
    this.watch?.start();
  }

  async stop(): Promise<void> {
    const { aedes, server } = this;
    this.aedes = null;
    this.server = null;
    this.watch?.stop();
    this.slow?.stop();
    this.door?.stop();
    // The broker first: the server waits for connections that only the broker ends.
    if (aedes) await new Promise<void>((resolve) => aedes.close(resolve));
    // Those that have not logged in are unknown to it.
    for (const socket of this.sockets) socket.destroy();
    if (server) await new Promise<void>((resolve) => server.close(() => resolve()));
  }

  private makeServer(take: (socket: Socket) => void): Server | SecureServer {
    const { tls = null } = this.options;
    const server = tls === null ? createServer(take) : this.makeSecure(tls, take);
    const places = new Places(MOST_EACH);
    server.maxConnections = MOST_CONNECTIONS;
    // Ahead of whoever takes it.
    server.prependListener('connection', (socket: Socket) => {
      const { remoteAddress } = socket;
      if (!places.take(socket)) {
        this.options.refused?.('connections', `${remoteAddress}: it has ${MOST_EACH} already`);
        return;
      }
      socket.setKeepAlive(true, ALIVE_MS);
      this.sockets.add(socket);
      socket.once('close', () => this.sockets.delete(socket));
    });
    server.on('drop', (data) => {
      const { remoteAddress } = data ?? {};
      const text = `${remoteAddress}: ${MOST_CONNECTIONS} connections are open`;
      this.options.refused?.('connections', text);
    });
    return server;
  }

  private makeSecure(
    { cert_file, key_file, cert, key }: ServerTls,
    take: (socket: Socket) => void,
  ): SecureServer {
    const { info, error, refused, certificate_look_ms: every_ms } = this.options;
    const server = createSecureServer(
      { cert, key, minVersion: LEAST_TLS, handshakeTimeout: LOGIN_MS },
      take,
    );
    server.on('tlsClientError', (thrown, { remoteAddress }) =>
      refused?.('handshakes', `${remoteAddress ?? 'a client that left'}: ${inWords(thrown)}`),
    );
    this.watch = new CertificateWatch({
      ...{ path: 'mqtt.embedded_tls', cert_file, key_file },
      every_ms: every_ms ?? CERTIFICATE_LOOK_MS,
      take: (newCert, newKey) =>
        server.setSecureContext({ cert: newCert, key: newKey, minVersion: LEAST_TLS }),
      info: (text) => info?.(text),
      error: (text) => error?.(text),
    });
    return server;
  }

  /** Hands a connection to the broker, cut off at the first packet that is too great. */
  private take(aedes: BoundedBroker, slow: SlowClients, socket: Socket): void {
    if (socket.destroyed) return;
    const client = aedes.take(socket, false);
    const sizes = new PacketSizes();
    slow.watch(client, socket, sizes);
    const { packet_most_bytes = MOST_OF_MQTT, refused } = this.options;
    // While the broker reads: the packet has not been handed to its parser yet.
    socket.on('data', (bytes: Buffer) => {
      const most = aedes.isIn(client)
        ? packet_most_bytes
        : Math.min(packet_most_bytes, MOST_BEFORE_LOGIN);
      const size = client.closed ? 0 : sizes.see(bytes, most);
      if (size === 0) return;
      const from = `${this.nameOf(client)}${socket.remoteAddress}`;
      refused?.('packets', `a packet of ${size} bytes from ${from}, more than ${most}`);
      client.close();
    });
  }

  private nameOf(client: Client): string {
    const who = this.door?.nameOf(client) ?? client.id ?? '';
    return who === '' ? '' : `${who} at `;
  }
}

/** OpenSSL names lines of its own source; what it means is told. */
function inWords(thrown: Error): string {
  const { code } = thrown as NodeJS.ErrnoException;
  if (code === 'ERR_SSL_WRONG_VERSION_NUMBER' || code === 'ERR_SSL_HTTP_REQUEST') {
    return 'speaks no TLS';
  }
  return /SSL routines:[^:]*:([^:\n]*)/.exec(thrown.message)?.[1] ?? reasonOf(thrown);
}
