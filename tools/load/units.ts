import { rmSync } from 'node:fs';
import { join } from 'node:path';
import { connectAsync, type MqttClient } from 'mqtt';
import type { ChannelSource } from '../../src/config/site.js';
import { createDemoPlant } from '../../src/plant/demoPlant.js';
import { startMosquitto } from '../../test/support/services.js';
import { ChaosDaemon } from '../chaos/daemon.js';
import { Metrics, quantile } from './metrics.js';
import { shippedEnvironment } from './shipped.js';
import { writeLoadSite } from './site.js';

/** Between two looks at the daemon [ms]. */
const LOOK_MS = 10_000;
/** So long units that are new together have what happens once: first profiles, first rollouts [s]. */
const WARM_S = 120;
/** Values of one plant for all units, each shifted by so much [raw unit]. */
const APART = 1e-3;

export interface UnitsOptions {
  readonly mosquitto: string;
  readonly folder: string;
  readonly units: number;
  readonly scan_s: number;
  readonly minutes: number;
  /** All units speak at the same moment, instead of spread over the period. */
  readonly burst: boolean;
  readonly payload: 'value' | 'array';
  told(text: string): void;
}

export interface UnitsFigures {
  readonly scans: number;
  readonly wanted: number;
  /** Lateness of all scans, from the first of units that nobody has seen before [s]. */
  readonly all_p99_s: number;
  /** Of those after the first minutes, `WARM_S`. */
  readonly p50_s: number;
  readonly p99_s: number;
  /** Upper bound of the bucket that the 99th percentile lies in [s]. */
  readonly p99_bound_s: number;
  readonly resident_MB: number;
}

/** Units in real time: how late their scans are taken in, with the first minutes and without, and the memory. */
export async function manyUnits(options: UnitsOptions): Promise<UnitsFigures> {
  const { folder, units, scan_s, minutes, burst, told } = options;
  const broker = await startMosquitto(options.mosquitto, undefined, [], { folder });
  const { path, site } = writeLoadSite({
    ...{ folder: join(folder, 'site'), broker: broker.url, units },
    ...{ scan_period_s: scan_s, payload: options.payload },
  });
  const daemon = new ChaosDaemon(path, shippedEnvironment());
  const client = await connectAsync(broker.url);
  const period_ms = scan_s * 1000;
  const begin_ms = (Math.floor(Date.now() / period_ms) + 1) * period_ms;
  const plant = createDemoPlant(site.units[0]!, { start_ms: begin_ms, incidents: false });
  const own = site.units.map(({ id }) => site.sources.filter(({ unit }) => unit === id));
  const scans = Math.max(1, Math.round((minutes * 60) / scan_s));
  let resident_MB = 0;
  let warm: Metrics['lateness'] = new Map();
  try {
    await daemon.start();
    const from = Math.ceil(Date.now() / period_ms) * period_ms;
    let looked = Date.now();
    for (let scan = 0; scan < scans; scan++) {
      const { values } = plant.step();
      for (let u = 0; u < units; u++) {
        const at = from + scan * period_ms + (burst ? 0 : (u * period_ms) / units);
        const wait = at - Date.now();
        if (wait > 2) await new Promise((resolve) => setTimeout(resolve, wait));
        for (const source of own[u]!) say(client, source, Math.floor(at), values, u);
      }
      if (Date.now() - looked < LOOK_MS) continue;
      looked = Date.now();
      const metrics = await Metrics.of(daemon.url);
      resident_MB = Math.max(resident_MB, metrics.resident_MB);
      if (scan * scan_s <= WARM_S) warm = metrics.lateness;
      if (scan % Math.ceil(60 / scan_s) === 0) {
        const p99 = quantile(new Map(), metrics.lateness, 0.99);
        told(
          `${scan + 1} of ${scans} scans: p99 ${p99.value.toFixed(3)} s, ` +
            `${metrics.resident_MB.toFixed(0)} MB, ${metrics.backlog} wait`,
        );
      }
    }
    await settled(daemon.url, units * scans);
    const metrics = await Metrics.of(daemon.url);
    const [p50, p99] = [0.5, 0.99].map((share) => quantile(warm, metrics.lateness, share));
    const all = quantile(new Map(), metrics.lateness, 0.99);
    return {
      ...{ scans: metrics.counter('scans'), wanted: units * scans },
      all_p99_s: all.value,
      ...{ p50_s: p50!.value, p99_s: p99!.value, p99_bound_s: p99!.bound },
      resident_MB: Math.max(resident_MB, metrics.resident_MB),
    };
  } finally {
    await client.endAsync(true);
    await daemon.end('SIGTERM');
    await broker.stop();
    rmSync(folder, { recursive: true, force: true });
  }
}

async function settled(url: string, scans: number): Promise<void> {
  for (let n = 0; n < 120; n++) {
    const metrics = await Metrics.of(url);
    if (metrics.counter('scans') >= scans && metrics.backlog === 0) return;
    await new Promise((resolve) => setTimeout(resolve, 500));
  }
}

export function say(
  client: MqttClient,
  { topic, channels, payload }: ChannelSource,
  time: number,
  values: Readonly<Record<string, number | string | null>>,
  unit: number,
): Promise<unknown> {
  const read = channels.map((id) => {
    const value = values[id] ?? null;
    // A mode is a word told as a number: shifted it would be none.
    const isMeasured = typeof value === 'number' && value !== 0 && id !== 'mode';
    return isMeasured ? value + unit * APART : value;
  });
  if (payload === 'value' && values[channels[0]!] === undefined) return Promise.resolve();
  const content = payload === 'array' ? { time, values: read } : { time, value: read[0] };
  return client.publishAsync(topic, JSON.stringify(content), { qos: 1 });
}
