import { rmSync } from 'node:fs';
import { join } from 'node:path';
import { connectAsync } from 'mqtt';
import { createDemoPlant } from '../../src/plant/demoPlant.js';
import { startMosquitto } from '../../test/support/services.js';
import { ChaosDaemon } from '../chaos/daemon.js';
import { slope } from '../page/slope.js';
import { Metrics } from './metrics.js';
import { shippedEnvironment } from './shipped.js';
import { writeLoadSite } from './site.js';
import { say } from './units.js';

const SCAN_S = 30;
const SCANS_PER_DAY = 86_400 / SCAN_S;
/** Scans on their way before the daemon is waited for. */
const AHEAD = 60;
const LOOKS_PER_DAY = 24;

export interface WeekOptions {
  readonly mosquitto: string;
  readonly folder: string;
  readonly days: number;
  told(text: string): void;
}

export interface WeekFigures {
  readonly resident_MB: number;
  /** Of resident memory over plant time after the first day [MB/day], with its standard error. */
  readonly slope: number;
  readonly se: number;
  readonly heap: { readonly slope: number; readonly se: number };
}

/**
 * One unit over simulated days, as fast as the daemon takes them in: readings of the past, which lie
 * behind one another as they would live.
 */
export async function week(options: WeekOptions): Promise<WeekFigures> {
  const { folder, days, told } = options;
  const broker = await startMosquitto(options.mosquitto, undefined, [], { folder });
  const { path, site } = writeLoadSite({
    ...{ folder: join(folder, 'site'), broker: broker.url, units: 1 },
    ...{ scan_period_s: SCAN_S, payload: 'array' },
  });
  const daemon = new ChaosDaemon(path, shippedEnvironment());
  const client = await connectAsync(broker.url);
  const start_ms = Date.now() - (days + 1) * 86_400_000;
  const plant = createDemoPlant(site.units[0]!, { start_ms, incidents: false });
  const at: number[] = [];
  const resident: number[] = [];
  const heap: number[] = [];
  try {
    await daemon.start();
    const scans = Math.round(days * SCANS_PER_DAY);
    for (let n = 1; n <= scans; n++) {
      const { time_ms, values } = plant.step();
      const sent = site.sources.map((source) => say(client, source, time_ms, values, 0));
      if (n % AHEAD > 0 && n < scans) continue;
      await Promise.all(sent);
      const metrics = await caughtUp(daemon.url, n);
      if (n % (SCANS_PER_DAY / LOOKS_PER_DAY) !== 0) continue;
      at.push(n / SCANS_PER_DAY);
      resident.push(metrics.resident_MB);
      heap.push(metrics.heap_MB);
      if (n % SCANS_PER_DAY === 0) {
        const day = `day ${n / SCANS_PER_DAY} of ${days}`;
        told(`${day}: ${metrics.resident_MB.toFixed(1)} MB, heap ${metrics.heap_MB.toFixed(1)} MB`);
      }
    }
    const from = at.findIndex((day) => day > Math.min(1, days / 2));
    const of = (values: readonly number[]) => slope(at.slice(from), values.slice(from));
    return { resident_MB: Math.max(...resident), ...of(resident), heap: of(heap) };
  } finally {
    await client.endAsync(true);
    await daemon.end('SIGTERM');
    await broker.stop();
    rmSync(folder, { recursive: true, force: true });
  }
}

/** Scans that end behind a newer reading are closed with it: the last may still be open. */
async function caughtUp(url: string, scans: number): Promise<Metrics> {
  for (;;) {
    const metrics = await Metrics.of(url);
    if (metrics.counter('scans') >= scans - 1 && metrics.backlog === 0) return metrics;
    await new Promise((resolve) => setTimeout(resolve, 50));
  }
}
