import type { ChannelSource } from '../../config/site.js';
import type { UnitDefinition } from '../../core/definitions.js';
import type { Delivery } from './link.js';
import {
  makeRoute,
  PAYLOAD_FAULTS,
  type PayloadFault,
  type PayloadReading,
  parsePayload,
  type Quality,
  type Route,
} from './payload.js';
import { RecentReadings } from './recent.js';
import { SPARKPLUG_COUNTS } from './sparkplug/counts.js';
import type { SparkplugHost } from './sparkplug/host.js';
import type { SparkplugReading } from './sparkplug/session.js';

/** What the intake hands on; the shape of the journal's reading. */
export interface IntakeReading {
  readonly unit: string;
  readonly channel: string;
  readonly time_ms: number;
  readonly arrival_ms: number;
  readonly value: number;
  readonly quality: Quality;
}

export const INTAKE_COUNTS = [
  'messages',
  /**
   * Messages that brought readings, and those of Sparkplug that were no more than heard; each of the
   * others is unknown_topic, malformed or wrong_length.
   */
  'messages_taken',
  'messages_without_readings',
  /** Readings found; each is then repeated, lost_without_journal, or one of `readings`. */
  'readings_found',
  'readings',
  'repeated',
  'unknown_topic',
  ...PAYLOAD_FAULTS,
  ...SPARKPLUG_COUNTS,
  'journal_failures',
  'lost_without_journal',
] as const;
export type IntakeCount = (typeof INTAKE_COUNTS)[number];

export interface IntakeOptions {
  readonly units: readonly UnitDefinition[];
  readonly sources: readonly ChannelSource[];
  /** Takes what comes from Sparkplug's edge nodes; absent: nothing does. */
  readonly sparkplug?: Pick<SparkplugHost, 'topics' | 'receive' | 'remember'>;
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** Writes readings to the disk; they are safe when it returns. May throw. */
  commit(readings: readonly IntakeReading[]): void;
  count(name: IntakeCount, by: number): void;
  /** A topic that nothing is configured for: a subscription left from another configuration. */
  unwanted(topic: string): void;
  /** Something that a person may want to read, by kind. */
  notice(kind: IntakeCount, text: string): void;
}

/** A group commit waits this long for company [ms]; STACK: PUBACK within 50 ms. */
const GROUP_MS = 20;
/** Fewer than a broker's usual in-flight limit (mosquitto: 20), so that a burst never waits. */
const GROUP_MESSAGES = 16;
/** So many are committed at once at the most, where the broker lets more be on their way. */
const GROUP_MOST = 2048;
/** After a failed commit [ms]. */
const RETRY_MS = 1000;
/** Unwritten readings kept while the journal fails; only QoS 0 can bring more than a broker holds back. */
const MOST_UNWRITTEN = 200_000;
/** Longest piece of a payload that goes into a notice. */
const EXCERPT = 120;

/**
 * Messages to readings to the journal, and only then to the acknowledgement, many at a time. A
 * message of which nothing can be used is counted, told and acknowledged: sent again it would be
 * no better.
 */
export class Intake {
  /**
   * Newest readings that are remembered, and how many the journal is to give back at a start: as many
   * as messages committed together can bring. A kill between the commit and the last acknowledgement
   * has the broker send all of these again.
   */
  readonly remembered: number;
  private readonly routes = new Map<string, Route[]>();
  private readonly recent: RecentReadings;
  private unwritten: IntakeReading[] = [];
  private unacknowledged: (() => void)[] = [];
  private unflushed = 0;
  private timer: NodeJS.Timeout | null = null;
  private soon: NodeJS.Immediate | null = null;
  private failing = false;
  private stopped = false;

  constructor(private readonly options: IntakeOptions) {
    const channels = new Map(
      options.units.flatMap((unit) =>
        unit.channels.map((channel) => [`${unit.id}\n${channel.id}`, channel] as const),
      ),
    );
    for (const source of options.sources) {
      const defined = source.channels.map((id) => {
        const channel = channels.get(`${source.unit}\n${id}`);
        if (!channel) {
          throw new RangeError(
            `sources: topic ${source.topic} must name channels of unit ${source.unit}, got ${id}`,
          );
        }
        return channel;
      });
      const routes = this.routes.get(source.topic) ?? [];
      this.routes.set(source.topic, [...routes, makeRoute(source, defined)]);
    }
    this.remembered = GROUP_MOST * this.widest();
    this.recent = new RecentReadings(this.remembered);
  }

  /** Most readings that one message brings. */
  private widest(): number {
    const { units, sparkplug } = this.options;
    const byTopic = [...this.routes.values()].map((routes) =>
      routes.reduce((sum, { source }) => sum + source.channels.length, 0),
    );
    // A message of an edge node may bring every channel of a unit.
    const byNode = sparkplug ? units.map(({ channels }) => channels.length) : [];
    return Math.max(1, ...byTopic, ...byNode);
  }

  get topics(): string[] {
    return [...this.routes.keys(), ...(this.options.sparkplug?.topics ?? [])];
  }

  /** True while the last commit failed and readings wait for the next try. */
  get stuck(): boolean {
    return this.failing;
  }

  /** Readings already in the journal, newest last: what the broker may send once more. */
  remember(readings: Iterable<IntakeReading>): void {
    for (const reading of readings) {
      this.recent.seen(reading);
      this.options.sparkplug?.remember(reading);
    }
  }

  start(): void {
    this.stopped = false;
  }

  receive(delivery: Delivery): void {
    // Not acknowledged, the broker has it still.
    if (this.stopped) return;
    const { count, notice } = this.options;
    count('messages', 1);
    this.unflushed++;
    if (delivery.acknowledge) this.unacknowledged.push(delivery.acknowledge);
    const routes = this.routes.get(delivery.topic);
    if (routes) {
      const found = routes.reduce((sum, route) => sum + this.takeIn(route, delivery), 0);
      if (found > 0) count('messages_taken', 1);
    } else if (!this.takeSparkplug(delivery)) {
      count('unknown_topic', 1);
      notice('unknown_topic', `nothing is configured for topic ${delivery.topic}`);
      this.options.unwanted(delivery.topic);
    }
    this.flushSoon();
  }

  /** Takes readings that no message brought, such as that a channel is missing. */
  add(readings: readonly SparkplugReading[]): void {
    if (this.stopped || readings.length === 0) return;
    this.unflushed++;
    this.queueAll(readings, this.options.now());
    this.flushSoon();
  }

  /**
   * Acknowledges a message that was for somebody else, in its turn: the broker is to get
   * acknowledgements in the order of arrival.
   */
  acknowledgeInTurn(acknowledge: () => void): void {
    if (this.stopped) return;
    this.unflushed++;
    this.unacknowledged.push(acknowledge);
    this.flushSoon();
  }

  private flushSoon(): void {
    if (this.failing) return;
    if (this.unflushed >= GROUP_MOST) this.flush();
    else if (this.unflushed >= GROUP_MESSAGES)
      this.soon ??= setImmediate(() => this.flushOnceQuiet());
    else this.timer ??= setTimeout(() => this.flush(), GROUP_MS);
  }

  /**
   * With all that the broker has on its way: a sync to the disk costs as much for one as for all. That
   * is in once a turn of the loop brings no more, or after GROUP_MS by the timer of the first.
   */
  private flushOnceQuiet(before = 0): void {
    if (this.unflushed === before) this.flush();
    else {
      const { unflushed } = this;
      this.soon = setImmediate(() => this.flushOnceQuiet(unflushed));
    }
  }

  /** Commits what waits and acknowledges it. */
  flush(): void {
    if (this.timer) clearTimeout(this.timer);
    this.timer = null;
    if (this.soon) clearImmediate(this.soon);
    this.soon = null;
    try {
      if (this.unwritten.length > 0) this.options.commit(this.unwritten);
    } catch (thrown) {
      this.failed(thrown);
      return;
    }
    this.failing = false;
    this.options.count('readings', this.unwritten.length);
    this.unwritten = [];
    this.unflushed = 0;
    const safe = this.unacknowledged;
    this.unacknowledged = [];
    // In the order of arrival, as MQTT-4.6.0-2 asks.
    for (const acknowledge of safe) acknowledge();
  }

  /** Commits what waits, as far as possible, and forgets the rest: the broker still has it. */
  stop(): void {
    this.stopped = true;
    this.flush();
    if (this.timer) clearTimeout(this.timer);
    this.timer = null;
  }

  private takeIn(route: Route, delivery: Delivery): number {
    const arrival_ms = this.options.now();
    const text = delivery.payload.toString('utf8');
    const fault = (name: PayloadFault) => {
      this.options.count(name, 1);
      this.options.notice(name, `topic ${delivery.topic}: ${excerpt(text)}`);
    };
    const found = parsePayload(route, text, arrival_ms, fault);
    for (const reading of found) this.queue(route.source.unit, reading, arrival_ms);
    return found.length;
  }

  /** false where it is no message of an edge node that is configured. */
  private takeSparkplug(delivery: Delivery): boolean {
    const arrival_ms = this.options.now();
    const readings = this.options.sparkplug?.receive(delivery, arrival_ms) ?? null;
    this.queueAll(readings ?? [], arrival_ms);
    if (readings !== null) {
      this.options.count(readings.length > 0 ? 'messages_taken' : 'messages_without_readings', 1);
    }
    return readings !== null;
  }

  private queueAll(readings: readonly SparkplugReading[], arrival_ms: number): void {
    for (const reading of readings) this.queue(reading.unit, reading, arrival_ms);
  }

  private queue(unit: string, found: PayloadReading, arrival_ms: number): void {
    this.options.count('readings_found', 1);
    const { time_ms, value, quality } = found;
    const reading = { unit, channel: found.channel.id, time_ms, arrival_ms, value, quality };
    if (this.unwritten.length >= MOST_UNWRITTEN) {
      this.options.count('lost_without_journal', 1);
      return;
    }
    if (this.recent.seen(reading)) {
      this.options.count('repeated', 1);
      return;
    }
    this.unwritten.push(reading);
  }

  private failed(thrown: unknown): void {
    this.failing = true;
    this.options.count('journal_failures', 1);
    this.options.notice(
      'journal_failures',
      `${this.unwritten.length} readings wait: ${
        thrown instanceof Error ? thrown.message : String(thrown)
      }`,
    );
    this.timer = setTimeout(() => this.flush(), RETRY_MS);
  }
}

function excerpt(text: string): string {
  const line = text.replace(/\s+/g, ' ').trim();
  return line.length > EXCERPT ? `${line.slice(0, EXCERPT)}... (${text.length} characters)` : line;
}
