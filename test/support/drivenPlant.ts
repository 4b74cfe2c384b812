import { readFileSync } from 'node:fs';
import { parse } from 'yaml';
import { ReadingPublisher } from '../../src/adapters/mqtt/readingPublisher.js';
import { loadSite } from '../../src/config/load.js';
import type { SiteConfig } from '../../src/config/site.js';
import { PacedClock } from '../../src/daemon/clock.js';
import { createDaemon, type Daemon } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { createDemoPlant, type DemoStep } from '../../src/plant/demoPlant.js';
import { siteFile } from '../daemon/siteFile.js';

const DEMO = new URL('../../config/demo.yaml', import.meta.url);
/** Scans handed over before the daemon is waited for. */
const AHEAD_SCANS = 20;
/** What the daemon's clock takes for the speed of the plant. */
const SPEED = 300;

type Values = DemoStep['values'];

export interface DrivenPlantOptions {
  /** Address of a broker; null is the daemon's own. */
  readonly broker?: string | null;
  /** Names of the units; one like that of config/demo.yaml for each. */
  readonly units?: readonly string[];
  /** Of the estimator; fewer are quicker. */
  readonly cells?: number;
  /** Powers [MW] that hours are told at; those of config/demo.yaml unless told. */
  readonly hours_at_MW_el?: readonly number[];
  /** Plant time that goes by before now [h]: the plant begins so much earlier. */
  readonly hours: number;
  readonly seed?: number;
  /** Whether what goes wrong in the demonstration goes wrong here. */
  readonly incidents?: boolean;
}

/**
 * The daemon with page, API and broker and the simulated plant of the demonstration, whose time the
 * caller drives: hours as fast as the daemon takes them in, silence, and live at a speed.
 */
export class DrivenPlant {
  /** What becomes of the readings on their way to the broker. */
  spoil: (unit: string, values: Values) => Values = (_, values) => values;
  private timer: NodeJS.Timeout | undefined;
  private round: Promise<void> = Promise.resolve();

  private constructor(
    readonly site: SiteConfig,
    readonly configPath: string,
    readonly daemon: Daemon,
    readonly url: string,
    readonly broker: string,
    private readonly clock: PacedClock,
    private readonly publisher: ReadingPublisher,
    private readonly plants: readonly {
      readonly unit: string;
      readonly plant: ReturnType<typeof createDemoPlant>;
    }[],
  ) {}

  static async start(options: DrivenPlantOptions): Promise<DrivenPlant> {
    const demo = parse(readFileSync(DEMO, 'utf8')) as { units: { id: string }[] };
    const [first] = demo.units;
    const { cells, hours_at_MW_el } = options;
    const own = {
      ...(cells === undefined ? {} : { estimator: { cells } }),
      ...(hours_at_MW_el === undefined ? {} : { hours_at_MW_el }),
    };
    const units = (options.units ?? [undefined]).map((name, i) => {
      const id = i === 0 ? {} : { id: `${first!.id}${i + 1}` };
      return { ...first, ...id, ...(name === undefined ? {} : { name }), ...own };
    });
    const broker = options.broker ?? null;
    const mqtt = broker === null ? { embedded_port: 0 } : { url: broker, client_id: 'driven' };
    const { path } = siteFile({ units, mqtt: { ...mqtt, in_prefix: 'plant' } });
    const site = loadSite(path);
    const period_ms = site.units[0]!.scan_period_s * 1000;
    const now_ms = Math.floor(Date.now() / period_ms) * period_ms;
    const start_ms = now_ms - Math.round((options.hours * 3.6e6) / period_ms) * period_ms;
    const clock = new PacedClock(start_ms, period_ms, SPEED);
    const log = createLog({ level: 'silent' });
    const daemon = createDaemon(site, { log, version: '0.1.0', configPath: path, clock });
    const places = await daemon.start();
    const publisher = new ReadingPublisher(places.broker, site.sources);
    await publisher.start();
    const { seed = 1, incidents = true } = options;
    const plants = site.units.map((unit, i) => ({
      unit: unit.id,
      plant: createDemoPlant(unit, { seed: seed + i, start_ms, incidents }),
    }));
    return new DrivenPlant(
      ...([site, path, daemon, places.url!, places.broker, clock, publisher, plants] as const),
    );
  }

  /** Plant time [ms since 1970]. */
  get time_ms(): number {
    return this.plants[0]!.plant.time_ms;
  }

  /** What is true in a unit, as no instrument knows it. */
  truth(unit = this.plants[0]!.unit) {
    return this.plants.find((one) => one.unit === unit)!.plant.truth();
  }

  /** One step of each plant; resolves when the broker has its readings. */
  private async step(isSilent = false): Promise<void> {
    this.clock.step(this.time_ms + this.site.units[0]!.scan_period_s * 1000);
    const sent = this.plants.map(({ unit, plant }) => {
      const { time_ms, values } = plant.step();
      return isSilent
        ? undefined
        : this.publisher.readings(unit, time_ms, this.spoil(unit, values));
    });
    await Promise.all(sent);
  }

  /** Lets the plant run for so long and the daemon take all in, as fast as both go. */
  async run(hours: number, progress: (done: number) => void = () => undefined): Promise<void> {
    const scans = Math.round((hours * 3600) / this.site.units[0]!.scan_period_s);
    let sent: Promise<void>[] = [];
    for (let n = 1; n <= scans; n++) {
      sent.push(this.step());
      if (n % AHEAD_SCANS > 0 && n < scans) continue;
      await Promise.all(sent);
      sent = [];
      while (this.daemon.service.counters().messages! < this.publisher.count) {
        await new Promise((resolve) => setTimeout(resolve, 2));
      }
      await this.daemon.caughtUp();
      progress((n * hours) / scans);
    }
  }

  /** The plant goes on and nothing is heard of it. */
  async silence(hours: number): Promise<void> {
    const scans = Math.round((hours * 3600) / this.site.units[0]!.scan_period_s);
    for (let n = 0; n < scans; n++) await this.step(true);
  }

  /** From now on the plant runs by itself, so much faster than real. */
  live(speed: number): void {
    const period_ms = (this.site.units[0]!.scan_period_s * 1000) / speed;
    const next = () => {
      this.round = this.step()
        .then(() => this.daemon.caughtUp())
        .then(() => {
          if (this.timer !== undefined) this.timer = setTimeout(next, period_ms);
        });
    };
    this.timer = setTimeout(next, period_ms);
  }

  async pause(): Promise<void> {
    clearTimeout(this.timer);
    this.timer = undefined;
    await this.round;
  }

  async stop(): Promise<void> {
    await this.pause();
    await this.publisher.stop();
    await this.daemon.stop();
  }
}
