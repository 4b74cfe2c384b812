import { createServer, type Server } from 'node:net';
import { Aedes } from 'aedes';
import { RockhourError, reasonOf } from '../../errors.js';

/**
 * The broker that rockhour brings along where the configuration names none: MQTT 3.1.1, in
 * memory, without a log-in. It is for trying out and for a plant whose gateways can publish to
 * this machine; what it holds is gone when the process ends.
 */
export class EmbeddedBroker {
  private aedes: Aedes | null = null;
  private server: Server | null = null;
  private listensOn = 0;

  /** @param port 0 = any free one */
  constructor(
    private readonly host: string,
    private readonly port: number,
  ) {}

  /** Where it can be reached from this machine. */
  get url(): string {
    return `mqtt://${this.host.includes(':') ? `[${this.host}]` : this.host}:${this.listensOn}`;
  }

  /** @throws RockhourError PORT_IN_USE */
  async start(): Promise<void> {
    if (this.server) return;
    const aedes = await Aedes.createBroker();
    const server = createServer(aedes.handle);
    try {
      await new Promise<void>((resolve, reject) => {
        server.once('error', reject);
        server.listen(this.port, this.host, resolve);
      });
    } catch (thrown) {
      aedes.close();
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
    // The broker first: the server waits for connections that only the broker ends.
    if (aedes) await new Promise<void>((resolve) => aedes.close(resolve));
    if (server) await new Promise<void>((resolve) => server.close(() => resolve()));
  }
}
