import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { FolderLock } from './adapters/history/folderLock.js';
import { History } from './adapters/history/history.js';
import { InfluxForwarder } from './adapters/history/influxForwarder.js';
import { Journal } from './adapters/history/journal.js';
import { createHttpServer, type HttpServer } from './adapters/http/server.js';
import type { PlantService } from './adapters/http/service.js';
import { Announcer } from './adapters/mqtt/announcer.js';
import { EmbeddedBroker } from './adapters/mqtt/broker.js';
import { Intake } from './adapters/mqtt/intake.js';
import { MqttLink } from './adapters/mqtt/link.js';
import type { SiteConfig } from './config/site.js';
import type { WatchEvent } from './core/watch/event.js';
import { type DaemonClock, SteadyClock, wallClock } from './daemon/clock.js';
import { type Core, realCore } from './daemon/core.js';
import { Counters } from './daemon/counters.js';
import { DatabaseWatch } from './daemon/databaseWatch.js';
import { brokerHealth, databaseHealth, storeHealth, unitHealth } from './daemon/health.js';
import { Notices } from './daemon/notices.js';
import { Pipeline } from './daemon/pipeline.js';
import { DaemonService } from './daemon/plantService.js';
import { Questions } from './daemon/questions.js';
import { type RunnerStep, UnitRunner } from './daemon/unitRunner.js';
import { withoutCredentials } from './errors.js';
import type { Log } from './log.js';

export type { PlantService } from './adapters/http/service.js';
export { type DaemonClock, fastClock, wallClock } from './daemon/clock.js';
export { type Core, realCore } from './daemon/core.js';
export {
  type DemoCheck,
  type DemoOptions,
  demoSite,
  runDemo,
  runDemoCheck,
} from './daemon/demo.js';

export interface DaemonOptions {
  readonly log: Log;
  readonly version: string;
  /** File that `site` was read from: the worker reads it as well. null: no worker. */
  readonly configPath: string | null;
  readonly core?: Core;
  readonly clock?: DaemonClock;
  /** false: no page and no API. */
  readonly http?: boolean;
}

/** Where a started daemon can be found. */
export interface DaemonPlaces {
  /** Page and API; null without. */
  readonly url: string | null;
  readonly broker: string;
  readonly folder: string;
}

export interface Daemon {
  readonly service: PlantService;
  start(): Promise<DaemonPlaces>;
  /** Ends in reverse order; may be called twice, also while it starts. */
  stop(): Promise<void>;
  /** Resolves when every reading that has come in is in the journal and in the estimates. */
  caughtUp(): Promise<void>;
}

const CLOCK_TOLERANCE_S = 300;
/** A longer gap is handed to the core in one, which bridges it itself. */
const LONGEST_GAP_SCANS = 2000;
const RETENTION_EVERY_MS = 3_600_000;
const DATABASE_LOOK_EVERY_MS = 1000;
/** Readings at the end of the journal that the broker may send again. */
const REMEMBER_READINGS = 20_000;
const DAY_MS = 86_400_000;

/** Builds a daemon from a site; nothing acts before `start`. The one place where all meets. */
export function createDaemon(site: SiteConfig, options: DaemonOptions): Daemon {
  return new RockhourDaemon(site, options);
}

class RockhourDaemon implements Daemon {
  readonly service: DaemonService;
  private readonly log: Log;
  private readonly clock: DaemonClock;
  private readonly counters = new Counters();
  private readonly notices: Notices;
  private readonly journal: Journal;
  private readonly history: History;
  private readonly questions: Questions;
  private readonly runners: ReadonlyMap<string, UnitRunner>;
  private readonly pipeline: Pipeline;
  private readonly intake: Intake;
  private readonly poll_ms: number;
  private readonly ending: (() => void | Promise<void>)[] = [];
  private broker: EmbeddedBroker | null = null;
  private link: MqttLink | null = null;
  private announcer: Announcer | null = null;
  private forwarder: InfluxForwarder | null = null;
  private brokerUrl = '';
  private refused: string | null = null;
  /** Scans are closed by the clock only once the broker had a chance to bring what it kept. */
  private mayClose = false;
  private places: Promise<DaemonPlaces> | null = null;
  private ended: Promise<void> | null = null;

  constructor(
    private readonly site: SiteConfig,
    private readonly options: DaemonOptions,
  ) {
    const core = options.core ?? realCore;
    this.log = options.log;
    this.clock = options.clock ?? wallClock;
    this.notices = new Notices(this.log);
    this.journal = new Journal(join(site.store.folder, 'journal.sqlite'));
    this.history = new History(join(site.store.folder, 'history.sqlite'), site.store);
    this.questions = new Questions(core, options.configPath);
    const assembly = {
      deadline_ms: site.scan_deadline_s * 1000,
      future_tolerance_ms: (site.clock_tolerance_s ?? CLOCK_TOLERANCE_S) * 1000,
      longest_gap_scans: LONGEST_GAP_SCANS,
    };
    this.runners = new Map(
      site.units.map((unit) => [unit.id, new UnitRunner(unit, core, assembly)]),
    );
    const shortest_s = Math.min(...site.units.map((unit) => unit.scan_period_s));
    this.poll_ms = Math.min(1000, Math.max(20, (shortest_s * 100) / this.clock.speed));
    this.pipeline = new Pipeline({
      journal: this.journal,
      history: this.history,
      runners: [...this.runners.values()],
      clock: this.clock,
      steady: new SteadyClock(this.clock, 4 * this.poll_ms * this.clock.speed),
      counters: this.counters,
      notices: this.notices,
      log: this.log,
      checkpoint_every_ms: site.store.checkpoint_every_s * 1000,
      stepped: (runner, step) => this.stepped(runner, step),
      event: (event) => this.tellEvent(event),
    });
    this.intake = new Intake({
      units: site.units,
      sources: site.sources,
      now: () => Math.floor(this.clock.now()),
      commit: (readings) => {
        this.journal.append(readings);
        this.pipeline.kick();
      },
      count: (name, by) => this.counters.add(name, by),
      notice: (kind, text) => this.notices.warn(kind, text),
    });
    this.service = new DaemonService({
      siteName: site.name,
      version: options.version,
      runners: this.runners,
      history: this.history,
      questions: this.questions,
      counters: this.counters,
      clock: this.clock,
      health: () => this.health(),
      acknowledged: (unit) => this.tellStanding(unit, null),
    });
  }

  start(): Promise<DaemonPlaces> {
    this.places ??= this.startAll().catch(async (thrown: unknown) => {
      await this.end();
      throw thrown;
    });
    return this.places;
  }

  async stop(): Promise<void> {
    const starting = this.places;
    this.places = null;
    // A long replay of the journal at a start is cut short.
    this.pipeline.stop();
    await starting?.catch(() => undefined);
    this.ended ??= this.end().finally(() => {
      this.ended = null;
    });
    await this.ended;
  }

  private async end(): Promise<void> {
    for (let end = this.ending.pop(); end; end = this.ending.pop()) await end();
  }

  caughtUp(): Promise<void> {
    this.intake.flush();
    return this.pipeline.caughtUp();
  }

  private async startAll(): Promise<DaemonPlaces> {
    const lock = new FolderLock(this.site.store.folder);
    lock.start();
    this.ending.push(() => lock.stop());
    await this.startBroker();
    this.journal.start();
    this.ending.push(() => this.journal.stop());
    this.history.start();
    this.ending.push(() => this.history.stop());
    this.ending.push(() => this.questions.stop());
    await this.startPipeline();
    const url = this.options.http === false ? null : await this.startHttp();
    this.startForwarder();
    this.startLink();
    this.startTimers();
    return { url, broker: withoutCredentials(this.brokerUrl), folder: this.site.store.folder };
  }

  private async startBroker(): Promise<void> {
    const { url, embedded_host, embedded_port } = this.site.mqtt;
    this.brokerUrl = url ?? '';
    if (url !== null) return;
    const broker = new EmbeddedBroker(embedded_host, embedded_port);
    await broker.start();
    this.ending.push(() => broker.stop());
    this.broker = broker;
    this.brokerUrl = broker.url;
  }

  private async startPipeline(): Promise<void> {
    const { journal } = this;
    const from = Math.max(0, journal.lastSeq - REMEMBER_READINGS);
    for (let seq = from; seq < journal.lastSeq; ) {
      const entries = journal.read(seq, 1000);
      seq = entries.at(-1)?.seq ?? journal.lastSeq;
      this.intake.remember(entries.filter((entry) => entry.kind === 'reading'));
    }
    this.intake.start();
    this.pipeline.start();
    this.ending.push(() => this.pipeline.stop());
    const { backlog } = this.pipeline;
    if (backlog > 5000) this.log.info(`replays ${backlog} entries of the journal`);
    await this.pipeline.caughtUp();
  }

  private async startHttp(): Promise<string> {
    const server: HttpServer = createHttpServer(this.service, this.site.http, {
      log: this.log,
      pageFolder: pageFolder(),
    });
    this.ending.push(() => server.stop());
    return (await server.start()).url;
  }

  private startLink(): void {
    const { mqtt, name } = this.site;
    const link = new MqttLink({
      url: this.brokerUrl,
      client_id: mqtt.client_id,
      username: mqtt.username,
      password: mqtt.password,
      // The embedded broker speaks 3.1.1 only.
      protocol: this.broker ? 4 : mqtt.protocol,
      qos: mqtt.qos,
      topics: this.intake.topics,
      will: Announcer.will(mqtt.out_prefix),
      receive: (delivery) => this.intake.receive(delivery),
      up: () => this.linkUp(),
      down: (reason) =>
        this.log.warn(
          `no connection to the MQTT broker ${withoutCredentials(this.brokerUrl)}: ${reason}; rockhour keeps trying`,
        ),
      refused: (reason) => {
        this.refused = reason;
        this.log.error(`the MQTT broker refused a subscription: ${reason}`);
      },
    });
    this.link = link;
    this.announcer = new Announcer(link, {
      prefix: mqtt.out_prefix,
      version: this.options.version,
      site: name,
      now: () => this.clock.now(),
    });
    this.restate();
    this.announcer.start();
    link.start();
    this.ending.push(async () => {
      this.intake.stop();
      this.announcer?.stop();
      await link.stop();
    });
  }

  private linkUp(): void {
    this.mayClose = true;
    this.refused = null;
    this.log.info(`connected to the MQTT broker ${withoutCredentials(this.brokerUrl)}`);
    this.announcer?.connected();
  }

  /** What was last said before this start is said again. */
  private restate(): void {
    for (const [id, { view }] of this.runners) {
      if (view.estimate) this.announcer?.state(view.estimate);
      if (view.dispatch) this.announcer?.dispatch(id, view.dispatch.time, view.dispatch.answers);
      this.tellStanding(id, null);
    }
  }

  private startForwarder(): void {
    const { influx: config, units } = this.site;
    if (!config) return;
    const forwarder = new InfluxForwarder({
      config,
      outbox: () => this.history.outbox,
      count: (name, by) => this.counters.add(name, by),
      down: (reason) =>
        this.log.warn(
          `InfluxDB at ${config.url} cannot be written to: ${reason}; what is due waits in the local store`,
        ),
      up: () => this.log.info(`InfluxDB at ${config.url} is written to again`),
      refused: (reason) => this.notices.warn('influx_set_aside', `a point was refused: ${reason}`),
    });
    this.forwarder = forwarder;
    const stands = this.history.events.standing().flatMap(({ id, state }) => {
      return state === 'returned_unacknowledged' ? [] : [id];
    });
    const watch = new DatabaseWatch(units, new Set(stands));
    forwarder.start();
    this.ending.push(() => forwarder.stop());
    this.every(DATABASE_LOOK_EVERY_MS / Math.max(1, this.clock.speed), () => {
      // Nothing has been tried yet: neither up nor down.
      if (!forwarder.proven && forwarder.trouble === null) return;
      for (const event of watch.step(this.clock.now(), forwarder.trouble)) {
        if (this.history.write(() => this.history.events.add(event))) this.tellEvent(event);
      }
    });
  }

  private startTimers(): void {
    this.every(this.poll_ms, () => {
      if (this.mayClose) this.pipeline.closeDue();
    });
    const patience_s = Math.max(...this.site.units.map((unit) => unit.watch.data_age_s.limit));
    const patience = setTimeout(
      () => {
        this.mayClose = true;
      },
      (patience_s * 1000) / Math.max(1, this.clock.speed),
    );
    this.ending.push(() => clearTimeout(patience));
    this.every(RETENTION_EVERY_MS, () => this.retain());
  }

  /** Repeats an action until the stop. */
  private every(ms: number, action: () => void): void {
    const timer = setInterval(action, Math.max(10, ms));
    this.ending.push(() => clearInterval(timer));
  }

  private retain(): void {
    const now_ms = Math.floor(this.clock.now());
    const { store, units } = this.site;
    try {
      const forwarded = this.forwarder ? this.history.outbox.cursor : Number.POSITIVE_INFINITY;
      const { estimates, not_forwarded } = this.history.retain(now_ms, forwarded);
      this.counters.add('estimates_thinned', estimates);
      this.counters.add('estimates_not_forwarded', not_forwarded);
      const old = this.journal.seqBefore(now_ms - store.keep_readings_days * DAY_MS);
      const covered = this.history.checkpoints.coveredSeq(units.map((unit) => unit.id));
      this.journal.forget(Math.min(old, covered));
    } catch (thrown) {
      this.counters.add('history_failures');
      this.notices.warn('history_failures', thrown instanceof Error ? thrown.message : '');
    }
  }

  private stepped(runner: UnitRunner, { step }: RunnerStep): void {
    const { estimate } = step;
    this.announcer?.state(estimate);
    if (estimate.dispatch) {
      this.announcer?.dispatch(estimate.unit, estimate.time, estimate.dispatch);
    }
    this.service.tell({ kind: 'state', unit: runner.unit.id });
  }

  private tellEvent(event: WatchEvent): void {
    this.counters.add('events');
    const { id: event_id, transition, priority } = event;
    this.log.info({ event: event_id, transition, priority }, event.message);
    this.tellStanding(event.unit, event);
    this.service.tell({ kind: 'event', unit: event.unit, event });
  }

  private tellStanding(unit: string, last: WatchEvent | null): void {
    const time = last?.time ?? new Date(this.clock.now()).toISOString();
    const standing = this.history.events.standing(unit);
    this.announcer?.alarms({ time, unit, standing, last });
  }

  private health() {
    const { folder } = this.site.store;
    const url = withoutCredentials(this.brokerUrl);
    const failures = this.counters.get('history_failures');
    return [
      brokerHealth(url, this.link?.connected ?? false, this.refused),
      storeHealth(folder, this.intake.stuck, this.pipeline.backlog, failures),
      ...(this.forwarder ? [databaseHealth(this.forwarder, this.history.outbox)] : []),
      ...[...this.runners.values()].map((runner) =>
        unitHealth(runner, this.pipeline.failures.get(runner.unit.id), this.clock),
      ),
    ];
  }
}

/** The built page: beside this file once compiled, else where the build puts it. */
function pageFolder(): string {
  const here = fileURLToPath(new URL('.', import.meta.url));
  const compiled = join(here, 'page');
  return existsSync(join(compiled, 'index.html')) ? compiled : join(here, '..', 'dist', 'page');
}
