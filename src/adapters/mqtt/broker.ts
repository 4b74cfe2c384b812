import { createServer, type Server } from 'node:net';
import { Aedes } from 'aedes';
import { RockhourError, reasonOf } from '../../errors.js';
import { Door, type DoorOptions } from './door.js';

/** Connections at the same time; more are closed at once. */
const MOST_CONNECTIONS = 512;

/**
 * The broker that rockhour brings along where the configuration names none: MQTT 3.1.1, in
 * memory. It asks for tokens where there are any. It is for trying out and for a plant whose gateways
 * can publish to this machine; what it holds is gone when the process ends.
 */
export class EmbeddedBroker {
  private aedes: Aedes | null = null;
  private server: Server | null = null;
  private listensOn = 0;
  private readonly door: Door | null;

  /** @param port 0 = any free one */
  constructor(
    private readonly host: string,
    private readonly port: number,
    /** Without it nobody is asked who they are. */
    door: DoorOptions | null = null,
  ) {
    this.door = door && new Door(door);
  }

  /** What rockhour's own link logs in with. */
  get login(): { readonly username: string; readonly password: string } | null {
    return this.door?.login ?? null;
  }

  /** Where it can be reached from this machine. */
  get url(): string {
    return `mqtt://${this.host.includes(':') ? `[${this.host}]` : this.host}:${this.listensOn}`;
  }

  /** @throws RockhourError PORT_IN_USE */
  async start(): Promise<void> {
    if (this.server) return;
    const { door } = this;
    const aedes = await Aedes.createBroker(door?.rules ?? {});
    if (door) {
      aedes.on('clientDisconnect', (client) => door.left(client));
      aedes.on('connectionError', (client) => door.left(client));
      door.start();
    }
    const server = createServer(aedes.handle);
    server.maxConnections = MOST_CONNECTIONS;
    try {
      await new Promise<void>((resolve, reject) => {
        server.once('error', reject);
        server.listen(this.port, this.host, resolve);
      });
    } catch (thrown) {
      aedes.close();
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
  }

  async stop(): Promise<void> {
    const { aedes, server } = this;
    this.aedes = null;
    this.server = null;
    this.door?.stop();
    // The broker first: the server waits for connections that only the broker ends.
    if (aedes) await new Promise<void>((resolve) => aedes.close(resolve));
    if (server) await new Promise<void>((resolve) => server.close(() => resolve()));
  }
}
