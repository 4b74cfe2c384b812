import type { History } from '../adapters/history/history.js';
import type { HealthPart } from '../adapters/http/service.js';
import { EventTeller } from '../adapters/notify/eventTeller.js';
import { WebhookForwarder } from '../adapters/notify/webhookForwarder.js';
import type { NotifyConfig, WebhookConfig } from '../config/site.js';
import type { Log } from '../log.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';

export interface NotifyPartOptions {
  readonly config: NotifyConfig;
  readonly site: string;
  readonly history: History;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly log: Log;
  readonly mqtt_prefix: string;
  /** Publishes over MQTT; resolves once the broker has it. */
  deliver(topic: string, payload: string): Promise<void>;
}

interface Receiver {
  readonly config: WebhookConfig;
  readonly forwarder: WebhookForwarder;
  backlog(): number;
}

/** Who is told of alarms and alerts: over MQTT and over HTTP, each with its own cursor and pauses. */
export class NotifyPart {
  private receivers: readonly Receiver[] = [];
  private teller: EventTeller | null = null;

  constructor(private readonly options: NotifyPartOptions) {}

  get health(): HealthPart[] {
    return this.receivers.map(({ config, forwarder, backlog }) => {
      const { trouble } = forwarder;
      const waiting = `${backlog()} events wait`;
      const detail = trouble === null ? waiting : `${trouble}; ${waiting}, none is lost`;
      return { name: `webhook ${config.id}`, ok: trouble === null, detail };
    });
  }

  /** Events that wait, by receiver. */
  get backlogs(): Record<string, number> {
    const waiting = this.receivers.map(({ config, backlog }) => [
      `webhook ${config.id}`,
      backlog(),
    ]);
    return Object.fromEntries(waiting);
  }

  /** To be called with the history open. */
  start(): void {
    this.receivers = this.options.config.webhooks.map((config) => this.receiver(config));
    for (const { forwarder } of this.receivers) forwarder.start();
    this.teller = this.makeTeller();
    this.teller.start();
  }

  async stop(): Promise<void> {
    const ends = this.receivers.map(({ forwarder }) => forwarder.stop());
    await Promise.all([...ends, this.teller?.stop()]);
    this.receivers = [];
    this.teller = null;
  }

  private makeTeller(): EventTeller {
    const { history, counters, mqtt_prefix, deliver } = this.options;
    const queue = history.eventQueue('mqtt');
    queue.start();
    const count = (name: 'events_told' | 'events_told_failures') => counters.add(name);
    return new EventTeller({ prefix: mqtt_prefix, queue, deliver, count });
  }

  private receiver(config: WebhookConfig): Receiver {
    const { site, history, clock, counters, notices, log } = this.options;
    const queue = history.eventQueue(`webhook ${config.id}`);
    queue.start();
    const forwarder = new WebhookForwarder({
      ...{ config, site, queue },
      now: () => clock.now(),
      count: (name, by) => counters.add(name, by),
      down: (reason) =>
        log.warn(`webhook ${config.id}: cannot be delivered: ${reason}; events wait, none is lost`),
      up: () => log.info(`webhook ${config.id}: delivered again`),
      refused: (reason) => notices.warn('webhook_set_aside', `webhook ${config.id}: ${reason}`),
    });
    return { config, forwarder, backlog: () => queue.backlog };
  }
}
