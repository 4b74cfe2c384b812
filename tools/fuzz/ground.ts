import { mkdirSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import { connectAsync, type MqttClient } from 'mqtt';
import { READING_FATES } from '../../src/core/scan/assemble.js';
import { startMosquitto } from '../../test/support/services.js';
import { ChaosDaemon } from '../chaos/daemon.js';
import { Metrics } from '../load/metrics.js';
import { shippedEnvironment } from '../load/shipped.js';
import { type LoadSite, writeLoadSite } from '../load/site.js';
import { type FuzzTopics, fuzzMessage } from './messages.js';
import { fuzzRequest, notDocumented, send } from './requests.js';
import { Rolls } from './rolls.js';

/** Messages on their way to the broker, and in the broker for the daemon: none may be dropped there. */
const WINDOW = 200;
const MOST_QUEUED = 10_000;
const LOOK_EVERY = 2000;
const ASKED_AT_ONCE = 8;
const STRANGE = ['fuzz', 'fuzz/plant/u001', 'fuzz/$SYS'];

/** Counts of what a message without a reading was. */
const REFUSED = [
  'messages_without_readings',
  'unknown_topic',
  'malformed',
  'wrong_length',
] as const;
/** What became of a reading of a message; `repeated` counts copies as they come and in their scans. */
const FATES = [...READING_FATES, 'unconfigured', 'lost_without_journal'];

/** Broker and daemon to be fuzzed. */
export class FuzzGround {
  private sent = 0;
  private readonly topics: FuzzTopics;

  private constructor(
    private readonly load: LoadSite,
    private readonly daemon: ChaosDaemon,
    private readonly client: MqttClient,
    private readonly stopBroker: () => Promise<void>,
    private readonly folder: string,
  ) {
    const { sources } = load.site;
    this.topics = {
      value: sources.filter(({ payload }) => payload === 'value').map(({ topic }) => topic),
      array: sources
        .filter(({ payload }) => payload === 'array')
        .map(({ topic, channels }) => ({ topic, length: channels.length })),
      strange: STRANGE,
    };
  }

  static async start(mosquitto: string, folder: string): Promise<FuzzGround> {
    rmSync(folder, { recursive: true, force: true });
    mkdirSync(join(folder, 'broker'), { recursive: true });
    const broker = await startMosquitto(mosquitto, undefined, [], {
      folder: join(folder, 'broker'),
    });
    const load = writeLoadSite({
      ...{ folder: join(folder, 'site'), broker: broker.url, units: 1 },
      ...{ scan_period_s: 30, payload: 'array' },
    });
    // A session of the daemon's name that wants more than the daemon will: all of it is delivered.
    const before = await connectAsync(broker.url, {
      ...{ clientId: load.site.mqtt.client_id, clean: false, protocolVersion: 5 },
      properties: { sessionExpiryInterval: 86_400 },
    });
    await before.subscribeAsync(['fuzz/#', 'spBv1.0/#'], { qos: 1 });
    await before.endAsync();
    const daemon = new ChaosDaemon(load.path, shippedEnvironment());
    await daemon.start();
    const client = await connectAsync(broker.url);
    return new FuzzGround(load, daemon, client, () => broker.stop(), folder);
  }

  async stop(): Promise<void> {
    await this.client.endAsync(true);
    await this.daemon.end('SIGTERM');
    await this.stopBroker();
    rmSync(this.folder, { recursive: true, force: true });
  }

  metrics(): Promise<Metrics> {
    return Metrics.of(this.daemon.url);
  }

  /** Sends messages and waits until they are worked off; what does not add up, in words. */
  async messages(seed: number, count: number): Promise<string[]> {
    const rolls = new Rolls(seed);
    let under: Promise<unknown>[] = [];
    for (let n = 1; n <= count; n++) {
      const { topic, payload } = fuzzMessage(rolls, this.topics, Date.now());
      under.push(this.client.publishAsync(topic, payload, { qos: 1 }));
      this.sent++;
      if (under.length < WINDOW && n < count) continue;
      await Promise.all(under);
      under = [];
      if (n % LOOK_EVERY < WINDOW) await this.delivered(MOST_QUEUED);
    }
    await this.delivered(0);
    // The last group is committed a moment after it was counted.
    for (let n = 0; n < 100; n++) {
      if ((await this.sums()).length === 0) return [];
      await new Promise((resolve) => setTimeout(resolve, 50));
    }
    return this.sums();
  }

  /** Asks over HTTP; what was answered otherwise than documented, in words. */
  async requests(seed: number, count: number): Promise<string[]> {
    const rolls = new Rolls(seed);
    const faults: string[] = [];
    const port = Number(new URL(this.daemon.url).port);
    let left = count;
    const ask = async () => {
      while (left > 0) {
        left--;
        const request = fuzzRequest(rolls, this.load.site.units[0]!.id);
        const from = `127.${1 + rolls.below(200)}.${rolls.below(250)}.${1 + rolls.below(250)}`;
        const line = request.toString('latin1').slice(0, 200);
        try {
          const why = notDocumented(await send(port, request, from), line.startsWith('HEAD '));
          if (why !== null) faults.push(`${JSON.stringify(line)}: ${why}`);
        } catch (thrown) {
          faults.push(`${JSON.stringify(line)}: ${String(thrown)}`);
        }
      }
    };
    await Promise.all(Array.from({ length: ASKED_AT_ONCE }, ask));
    return faults;
  }

  private async delivered(queued: number): Promise<void> {
    for (let still = 0, last = -1; ; ) {
      const metrics = await this.metrics();
      const came = metrics.counter('messages');
      const isDone = queued > 0 || metrics.backlog === 0;
      if (came >= this.sent - queued && isDone) return;
      still = came === last ? still + 1 : 0;
      last = came;
      if (still > 600) throw new Error(`${this.sent} messages sent, ${came} came and no more`);
      await new Promise((resolve) => setTimeout(resolve, 50));
    }
  }

  private async sums(): Promise<string[]> {
    const metrics = await this.metrics();
    const of = (names: readonly string[]) =>
      names.reduce((sum, name) => sum + metrics.counter(name), 0);
    const equal = (what: string, a: number, b: number) =>
      a === b ? [] : [`${what}: ${a} and ${b}`];
    return [
      ...equal('messages sent and counted', this.sent, of(['messages'])),
      ...equal(
        'messages, and taken or refused',
        of(['messages']),
        of(['messages_taken', ...REFUSED]),
      ),
      ...equal('readings found, and what became of them', of(['readings_found']), of(FATES)),
    ];
  }
}
