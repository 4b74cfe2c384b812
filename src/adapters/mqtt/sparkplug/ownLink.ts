import type { IClientOptions, MqttClient } from 'mqtt';
import { reasonOf } from '../../../errors.js';
import { type LinkOptions, openClient } from '../link.js';
import type { OwnNode } from './ownNode.js';

export interface OwnLinkOptions
  extends Pick<
    LinkOptions,
    'url' | 'inside' | 'client_id' | 'username' | 'password' | 'tls' | 'protocol'
  > {
  readonly node: OwnNode;
  /** Number of the last connection, kept over restarts; null before the first. */
  lastBdSeq(): number | null;
  keepBdSeq(bdSeq: number): void;
  up(): void;
  /** Not connected, and why; once per outage. */
  down(reason: string): void;
}

/** Client id of the edge node's connection, beside that of the other one. */
export const nodeClientId = (client_id: string) => `${client_id}-sparkplug`;

const RECONNECT_MS = 1000;
const CONNECT_TIMEOUT_MS = 10_000;
const KEEPALIVE_S = 15;
const TICK_MS = 5000;
const END_MS = 1000;

/**
 * The connection of rockhour's own edge node: apart from the other, since each has one will. A will
 * holds the number of its connection (bdSeq), so that every connection is a client of its own.
 */
export class OwnLink {
  private client: MqttClient | null = null;
  private bdSeq: number | null = null;
  /** The number has been in a connection that stood. */
  private isUsed = true;
  private isUp = false;
  private isToldDown = false;
  private running = false;
  private retry: NodeJS.Timeout | null = null;
  private ticking: NodeJS.Timeout | null = null;

  constructor(private readonly options: OwnLinkOptions) {}

  get connected(): boolean {
    return this.isUp;
  }

  start(): void {
    if (this.running) return;
    this.running = true;
    this.bdSeq = this.options.lastBdSeq();
    this.ticking = setInterval(() => this.options.node.tick(), TICK_MS);
    this.connect();
  }

  /** Says its death itself: a clean end takes the will with it (MQTT 3.1.1, 3.14). */
  async stop(): Promise<void> {
    this.running = false;
    if (this.retry) clearTimeout(this.retry);
    if (this.ticking) clearInterval(this.ticking);
    this.retry = null;
    this.ticking = null;
    const { client, isUp } = this;
    this.client = null;
    this.isUp = false;
    this.options.node.disconnected();
    if (!client) return;
    let timer: NodeJS.Timeout | undefined;
    const inTime = new Promise<void>((resolve) => {
      timer = setTimeout(resolve, END_MS);
    });
    const { topic, payload } = this.options.node.death(this.bdSeq ?? 0);
    const farewell = async () => {
      if (isUp) await client.publishAsync(topic, payload, { qos: 1, retain: false });
      await client.endAsync(!isUp);
    };
    await Promise.race([farewell().catch(() => undefined), inTime]);
    clearTimeout(timer);
    client.stream.destroy();
  }

  private connect(): void {
    this.retry = null;
    const { node } = this.options;
    if (this.isUsed) {
      this.bdSeq = this.bdSeq === null ? 0 : (this.bdSeq + 1) % 256;
      this.options.keepBdSeq(this.bdSeq);
      this.isUsed = false;
    }
    const bdSeq = this.bdSeq!;
    const client = openClient(this.options, this.clientOptions(bdSeq));
    this.client = client;
    client.on('connect', () => {
      this.isUsed = true;
      // Commands first: a host asks for a birth as soon as it sees one that it cannot follow.
      client.subscribe(node.commandTopic, { qos: 1 }, (error) => {
        if (this.client !== client || !client.connected) return;
        if (error) this.tellDown(`the subscription of commands was refused: ${reasonOf(error)}`);
        else this.isToldDown = false;
        this.isUp = true;
        this.options.up();
        const publish = (topic: string, payload: Buffer, written: () => void) =>
          client.publish(topic, payload, { qos: 0, retain: false }, () => written());
        node.connected({ publish }, bdSeq);
      });
    });
    client.on('message', (topic, payload) => {
      if (topic === node.commandTopic) node.command(payload);
    });
    client.on('error', (error) => this.tellDown(reasonOf(error)));
    client.on('close', () => this.closed(client));
  }

  private closed(client: MqttClient): void {
    if (this.client !== client) return;
    this.client = null;
    this.isUp = false;
    this.options.node.disconnected();
    client.end(true);
    if (!this.running) return;
    this.tellDown('the connection was closed');
    this.retry = setTimeout(() => this.connect(), RECONNECT_MS);
  }

  private tellDown(reason: string): void {
    if (this.isToldDown) return;
    this.isToldDown = true;
    this.options.down(reason);
  }

  private clientOptions(bdSeq: number): IClientOptions {
    const { node, client_id, username, password, protocol } = this.options;
    return {
      ...{ clientId: client_id, clean: true, protocolVersion: protocol },
      ...(username === null ? {} : { username }),
      ...(password === null ? {} : { password }),
      will: { ...node.death(bdSeq), qos: 1, retain: false },
      keepalive: KEEPALIVE_S,
      // A client that connects again would do so with the same will.
      reconnectPeriod: 0,
      connectTimeout: CONNECT_TIMEOUT_MS,
      queueQoSZero: false,
    };
  }
}
