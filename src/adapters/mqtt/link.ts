import type { Duplex } from 'node:stream';
import { connect, type IClientOptions, type IPublishPacket, MqttClient } from 'mqtt';
import { clientTlsOptions } from '../../access/tls.js';
import type { ClientTls } from '../../config/site.js';
import { reasonOf } from '../../errors.js';

/** A message that came in. It is the broker's until it is acknowledged. */
export interface Delivery {
  readonly topic: string;
  readonly payload: Buffer;
  /** The broker says that it may have sent it before. */
  readonly duplicate: boolean;
  /** The broker had kept it for whoever subscribes; absent: it did not say so. */
  readonly retained?: boolean;
  /**
   * Tells the broker that the message is safe; does nothing once the connection that it came by is
   * gone. null where the broker wants no acknowledgement (QoS 0).
   */
  readonly acknowledge: (() => void) | null;
}

export interface LinkOptions {
  /** Asked at each start. */
  url(): string;
  /** Opens a connection within the process, asked at each try; absent: the url is connected to. */
  readonly inside?: (() => Duplex) | null;
  readonly client_id: string;
  readonly username: string | null;
  readonly password: string | null;
  /** Certificates, where the url is one with TLS. */
  readonly tls?: ClientTls | null;
  readonly protocol: 4 | 5;
  readonly qos: 0 | 1;
  readonly topics: readonly string[];
  /** Retained message that the broker publishes when this client is gone. */
  readonly will: { readonly topic: string; readonly payload: string };
  receive(delivery: Delivery): void;
  /** Connected and subscribed: at the start and after each outage. */
  up(): void;
  /** Not connected, and why: once per outage. */
  down(reason: string): void;
  /** The broker refused a subscription; the link stays up. */
  refused(reason: string): void;
}

/** How long the broker keeps the session of an absent rockhour [s]: a week. MQTT 5 has to be told. */
const SESSION_EXPIRY_S = 7 * 86_400;
/**
 * Messages that the broker may have on their way before one is acknowledged. By MQTT 3.1.1 its own
 * limit stands alone (mosquitto: 20), and each sync of the journal is for that many.
 */
export const RECEIVE_MAXIMUM = 2048;
const RECONNECT_MS = 1000;
const CONNECT_TIMEOUT_MS = 10_000;
const KEEPALIVE_S = 15;
/** Well below the 20 s within which a clean end must be through. */
const END_MS = 1000;
/** A broker that does not take them costs no more memory than this many messages. */
const MOST_TELLING = 1000;

/** A message handed on but not yet acknowledged: MQTT.js then sends no PUBACK of its own. */
const LATER = new Error('acknowledged apart from the handler');

/** PUBACK without a reason, which means success, in both versions of MQTT: type, length, message id. */
const PUBACK = 0x40;
const PUBACK_BYTES = 4;

/**
 * The one wrapper of MQTT.js. It keeps a session at the broker, subscribes on every connect, tells
 * an outage once, and hands out messages with an acknowledgement of their own: MQTT.js would send
 * the PUBACK when its handler calls back and take no further message before, which makes one
 * message per commit of the journal.
 */
export class MqttLink {
  private client: MqttClient | null = null;
  private isUp = false;
  private isToldDown = false;
  /** Messages by `tell` that the broker has not acknowledged. */
  private telling = 0;
  /** Ends each wait of `deliver`. */
  private readonly delivering = new Set<(reason: Error) => void>();
  /** Message ids to be acknowledged by the connection that they came by, in this turn of the loop. */
  private acknowledged: number[] = [];
  private acknowledging: Duplex | null = null;
  /** Newest payload that waits per topic while an older one is on its way. */
  private readonly waiting = new Map<string, string | null>();

  constructor(private readonly options: LinkOptions) {}

  get connected(): boolean {
    return this.isUp;
  }

  start(): void {
    if (this.client) return;
    const client = openClient(this.options, clientOptions(this.options));
    this.client = client;
    client.handleMessage = (packet, done) => this.take(packet as IPublishPacket, done);
    client.on('connect', () => this.subscribe(client));
    client.on('close', () => {
      this.isUp = false;
      this.tellDown('the connection was closed');
    });
    // Emitted at each try; without a listener it would end the process.
    client.on('error', (error) => {
      if (!client.connected) this.tellDown(reasonOf(error));
    });
  }

  async stop(): Promise<void> {
    this.sendAcknowledged();
    // A broker that hangs says nothing to these either: who waits for one must not hold up the end.
    for (const end of this.delivering) end(new Error('the link was ended'));
    const client = this.client;
    this.client = null;
    if (!client) return;
    const wasUp = this.isUp;
    this.isUp = false;
    let timer: NodeJS.Timeout | undefined;
    const inTime = new Promise<void>((resolve) => {
      timer = setTimeout(resolve, END_MS);
    });
    await Promise.race([client.endAsync(!wasUp), inTime]);
    clearTimeout(timer);
    client.stream.destroy();
  }

  /**
   * Publishes a retained message, at least once. While an earlier one to the same topic is on its
   * way only the newest waits: a slow broker costs no memory.
   * @returns false where there is no connection; nothing is kept then
   */
  publish(topic: string, payload: string): boolean {
    if (!this.isUp || !this.client) return false;
    if (this.waiting.has(topic)) this.waiting.set(topic, payload);
    else this.send(this.client, topic, payload);
    return true;
  }

  /**
   * Publishes a message that is not retained, at least once.
   * @returns false where there is no connection, or too many such are on their way: it is not sent
   */
  tell(topic: string, payload: string): boolean {
    return this.sendOnce(topic, payload, 1);
  }

  /**
   * Publishes a message that is not retained, at most once.
   * @returns false where there is no connection, or too many are on their way: it is not sent
   */
  command(topic: string, payload: Buffer): boolean {
    return this.sendOnce(topic, payload, 0);
  }

  private sendOnce(topic: string, payload: string | Buffer, qos: 0 | 1): boolean {
    if (!this.isUp || !this.client || this.telling >= MOST_TELLING) return false;
    this.telling++;
    this.client.publish(topic, payload, { qos, retain: false }, () => {
      this.telling--;
    });
    return true;
  }

  /**
   * Publishes a message that is not retained and waits for the broker's word that it has it.
   * @throws Error where there is no connection, no word within the time, or the link is ended
   */
  async deliver(topic: string, payload: string, within_ms: number): Promise<void> {
    const { client } = this;
    if (!this.isUp || !client) throw new Error('no connection to the broker');
    let end: (reason: Error) => void = () => undefined;
    const limit = new Promise<never>((_, reject) => {
      end = reject;
    });
    const late = setTimeout(() => end(new Error(`no answer within ${within_ms} ms`)), within_ms);
    this.delivering.add(end);
    const sent = client.publishAsync(topic, payload, { qos: 1, retain: false });
    try {
      await Promise.race([sent, limit]);
    } finally {
      clearTimeout(late);
      this.delivering.delete(end);
      // What comes after the limit is nobody's.
      sent.catch(() => undefined);
    }
  }

  /** Ends a subscription that the broker remembers from before. */
  unsubscribe(topic: string): void {
    // Said again with the next message should it fail.
    if (this.isUp) this.client?.unsubscribe(topic, () => undefined);
  }

  private send(client: MqttClient, topic: string, payload: string): void {
    this.waiting.set(topic, null);
    client.publish(topic, payload, { qos: 1, retain: true }, () => {
      const next = this.waiting.get(topic);
      this.waiting.delete(topic);
      if (typeof next === 'string') this.publish(topic, next);
    });
  }

  private subscribe(client: MqttClient): void {
    const { topics, qos } = this.options;
    const ready = () => {
      this.isUp = true;
      this.isToldDown = false;
      this.options.up();
    };
    if (topics.length === 0) {
      ready();
      return;
    }
    client.subscribe([...topics], { qos }, (error) => {
      if (this.client !== client || !client.connected) return;
      if (error) this.options.refused(reasonOf(error));
      ready();
    });
  }

  private tellDown(reason: string): void {
    if (!this.client || this.isToldDown) return;
    this.isToldDown = true;
    this.options.down(reason);
  }

  private take(packet: IPublishPacket, done: (error?: Error) => void): void {
    // Not a count made at 'connect': what a session still holds comes before MQTT.js emits that.
    const connection = this.client?.stream;
    const { messageId, qos } = packet;
    this.options.receive({
      topic: packet.topic,
      payload: Buffer.isBuffer(packet.payload) ? packet.payload : Buffer.from(packet.payload),
      duplicate: packet.dup,
      retained: packet.retain,
      acknowledge:
        qos !== 1 || messageId === undefined || connection === undefined
          ? null
          : () => this.acknowledge(messageId, connection),
    });
    done(qos === 1 ? LATER : undefined);
  }

  private acknowledge(messageId: number, connection: Duplex): void {
    if (this.client?.stream !== connection || connection.destroyed) return;
    if (this.acknowledged.length > 0 && this.acknowledging === connection) {
      this.acknowledged.push(messageId);
      return;
    }
    this.acknowledged = [messageId];
    this.acknowledging = connection;
    process.nextTick(() => this.sendAcknowledged());
  }

  /** All of one group commit by one write: a packet written by MQTT.js each cost more than the commit. */
  private sendAcknowledged(): void {
    const ids = this.acknowledged;
    const connection = this.acknowledging;
    this.acknowledged = [];
    this.acknowledging = null;
    if (ids.length === 0 || connection === null) return;
    if (this.client?.stream !== connection || !connection.writable) return;
    const packets = Buffer.allocUnsafe(ids.length * PUBACK_BYTES);
    ids.forEach((id, n) => {
      packets.writeUInt16BE((PUBACK << 8) | (PUBACK_BYTES - 2), n * PUBACK_BYTES);
      packets.writeUInt16BE(id, n * PUBACK_BYTES + 2);
    });
    connection.write(packets);
  }
}

function clientOptions(options: LinkOptions): IClientOptions {
  return {
    clientId: options.client_id,
    clean: false,
    protocolVersion: options.protocol,
    ...(options.username === null ? {} : { username: options.username }),
    ...(options.password === null ? {} : { password: options.password }),
    ...(options.protocol === 5
      ? {
          properties: {
            sessionExpiryInterval: SESSION_EXPIRY_S,
            receiveMaximum: RECEIVE_MAXIMUM,
          },
        }
      : {}),
    will: { ...options.will, payload: Buffer.from(options.will.payload), qos: 1, retain: true },
    keepalive: KEEPALIVE_S,
    reconnectPeriod: RECONNECT_MS,
    connectTimeout: CONNECT_TIMEOUT_MS,
    reconnectOnConnackError: true,
    resubscribe: false,
    queueQoSZero: false,
    // Its trace of each packet, which nobody reads, would be put together before it is thrown away.
    log: () => {},
  };
}

/** A client of MQTT.js, by the network or within the process. */
export function openClient(
  { url, tls = null, inside = null }: Pick<LinkOptions, 'url' | 'tls' | 'inside'>,
  options: IClientOptions,
): MqttClient {
  if (inside !== null) return new MqttClient(() => inside(), options);
  const isSecure = /^(mqtts|tls|wss):/.test(url());
  return connect(url(), { ...options, ...(isSecure ? clientTlsOptions(tls) : {}) });
}
