import { mkdtempSync, rmSync } from 'node:fs';
import { createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { ReadingPublisher } from '../adapters/mqtt/readingPublisher.js';
import type { SiteConfig } from '../config/site.js';
import type { UnitDefinition } from '../core/definitions.js';
import { createDaemon, type Daemon, type DaemonPlaces } from '../daemon.js';
import type { Log } from '../log.js';
import { createDemoPlant, type DemoStep, type DemoTruth } from '../plant/demoPlant.js';
import { PacedClock } from './clock.js';
import { realCore } from './core.js';
import { DemoScore, type Score } from './demoScore.js';

export interface DemoOptions {
  readonly log: Log;
  readonly version: string;
  readonly configPath: string;
  /** How much faster than real the plant runs. */
  readonly speed: number;
  readonly seed: number;
  /** false: nothing goes wrong in the plant. */
  readonly incidents: boolean;
}

export interface RunningDemo {
  readonly places: DaemonPlaces;
  readonly daemon: Daemon;
  stop(): Promise<void>;
}

export interface DemoCheck {
  readonly unit: string;
  readonly hours: number;
  readonly scans: number;
  readonly seconds: number;
  readonly scores: readonly Score[];
  readonly firmShare: number | null;
  readonly raised: readonly string[];
  readonly incidents: readonly string[];
}

/** Scans published before the daemon is waited for, in the check. */
const AHEAD_SCANS = 20;

interface Places {
  /** null: that of the configuration, or any free one where another program has it. */
  readonly http_port: number | null;
  readonly mqtt_port: number | null;
  /** Whether the folder with the database files outlives the demonstration. */
  readonly keep: boolean;
}

/** The site of a demonstration: its own broker and a folder of its own. */
export async function demoSite(
  site: SiteConfig,
  places: Places,
): Promise<{ site: SiteConfig; remove(): void }> {
  const folder = mkdtempSync(join(tmpdir(), 'rockhour-demo-'));
  const { mqtt, http, store } = site;
  const mqtt_port = places.mqtt_port ?? (await usable(mqtt.embedded_host, mqtt.embedded_port));
  const http_port = places.http_port ?? (await usable(http.host, http.port));
  return {
    site: {
      ...site,
      mqtt: { ...mqtt, url: null, embedded_port: mqtt_port },
      http: { ...http, port: http_port },
      store: { ...store, folder },
    },
    remove() {
      if (!places.keep) rmSync(folder, { recursive: true, force: true });
    },
  };
}

/** The port where it can be had, else 0: any free one. */
function usable(host: string, port: number): Promise<number> {
  return new Promise((resolve) => {
    const server = createServer();
    server.once('error', () => resolve(0));
    server.listen(port, host, () => server.close(() => resolve(port)));
  });
}

function plants(site: SiteConfig, start_ms: number, options: DemoOptions) {
  return site.units.map((unit, i) => ({
    unit,
    plant: createDemoPlant(unit, {
      seed: options.seed + i,
      start_ms,
      incidents: options.incidents,
    }),
  }));
}

/**
 * Publishes one step: the readings, and the truth to `demo/truth/UNIT`, where a curious person may
 * compare. Resolves when the broker has both.
 */
async function publishStep(
  publisher: ReadingPublisher,
  unit: UnitDefinition,
  step: DemoStep,
  { power_W, ...truth }: DemoTruth,
): Promise<void> {
  const time = new Date(step.time_ms).toISOString();
  const power_MW_el = power_W / 1e6;
  await Promise.all([
    publisher.readings(unit.id, step.time_ms, step.values),
    publisher.say(`demo/truth/${unit.id}`, { ...truth, time, power_MW_el }),
  ]);
}

/** Resolves when the daemon has worked off all that was published: the broker may still have some. */
async function takenIn(daemon: Daemon, publisher: ReadingPublisher): Promise<void> {
  while (daemon.service.counters().messages! < publisher.count) {
    await new Promise((resolve) => setTimeout(resolve, 5));
  }
  await daemon.caughtUp();
}

/** Starts broker, daemon, page and simulated plant; the plant runs until `stop`. */
export async function runDemo(site: SiteConfig, options: DemoOptions): Promise<RunningDemo> {
  const period_s = Math.min(...site.units.map((unit) => unit.scan_period_s));
  const start_ms = Math.floor(Date.now() / 1000 / period_s) * period_s * 1000;
  const clock = new PacedClock(start_ms, period_s * 1000, options.speed);
  const { log, version, configPath } = options;
  const daemon = createDaemon(site, { log, version, configPath, clock });
  const places = await daemon.start();
  const publisher = new ReadingPublisher(places.broker, site.sources);
  await publisher.start();
  const running = plants(site, start_ms, options);
  let isStopped = false;
  let timer: NodeJS.Timeout | undefined;
  let round = Promise.resolve();

  async function tick(): Promise<void> {
    const next_ms = Math.min(...running.map(({ plant }) => plant.time_ms)) + period_s * 1000;
    clock.step(next_ms);
    const due = running.filter(({ unit, plant }) => {
      return plant.time_ms + unit.scan_period_s * 1000 <= next_ms;
    });
    await Promise.all(
      due.map(({ unit, plant }) => publishStep(publisher, unit, plant.step(), plant.truth())),
    );
    await daemon.caughtUp();
  }

  function schedule(): void {
    if (isStopped) return;
    timer = setTimeout(() => {
      round = tick().then(schedule, (thrown: unknown) => {
        if (isStopped) return;
        log.error({ err: thrown }, 'the simulated plant stopped');
      });
    }, clock.wait_ms);
  }

  schedule();
  return {
    places,
    daemon,
    async stop() {
      isStopped = true;
      clearTimeout(timer);
      const inTime = new Promise((resolve) => setTimeout(resolve, 500).unref());
      await Promise.race([round, inTime]);
      await publisher.stop();
      await daemon.stop();
    },
  };
}

/** Runs plant and daemon for so many simulated hours, as fast as they go, and scores the estimates. */
export async function runDemoCheck(
  site: SiteConfig,
  options: Omit<DemoOptions, 'speed'>,
  hours: number,
  progress: (done: number) => void,
): Promise<DemoCheck[]> {
  const start_ms = Date.UTC(2026, 0, 1);
  const period_ms = 1000 * Math.min(...site.units.map((unit) => unit.scan_period_s));
  const clock = new PacedClock(start_ms, period_ms, 0);
  const { log, version, configPath } = options;
  const daemon = createDaemon(site, { log, version, configPath, clock, http: false });
  const started = performance.now();
  const running = plants(site, start_ms, { ...options, speed: 0 }).map(({ unit, plant }) => {
    let last: number | null = null;
    const isDue = (time_ms: number) => {
      const due = realCore.hoursDue(unit, last, time_ms);
      last = time_ms;
      return due;
    };
    return {
      unit,
      plant,
      score: new DemoScore(plant, unit.hours_at_W, isDue),
      raised: [] as string[],
    };
  });
  const byUnit = new Map(running.map((one) => [one.unit.id, one]));
  daemon.service.subscribe((message) => {
    const one = byUnit.get(message.unit);
    if (message.kind === 'state') {
      const estimate = daemon.service.now(message.unit)?.estimate;
      if (estimate) one?.score.take(estimate);
    } else if (message.kind === 'event' && message.event.transition === 'raised')
      one?.raised.push(message.event.id);
  });
  const { broker } = await daemon.start();
  const publisher = new ReadingPublisher(broker, site.sources);
  try {
    await publisher.start();
    const end_ms = start_ms + hours * 3_600_000;
    let sent: Promise<void>[] = [];
    for (let scans = 1; running.some(({ plant }) => plant.time_ms < end_ms); scans++) {
      for (const { unit, plant, score } of running) {
        clock.step(plant.time_ms + unit.scan_period_s * 1000);
        const step = plant.step();
        score.note();
        sent.push(publishStep(publisher, unit, step, plant.truth()));
      }
      if (scans % AHEAD_SCANS > 0) continue;
      await Promise.all(sent);
      sent = [];
      await takenIn(daemon, publisher);
      progress((running[0]!.plant.time_ms - start_ms) / 3_600_000);
    }
    await Promise.all(sent);
    await takenIn(daemon, publisher);
  } finally {
    await publisher.stop();
    await daemon.stop();
  }
  const seconds = (performance.now() - started) / 1000;
  return running.map(({ unit, plant, score, raised }) => ({
    unit: unit.id,
    hours,
    scans: daemon.service.counters().scans!,
    seconds,
    scores: score.scores,
    firmShare: score.firmShare,
    raised,
    incidents: plant.truth().incidents,
  }));
}
