import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { connectAsync, type MqttClient } from 'mqtt';
import { parse, stringify } from 'yaml';
import { deliver } from '../../src/adapters/mqtt/readingPublisher.js';
import { loadSite } from '../../src/config/load.js';
import type { SiteConfig } from '../../src/config/site.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import type { Random } from './random.js';

const DEMO = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));
/** Cells of a tube: physics does not matter here, the number of scans does. */
const CELLS = 20;
/** Readings start this long ago: at their pace they stay in the past [ms]. */
const AGO_MS = 10 * 86_400_000;
/** As long as a scan may wait: the clock closes none while a broker or a daemon is away. */
const DEADLINE_S = 3600;
const CLIENT_ID = 'chaos';

export interface ChaosSite {
  readonly path: string;
  readonly site: SiteConfig;
  readonly unit: UnitDefinition;
}

/** The demonstration's site with few cells, in a folder, towards a broker and a database. */
export function writeSite(
  folder: string,
  store: string,
  brokerUrl: string,
  databaseUrl: string,
): ChaosSite {
  const path = join(folder, 'site.yaml');
  const demo = parse(readFileSync(DEMO, 'utf8')) as Record<string, object>;
  const units = (demo.units as object[]).map((unit) => ({ ...unit, estimator: { cells: CELLS } }));
  writeFileSync(
    path,
    stringify({
      ...demo,
      units,
      scan_deadline_s: DEADLINE_S,
      mqtt: { url: brokerUrl, client_id: CLIENT_ID },
      influx: { url: databaseUrl, database: 'rockhour' },
      http: { port: 0 },
      store: { folder: store, checkpoint_every_s: 1200, keep_free_MB: 0 },
    }),
  );
  const site = loadSite(path);
  return { path, site, unit: site.units[0]! };
}

/** What has been published, as far as the broker has acknowledged it. */
export class ChaosPlant {
  /** Readings that the broker has. */
  acknowledged = 0;
  /** Scans all of whose readings the broker has, by their number. */
  readonly scans = new Set<number>();
  private client: MqttClient | null = null;
  private next: number;
  private timer: NodeJS.Timeout | null = null;
  private readonly under: Promise<void>[] = [];

  constructor(
    private readonly chaos: ChaosSite,
    private readonly brokerUrl: string,
    private readonly random: Random,
  ) {
    this.next = Math.floor((Date.now() - AGO_MS) / this.period_ms);
  }

  get period_ms(): number {
    return this.chaos.unit.scan_period_s * 1000;
  }

  async start(): Promise<void> {
    this.client = await connectAsync(this.brokerUrl, {
      reconnectPeriod: 200,
      clean: false,
      clientId: 'plant',
    });
    // MQTT.js tries again by itself and sends once more what was not acknowledged.
    this.client.on('error', () => undefined);
  }

  /** Scans without end, so many a second, until `pause`. */
  load(per_s: number): void {
    this.timer ??= setInterval(() => this.scan(), 1000 / per_s);
  }

  pause(): void {
    if (this.timer) clearInterval(this.timer);
    this.timer = null;
  }

  /** Publishes so many scans, a hundred on their way at a time. */
  async publish(scans: number): Promise<void> {
    for (let i = 0; i < scans; i++) {
      const done = this.scan();
      if (i % 100 === 99) await done;
    }
    await this.settled();
  }

  /** Resolves once the broker has all that was published. */
  async settled(): Promise<void> {
    while (this.under.length > 0) await Promise.all(this.under.splice(0));
  }

  async stop(): Promise<void> {
    this.pause();
    await this.settled();
    await this.client?.endAsync(true);
    this.client = null;
  }

  private scan(): Promise<void> {
    const index = this.next++;
    const time = index * this.period_ms;
    const sent = this.chaos.site.sources.map(async ({ topic, channels, payload }) => {
      const values = channels.map((id) => this.value(id));
      const content = payload === 'array' ? { time, values } : { time, value: values[0] };
      await deliver(() => this.client, topic, JSON.stringify(content));
      this.acknowledged += channels.length;
    });
    const all = Promise.all(sent).then(() => {
      this.scans.add(index);
    });
    this.under.push(all);
    return all;
  }

  /** A standing plant: plausible, and no two readings alike. */
  private value(id: string): number {
    const { role } = this.chaos.unit.channels.find((channel) => channel.id === id)!;
    const small = this.random.next();
    switch (role.kind) {
      case 'mode':
      case 'flow':
      case 'power':
        return 0;
      case 'pressure':
        return (id.startsWith('hot') ? 7.9 : 1.04) + small * 1e-3;
      case 'pressure_drop':
        return small * 1e-3;
      default:
        return 25 + small;
    }
  }
}
