import type { Socket } from 'node:net';
import type { Client } from 'aedes';
import type { PacketSizes } from './packetSizes.js';

export interface SlowBounds {
  /** What one client has not taken yet, and all of them together [bytes]. */
  readonly unsent_most_bytes: number;
  readonly unsent_all_most_bytes: number;
  /** One that takes less than `LEAST_BYTES` of it, or does not finish a packet, in this time [ms]. */
  readonly patience_ms: number;
  readonly look_ms: number;
}

export const SLOW_BOUNDS: SlowBounds = {
  unsent_most_bytes: 1_000_000,
  unsent_all_most_bytes: 32_000_000,
  patience_ms: 20_000,
  look_ms: 2_000,
};
const LEAST_BYTES = 4096;
/** Below this one client is never too far behind [bytes]. */
const LITTLE_BYTES = 65_536;

/** The parts of aedes 1.2 that hand a message to a client; they call back once it has been taken. */
interface Delivering {
  deliver0: Deliver;
  deliverQoS: Deliver;
}
type Deliver = (packet: { readonly brokerId?: string | null }, done: () => void) => void;

interface Watched {
  readonly client: Client;
  readonly socket: Socket;
  readonly sizes: PacketSizes;
  /** Bytes that it had taken then, while it is behind [ms]. */
  behind: { since_ms: number; taken: number } | null;
  /** Number of the packet that it had begun then. */
  within: { since_ms: number; packet: number } | null;
}

/**
 * Clients of its own broker that do not take what they subscribed to, or stop in the middle of a
 * packet: they are cut off, and nobody waits for them. aedes would wait up to a minute, and with it
 * every message of every other client.
 */
export class SlowClients {
  private readonly all = new Set<Watched>();
  private timer: NodeJS.Timeout | null = null;

  constructor(
    private readonly bounds: SlowBounds,
    private readonly cutOff: (client: Client, socket: Socket, why: string) => void,
    /** The broker itself lets its clients wait: none of them is slow. */
    private readonly isHolding: () => boolean,
    private readonly now: () => number = () => performance.now(),
  ) {}

  start(): void {
    this.timer ??= setInterval(() => this.look(), this.bounds.look_ms).unref();
  }

  stop(): void {
    if (this.timer !== null) clearInterval(this.timer);
    this.timer = null;
  }

  watch(client: Client, socket: Socket, sizes: PacketSizes): void {
    const one: Watched = { client, socket, sizes, behind: null, within: null };
    this.all.add(one);
    socket.once('close', () => this.all.delete(one));
    const delivering = client as unknown as Delivering;
    for (const way of ['deliver0', 'deliverQoS'] as const) {
      const deliver = delivering[way];
      delivering[way] = (packet, done) => {
        // What was kept and is asked for now is sent as it is taken.
        if (packet.brokerId === null) {
          deliver(packet, done);
          return;
        }
        if (this.isTooFarBehind(socket)) {
          this.end(one, `${socket.writableLength} bytes wait for it`);
        } else deliver(packet, () => undefined);
        setImmediate(done);
      };
    }
  }

  private isTooFarBehind({ writableLength }: Socket): boolean {
    if (writableLength < LITTLE_BYTES) return false;
    const { unsent_most_bytes, unsent_all_most_bytes } = this.bounds;
    if (writableLength > unsent_most_bytes) return true;
    let all = 0;
    for (const { socket } of this.all) all += socket.writableLength;
    return all > unsent_all_most_bytes;
  }

  private look(): void {
    const { patience_ms } = this.bounds;
    const now = this.now();
    for (const one of this.all) {
      const { socket, sizes } = one;
      const taken = socket.bytesWritten - socket.writableLength;
      if (socket.writableLength === 0) one.behind = null;
      else if (one.behind === null || taken - one.behind.taken >= LEAST_BYTES) {
        one.behind = { since_ms: now, taken };
      }
      if (!sizes.isWithin || this.isHolding()) one.within = null;
      else if (one.within?.packet !== sizes.begun) {
        one.within = { since_ms: now, packet: sizes.begun };
      }
      if (one.behind !== null && now - one.behind.since_ms >= patience_ms) {
        this.end(one, `it takes nothing of ${socket.writableLength} bytes that wait for it`);
      } else if (one.within !== null && now - one.within.since_ms >= patience_ms) {
        this.end(one, 'it does not come to the end of a packet');
      }
    }
  }

  private end(one: Watched, why: string): void {
    if (!this.all.delete(one)) return;
    this.cutOff(one.client, one.socket, why);
  }
}
