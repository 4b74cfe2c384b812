import type { Duplex } from 'node:stream';
import { Aedes, type AedesOptions, type Client, type PublishPacket } from 'aedes';
import { BrokerStore, type OwnStore } from './brokerStore.js';
import { packetBytes } from './messageQueue.js';
import { Retained } from './retained.js';
import { Sessions } from './sessions.js';
import { Subscriptions } from './subscriptions.js';

/** What clients make grow, and what is refused beyond. */
export type Bounded = 'retained' | 'queued' | 'sessions' | 'subscriptions';

export interface BoundedOptions {
  /** For all that is kept together: a quarter retained, a quarter waits for others [bytes]. */
  readonly memory_most_bytes: number;
  refused(what: Bounded, text: string): void;
  /** Publishers have to wait, as rockhour itself is behind. */
  held(text: string): void;
  /** A client that was let in is turned away after all. */
  turnedAway(client: Client): void;
}

const SESSIONS = 256;
const SUBSCRIPTIONS = { each_most: 256, all_most: 4096, filter_most_characters: 1024 };
/** MQTT 3.1.1, 3.1.3.1 wants 23 taken; Sparkplug and gateways have longer ones. */
const MOST_ID_CHARACTERS = 256;
/** aedes and its tables of topics have a limit of their own, beyond which a message goes nowhere. */
const MOST_LEVELS = 100;
/** Half-finished messages of QoS 2 of one client. */
const MOST_HALF_FINISHED = 100;
/** MQTT 3.1.1, 3.2.2.3. */
const [ID_REJECTED, UNAVAILABLE] = [2, 3];
/** Of publishers that waited so much is let through at a time. */
const [LET_MESSAGES, LET_BYTES] = [64, 1_000_000];
const EXPIRE_EVERY_MS = 600_000;
const SHOWN = 120;

type Rules = Pick<
  AedesOptions,
  'authenticate' | 'authorizePublish' | 'authorizeSubscribe' | 'authorizeForward'
>;

/** aedes 1.2 hands the client over as well. */
type Publish = (packet: PublishPacket, ...rest: unknown[]) => void;

interface Held {
  readonly bytes: number;
  go(): void;
}

/**
 * aedes with all that clients can make grow bounded: retained messages, sessions and what waits for
 * them, subscriptions. rockhour's own links are within no bound of these; where more waits for
 * rockhour than it may, nobody's message is lost but publishers wait: their messages are not
 * acknowledged, and TCP holds what follows back.
 */
export class BoundedBroker extends Aedes {
  private readonly own = new WeakSet<Client>();
  /** Who holds an id: one that comes later under the same takes it over. */
  private readonly holders = new Map<string, Client>();
  private readonly retained: Retained;
  private readonly sessions: Sessions;
  private readonly filters = new Subscriptions(SUBSCRIPTIONS);
  private readonly held = new Map<Client, Held[]>();
  private isLetting = false;
  private expiry: NodeJS.Timeout | null = null;

  constructor(
    options: AedesOptions,
    private readonly rules: Rules,
    private readonly bounds: BoundedOptions,
  ) {
    super({ ...options, maxInflightInbound: MOST_HALF_FINISHED });
    const quarter = bounds.memory_most_bytes / 4;
    this.retained = new Retained(quarter);
    this.sessions = new Sessions(
      {
        ...{ sessions_most: SESSIONS, queued_most_bytes: quarter },
        own_queued_most_bytes: 2 * quarter,
      },
      (id) => this.dropped(id),
    );
    this.authenticate = this.letIn;
    this.authorizePublish = this.letPublish;
    this.authorizeSubscribe = this.letSubscribe;
    this.authorizeForward = this.letHave;
    this.on('unsubscribe', (topics, { id }) => this.filters.remove(id, topics));
  }

  override async listen(): Promise<void> {
    await super.listen();
    const kept = this as unknown as { persistence: OwnStore | BrokerStore };
    kept.persistence = new BrokerStore(
      ...([kept.persistence as OwnStore, this.sessions, this.retained, this.filters] as const),
      (id, topic) =>
        this.bounds.refused('queued', `for ${short(id)} to ${short(topic)}: too much waits`),
    );
    this.expiry = setInterval(() => this.sessions.expire(), EXPIRE_EVERY_MS).unref();
    this.on('ack', () => this.letThrough());
  }

  override close(done?: () => void): void {
    if (this.expiry !== null) clearInterval(this.expiry);
    this.held.clear();
    super.close(done);
  }

  /** Takes a connection; `isOwn`: one of rockhour's own links. */
  take(connection: Duplex, isOwn: boolean): Client {
    const client = this.handle(connection);
    if (isOwn) this.own.add(client);
    connection.once('close', () => this.left(client));
    return client;
  }

  /** Whether a client has been let in: aedes says so only once it has taken what waited for it. */
  isIn(client: Client): boolean {
    return client.id !== null && this.holders.get(client.id) === client;
  }

  /** Whether publishers wait for rockhour. */
  get isHolding(): boolean {
    return !this.sessions.hasRoom;
  }

  override publish(packet: PublishPacket, ...rest: unknown[]): void {
    const publish: Publish = super.publish.bind(this) as Publish;
    const client = (typeof rest[0] === 'object' ? rest[0] : null) as Client | null;
    const isKept = packet.retain && packet.topic.split('/').length <= MOST_LEVELS;
    const asIs = !isKept || this.keep(packet, client);
    publish(asIs ? packet : { ...packet, retain: false }, ...rest);
  }

  private keep({ topic, payload, qos }: PublishPacket, client: Client | null): boolean {
    const isOwn = client === null || this.own.has(client);
    if (this.retained.keep(topic, payload, qos, isOwn)) return true;
    const text = `of ${short(client?.id ?? '')} to ${short(topic)}: too much is kept`;
    this.bounds.refused('retained', text);
    return false;
  }

  private readonly letIn: NonNullable<Rules['authenticate']> = (client, name, password, done) => {
    const enter = () => {
      const { id, clean } = client;
      const isTooLong = id.length > MOST_ID_CHARACTERS;
      if (!isTooLong && this.sessions.enter(id, !clean, this.own.has(client))) {
        this.holders.set(id, client);
        done(null, true);
        return;
      }
      const why = isTooLong
        ? `an id of ${id.length} characters, more than ${MOST_ID_CHARACTERS}`
        : `there are ${SESSIONS} sessions`;
      this.bounds.refused('sessions', `${short(id)}: ${why}`);
      this.bounds.turnedAway(client);
      const returnCode = isTooLong ? ID_REJECTED : UNAVAILABLE;
      done(Object.assign(new Error(why), { returnCode }), false);
    };
    const { authenticate } = this.rules;
    if (authenticate === undefined) enter();
    else {
      authenticate(client, name, password, (error, isIn) => {
        if (error === null && isIn) enter();
        else done(error, isIn);
      });
    }
  };

  private readonly letPublish: NonNullable<Rules['authorizePublish']> = (client, packet, done) => {
    const go = () => {
      const { authorizePublish } = this.rules;
      if (authorizePublish) authorizePublish(client, packet, done);
      else done(null);
    };
    const isFree = client === null || this.own.has(client);
    if (isFree || (this.sessions.hasRoom && !this.held.has(client))) {
      go();
      return;
    }
    // The last will of one that is gone: whoever comes and goes must not fill what is bounded.
    if (client.closed) {
      this.bounds.refused('queued', `the will of ${short(client.id)}: too much waits for rockhour`);
      done(new Error('no room'));
      return;
    }
    const held = this.held.get(client) ?? [];
    if (held.length === 0) {
      this.held.set(client, held);
      this.bounds.held(`${short(client.id)} waits, as rockhour is behind`);
    }
    held.push({ bytes: packetBytes(packet as { cmd: string }), go });
  };

  private readonly letSubscribe: NonNullable<Rules['authorizeSubscribe']> = (
    client,
    subscription,
    done,
  ) => {
    const { id } = client;
    const { topic } = subscription;
    const why = this.own.has(client) ? null : this.filters.refusal(id, topic);
    if (why !== null) {
      this.bounds.refused('subscriptions', `${short(id)} of ${short(topic)}: ${why}`);
      done(null, null);
      return;
    }
    const grant: typeof done = (error, granted) => {
      if (error === null && granted) this.filters.add(id, topic, this.own.has(client));
      done(error, granted);
    };
    const { authorizeSubscribe } = this.rules;
    if (authorizeSubscribe) authorizeSubscribe(client, subscription, grant);
    else grant(null, subscription);
  };

  private readonly letHave: NonNullable<Rules['authorizeForward']> = (client, packet) => {
    const { authorizeForward } = this.rules;
    const forward = authorizeForward ? authorizeForward(client, packet) : packet;
    // It would wait for ever.
    if (!forward && !client.clean) this.sessions.drop(client.id, packet.brokerCounter);
    return forward;
  };

  private left(client: Client): void {
    this.held.delete(client);
    const { id } = client;
    if (id === null || this.holders.get(id) !== client) return;
    this.holders.delete(id);
    if (client.clean) this.filters.forget(id);
    this.sessions.leave(id, this.filters.of(id) > 0);
    this.letThrough();
  }

  private dropped(id: string): void {
    this.filters.forget(id);
    const { persistence } = this as unknown as { persistence: BrokerStore };
    void persistence.cleanSubscriptions({ id });
  }

  /** Lets publishers go on, each in its order and all in turn, as long as there is room. */
  private letThrough(): void {
    if (this.isLetting || this.held.size === 0 || !this.sessions.hasRoom) return;
    this.isLetting = true;
    setImmediate(() => {
      this.isLetting = false;
      let [messages, bytes] = [0, 0];
      while (this.held.size > 0 && messages < LET_MESSAGES && bytes < LET_BYTES) {
        for (const [client, held] of this.held) {
          const next = held.shift();
          if (held.length === 0) this.held.delete(client);
          if (next === undefined) continue;
          messages++;
          bytes += next.bytes;
          next.go();
        }
      }
      this.letThrough();
    });
  }
}

const short = (text: string) => (text.length > SHOWN ? `${text.slice(0, SHOWN)}...` : text);
