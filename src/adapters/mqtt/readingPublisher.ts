import { connectAsync, type MqttClient } from 'mqtt';
import type { ChannelSource } from '../../config/site.js';
import { RockhourError, reasonOf, withoutCredentials } from '../../errors.js';

/** After a message that failed [ms]. */
const RETRY_MS = 200;

/** Channel id -> raw value; absent = silent, null = no value. */
export type RawValues = Readonly<Record<string, number | string | null>>;

/**
 * Publishes readings as a gateway at a plant would: QoS 1, JSON with source time and quality, by
 * the sources of a site. For the demonstration, and for playing a recording to a broker.
 */
export class ReadingPublisher {
  private client: MqttClient | null = null;
  private messages = 0;

  constructor(
    private readonly url: string,
    private readonly sources: readonly ChannelSource[],
  ) {}

  /** Messages with readings handed over so far. */
  get count(): number {
    return this.messages;
  }

  /** @throws RockhourError BROKER_UNREACHABLE */
  async start(): Promise<void> {
    if (this.client) return;
    try {
      this.client = await connectAsync(this.url, { reconnectPeriod: 1000, connectTimeout: 5000 });
    } catch (thrown) {
      const url = withoutCredentials(this.url);
      throw new RockhourError('BROKER_UNREACHABLE', `connecting to ${url}: ${reasonOf(thrown)}`, {
        cause: thrown,
      });
    }
    // Without a listener an error would end the process; MQTT.js tries again by itself.
    this.client.on('error', () => undefined);
  }

  async stop(): Promise<void> {
    await this.client?.endAsync(true);
    this.client = null;
  }

  /** Publishes what a unit's instruments read at one time; resolves when the broker has it all. */
  async readings(unit: string, time_ms: number, values: RawValues): Promise<void> {
    const speaking = this.sources.filter(
      (source) => source.unit === unit && source.channels.some((id) => values[id] !== undefined),
    );
    this.messages += speaking.length;
    await Promise.all(
      speaking.map((source) => this.say(source.topic, payloadOf(source, time_ms, values), false)),
    );
  }

  /** Publishes a retained message of any content. */
  async say(topic: string, content: object, retain = true): Promise<void> {
    await deliver(() => this.client, topic, JSON.stringify(content), retain);
  }
}

/**
 * Publishes at QoS 1 until the broker has it, or there is no client any more. MQTT.js sends again by itself
 * what was not acknowledged, but a connection that closes while it does so fails a message that it never
 * stored: that is sent anew, and may come twice.
 */
export async function deliver(
  client: () => MqttClient | null,
  topic: string,
  payload: string,
  retain = false,
): Promise<void> {
  for (let one = client(); one !== null; one = client()) {
    try {
      await one.publishAsync(topic, payload, { qos: 1, retain });
      return;
    } catch {
      await new Promise((resolve) => setTimeout(resolve, RETRY_MS));
    }
  }
}

function payloadOf(source: ChannelSource, time_ms: number, values: RawValues): object {
  const time = new Date(time_ms).toISOString();
  const read = source.channels.map((id) => values[id] ?? null);
  return source.payload === 'array'
    ? { time, values: read, quality: read.map((value) => (value === null ? 'bad' : 'good')) }
    : { time, value: read[0], quality: read[0] === null ? 'bad' : 'good' };
}
