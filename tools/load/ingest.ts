import { spawn } from 'node:child_process';
import { rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { connectAsync } from 'mqtt';
import { Journal } from '../../src/adapters/history/journal.js';
import { type Service, startMosquitto } from '../../test/support/services.js';
import { ChaosDaemon } from '../chaos/daemon.js';
import { Metrics } from './metrics.js';
import { shippedEnvironment } from './shipped.js';
import { type LoadSite, writeLoadSite } from './site.js';

const BARE = fileURLToPath(new URL('./bare.mjs', import.meta.url));
/** Publishes on their way at a time. */
const WINDOW = 500;

export interface IngestOptions {
  readonly mosquitto: string;
  readonly folder: string;
  readonly messages: number;
  readonly rounds: number;
  /** Spacing of source times [s]; a scan is 30 s. */
  readonly every_s: number;
  readonly protocol: 4 | 5;
}

export interface IngestRound {
  /** Messages a second. */
  readonly bare: number;
  readonly daemon: number;
}

/**
 * The same messages from two kept sessions of one broker: what a bare MQTT.js subscriber takes in a
 * second, and what the daemon does, from the first that came to the last that is in its journal.
 * One after the other, each alone with the broker, the order changing from round to round.
 */
export async function ingest(options: IngestOptions): Promise<IngestRound[]> {
  const { folder, messages, rounds, protocol } = options;
  const measureBare = (wanted: number) => bare(broker, topics, wanted, protocol);
  const broker = await startMosquitto(options.mosquitto, undefined, [], { folder });
  const load = writeLoadSite({
    ...{ folder: join(folder, 'site'), broker: broker.url, units: 1 },
    ...{ scan_period_s: 30, payload: 'value', protocol },
  });
  const topics = join(folder, 'topics.json');
  writeFileSync(topics, JSON.stringify(load.site.sources.map(({ topic }) => topic)));
  const daemon = new ChaosDaemon(load.path, shippedEnvironment());
  const found: IngestRound[] = [];
  try {
    // Both leave a session behind.
    await measureBare(0);
    await daemon.start();
    await daemon.end('SIGTERM');
    for (let round = 0; round < rounds; round++) {
      await publishAll(broker, load, options, round);
      const first = round % 2 === 0 ? await measureBare(messages) : 0;
      const own = await drained(daemon, load, messages);
      found.push({ bare: first || (await measureBare(messages)), daemon: own });
    }
  } finally {
    await daemon.end('SIGKILL');
    await broker.stop();
    rmSync(folder, { recursive: true, force: true });
  }
  return found;
}

async function publishAll(
  broker: Service,
  { site }: LoadSite,
  { messages, every_s }: IngestOptions,
  round: number,
): Promise<void> {
  const client = await connectAsync(broker.url);
  const { sources } = site;
  const steps = Math.ceil(messages / sources.length);
  // In the past at any rate, and each round later than the one before.
  const begin_ms = Date.now() - 20 * 86_400_000 + round * (steps + 60) * every_s * 1000;
  let under: Promise<unknown>[] = [];
  for (let n = 0; n < messages; n++) {
    const { topic, channels } = sources[n % sources.length]!;
    const time = begin_ms + Math.floor(n / sources.length) * every_s * 1000;
    const [id] = channels;
    const still = /^(flow|mode|power)$/.test(id!) ? 0 : /drop|pressure/.test(id!) ? 1.04 : 25;
    const value = id === 'mode' ? 'stand' : still + (n % 97) * 1e-4;
    const payload = JSON.stringify({ time, value, quality: 'good' });
    under.push(client.publishAsync(topic, payload, { qos: 1 }));
    if (under.length >= WINDOW) {
      await Promise.all(under);
      under = [];
    }
  }
  await Promise.all(under);
  await client.endAsync();
}

function bare(broker: Service, topics: string, wanted: number, protocol: 4 | 5): Promise<number> {
  const child = spawn(
    process.execPath,
    [BARE, broker.url, topics, String(wanted), String(protocol)],
    {
      stdio: ['ignore', 'pipe', 'inherit'],
    },
  );
  let said = '';
  child.stdout.on('data', (chunk: Buffer) => {
    said += chunk.toString();
  });
  return new Promise((resolve, reject) => {
    child.once('close', (code) => {
      if (code !== 0) return reject(new Error(`the bare subscriber ended with ${code}`));
      if (wanted === 0) return resolve(0);
      const { count, ms } = JSON.parse(said) as { count: number; ms: number };
      resolve((count / ms) * 1000);
    });
  });
}

/** Messages a second from the first in the journal to the last, all of them being there. */
async function drained(daemon: ChaosDaemon, { site }: LoadSite, messages: number): Promise<number> {
  const before = journalOf(site.store.folder, 0).last;
  await daemon.start();
  for (;;) {
    const metrics = await Metrics.of(daemon.url);
    if (metrics.counter('messages') >= messages && metrics.backlog === 0) break;
    await new Promise((resolve) => setTimeout(resolve, 1000));
  }
  await daemon.end('SIGTERM');
  const { readings, span_ms } = journalOf(site.store.folder, before);
  if (readings !== messages) throw new Error(`${messages} sent, ${readings} in the journal`);
  return (messages / span_ms) * 1000;
}

function journalOf(folder: string, after: number) {
  const journal = new Journal(join(folder, 'journal.sqlite'));
  journal.start();
  const last = journal.lastSeq;
  let readings = 0;
  let first_ms = Infinity;
  let newest_ms = 0;
  for (let seq = after; after > 0 || last > 0; ) {
    const page = journal.read(seq, 10_000);
    if (page.length === 0) break;
    seq = page.at(-1)!.seq;
    for (const entry of page) {
      if (entry.kind === 'close') continue;
      readings++;
      first_ms = Math.min(first_ms, entry.arrival_ms);
      newest_ms = Math.max(newest_ms, entry.arrival_ms);
    }
  }
  journal.stop();
  return { last, readings, span_ms: newest_ms - first_ms };
}
