import { Readable } from 'node:stream';
import type { WaitingPacket } from './messageQueue.js';
import type { Retained } from './retained.js';
import type { Sessions } from './sessions.js';
import type { Subscriptions } from './subscriptions.js';

interface HasId {
  readonly id: string;
}

interface Subscription {
  readonly topic: string;
  readonly qos: number;
}

/** The parts of aedes' own store in memory that are used on: subscriptions and last wills. */
export interface OwnStore {
  addSubscriptions(client: HasId, subscriptions: readonly Subscription[]): Promise<void>;
  removeSubscriptions(client: HasId, topics: readonly string[]): Promise<void>;
  subscriptionsByClient(client: HasId): Promise<Subscription[]>;
  subscriptionsByTopic(topic: string): Promise<{ clientId: string; topic: string }[]>;
  cleanSubscriptions(client: HasId): Promise<unknown>;
  countOffline(): Promise<unknown>;
  putWill(client: HasId, packet: unknown): Promise<void>;
  getWill(client: HasId): Promise<unknown>;
  delWill(client: HasId): Promise<unknown>;
  streamWill(brokers: unknown): Readable;
  getClientList(topic: string): Readable;
  destroy(): Promise<void>;
}

/**
 * What aedes 1.2 asks of a store, with everything bounded that clients can make grow. Its own keeps
 * messages for absent clients, retained ones and half-finished ones of QoS 2 without a bound.
 */
export class BrokerStore {
  constructor(
    private readonly inner: OwnStore,
    private readonly sessions: Sessions,
    private readonly retained: Retained,
    private readonly subscriptions: Subscriptions,
    /** A message is not kept for a client, as too much waits. */
    private readonly notKept: (id: string, topic: string) => void,
  ) {}

  async setup(): Promise<void> {}

  /** Kept where it is published, by who publishes it. */
  async storeRetained(): Promise<void> {}

  createRetainedStream(filter: string): Readable {
    return this.createRetainedStreamCombi([filter]);
  }

  createRetainedStreamCombi(filters: readonly string[]): Readable {
    return Readable.from(this.retained.of(filters));
  }

  /** aedes hands over all that one packet asks for, with what was refused. */
  async addSubscriptions(client: HasId, asked: readonly Subscription[]): Promise<void> {
    const granted = asked.filter(({ topic }) => this.subscriptions.has(client.id, topic));
    await this.inner.addSubscriptions(client, granted);
  }

  removeSubscriptions(client: HasId, topics: readonly string[]): Promise<void> {
    return this.inner.removeSubscriptions(client, topics);
  }

  subscriptionsByClient(client: HasId): Promise<Subscription[]> {
    return this.inner.subscriptionsByClient(client);
  }

  subscriptionsByTopic(topic: string): Promise<{ clientId: string; topic: string }[]> {
    return this.inner.subscriptionsByTopic(topic);
  }

  /** MQTT 3.1.1, 3.1.2.4: a client that comes without its session ends it. */
  async cleanSubscriptions(client: HasId): Promise<void> {
    this.subscriptions.forget(client.id);
    await this.inner.cleanSubscriptions(client);
  }

  countOffline(): Promise<unknown> {
    return this.inner.countOffline();
  }

  async outgoingEnqueue(subscription: { clientId: string }, packet: WaitingPacket): Promise<void> {
    const { clientId } = subscription;
    if (!this.sessions.add(clientId, packet)) this.notKept(clientId, packet.topic ?? '');
  }

  async outgoingEnqueueCombi(
    subscriptions: readonly { clientId: string }[],
    packet: WaitingPacket,
  ): Promise<void> {
    for (const one of subscriptions) await this.outgoingEnqueue(one, packet);
  }

  /** One that is not kept goes out all the same: once, if the client is there. */
  async outgoingUpdate(client: HasId, packet: WaitingPacket): Promise<void> {
    this.sessions.update(client.id, packet);
  }

  async outgoingClearMessageId(client: HasId, packet: { messageId?: number }): Promise<unknown> {
    return this.sessions.acknowledged(client.id, packet.messageId);
  }

  outgoingStream(client: HasId): Readable {
    return Readable.from(this.sessions.waiting(client.id));
  }

  /** That it came, and not what it was: aedes publishes a message of QoS 2 as it comes in. */
  async incomingStorePacket(client: HasId, packet: { messageId: number }): Promise<void> {
    this.sessions.incoming(client.id)?.add(packet.messageId);
  }

  async incomingGetPacket(client: HasId, packet: { messageId: number }): Promise<object> {
    const { messageId } = packet;
    if (this.sessions.incoming(client.id)?.has(messageId)) return { messageId };
    throw new Error('no such packet');
  }

  async incomingDelPacket(client: HasId, packet: { messageId: number }): Promise<void> {
    if (this.sessions.incoming(client.id)?.delete(packet.messageId)) return;
    throw new Error('no such packet');
  }

  async cleanIncoming(client: HasId): Promise<void> {
    this.sessions.incoming(client.id)?.clear();
  }

  putWill(client: HasId, packet: unknown): Promise<void> {
    return this.inner.putWill(client, packet);
  }

  getWill(client: HasId): Promise<unknown> {
    return this.inner.getWill(client);
  }

  delWill(client: HasId): Promise<unknown> {
    return this.inner.delWill(client);
  }

  streamWill(brokers: unknown): Readable {
    return this.inner.streamWill(brokers);
  }

  getClientList(topic: string): Readable {
    return this.inner.getClientList(topic);
  }

  destroy(): Promise<void> {
    return this.inner.destroy();
  }
}
