import { join } from 'node:path';
import { Access } from './access/access.js';
import { TokensWatch } from './access/tokensWatch.js';
import { FolderLock } from './adapters/history/folderLock.js';
import { History } from './adapters/history/history.js';
import { Journal } from './adapters/history/journal.js';
import { ScanTimes } from './adapters/http/scanTimes.js';
import { createHttpServer } from './adapters/http/server.js';
import type { HealthPart, PlantService } from './adapters/http/service.js';
import { Intake } from './adapters/mqtt/intake.js';
import { SparkplugHost } from './adapters/mqtt/sparkplug/host.js';
import { readSource, type SiteSource } from './config/load.js';
import type { SiteConfig } from './config/site.js';
import type { WatchEvent } from './core/watch/event.js';
import { AgeClock } from './daemon/ageClock.js';
import { AlarmPart, DEFAULT_ALARMS } from './daemon/alarmPart.js';
import { Backups } from './daemon/backups.js';
import { catchUp } from './daemon/catchUp.js';
import { type DaemonClock, SteadyClock, wallClock } from './daemon/clock.js';
import { ClockSteps } from './daemon/clockSteps.js';
import { type Core, realCore } from './daemon/core.js';
import { Counters } from './daemon/counters.js';
import { DatabasePart } from './daemon/databasePart.js';
import { Entering } from './daemon/entering.js';
import {
  brokerHealth,
  clockHealth,
  edgeNodeHealth,
  leftOutHealth,
  storeHealth,
  unitHealth,
  unreadyReasons,
} from './daemon/health.js';
import { boundHeapGrowth } from './daemon/heapGrowth.js';
import { Hourly } from './daemon/hourly.js';
import { HoursOnStroke } from './daemon/hoursOnStroke.js';
import { Housekeeping } from './daemon/housekeeping.js';
import { futureTolerance, runnerMaker, unitPhases } from './daemon/makeRunners.js';
import { MqttPart, type MqttPartOptions } from './daemon/mqttPart.js';
import { Notices } from './daemon/notices.js';
import { NotifyPart } from './daemon/notifyPart.js';
import { OwnNodePart } from './daemon/ownNodePart.js';
import { pageFolder } from './daemon/pageFolder.js';
import { Pipeline } from './daemon/pipeline.js';
import { DaemonService } from './daemon/plantService.js';
import { Questions } from './daemon/questions.js';
import { toldBy } from './daemon/rewind/remake.js';
import { Rewinder } from './daemon/rewind/rewinder.js';
import { rewindRules } from './daemon/rewind/rules.js';
import { Speaker } from './daemon/speaker.js';
import { StorePart } from './daemon/storePart.js';
import type { RunnerStep, UnitRunner } from './daemon/unitRunner.js';
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
  /** File that `site` was read from, or that as it was read: workers need it. null: no worker. */
  readonly configPath: string | SiteSource | null;
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

/** Builds a daemon from a site; nothing acts before `start`. The one place where all meets. */
export function createDaemon(site: SiteConfig, options: DaemonOptions): Daemon {
  boundHeapGrowth();
  return new RockhourDaemon(site, options);
}

class RockhourDaemon implements Daemon {
  readonly service: DaemonService;
  private readonly log: Log;
  private readonly clock: DaemonClock;
  private readonly counters = new Counters();
  /** Who may come in, to page, API and its own broker alike. */
  private readonly access: Access;
  private readonly scanTimes = new ScanTimes();
  private readonly notices: Notices;
  private readonly journal: Journal;
  private readonly history: History;
  private readonly questions: Questions;
  private readonly runners: ReadonlyMap<string, UnitRunner>;
  private readonly pipeline: Pipeline;
  private readonly rewinder: Rewinder;
  private readonly intake: Intake;
  private readonly edgeNodes: SparkplugHost;
  private readonly mqtt: MqttPart;
  private readonly alarms: AlarmPart;
  private readonly database: DatabasePart | null;
  private readonly notify: NotifyPart;
  private readonly housekeeping: Housekeeping;
  /** null: the clock is not the machine's own. */
  private readonly steps: ClockSteps | null;
  private readonly store: StorePart;
  private readonly speaker: Speaker;
  /** What has been started, to be ended in reverse order. */
  private readonly ending: (() => void | Promise<void>)[] = [];
  private places: Promise<DaemonPlaces> | null = null;
  private ended: Promise<void> | null = null;
  private isUp = false;

  constructor(
    private readonly site: SiteConfig,
    private readonly options: DaemonOptions,
  ) {
    const { log, version } = options;
    const core = options.core ?? realCore;
    const clock = options.clock ?? wallClock;
    const notices = new Notices(log);
    this.notices = notices;
    const { counters } = this;
    this.log = log;
    this.access = new Access(site.http.tokens);
    this.clock = clock;
    const { folder } = site.store;
    const alarmsConfig = site.alarms ?? DEFAULT_ALARMS;
    const history: History = new History(
      join(folder, 'history.sqlite'),
      site.store,
      alarmsConfig,
      (what) => {
        this.store.damaged('history', what);
        this.rewinder.historyLost();
      },
      () => toldBy(this.runners.values()),
    );
    const journal = new Journal(
      join(folder, 'journal.sqlite'),
      () => history.journalReach,
      (what) => this.store.damaged('journal', what),
    );
    this.journal = journal;
    this.history = history;
    this.questions = new Questions(core, sourceOf(options.configPath));
    const make = runnerMaker(site, core);
    this.runners = new Map(site.units.map((unit) => [unit.id, make(unit)]));
    const shortest_s = Math.min(...site.units.map((unit) => unit.scan_period_s));
    const poll_ms = Math.min(1000, Math.max(20, (shortest_s * 100) / clock.speed));
    const common = { journal, history, clock, counters, notices, log };
    const rules = rewindRules(site);
    const steady = new SteadyClock(clock, 4 * poll_ms * clock.speed);
    const units = { ...common, runners: [...this.runners.values()], steady };
    const tells = {
      stepped: (runner: UnitRunner, step: RunnerStep) => {
        this.speaker.stepped(runner, step);
        const { heard_ms } = runner;
        if (heard_ms !== null) {
          this.scanTimes.observe(runner.unit.id, (clock.now() - heard_ms) / 1000);
        }
      },
      event: (event: WatchEvent) => this.alarms.event(event),
      alarmsMoved: (unit: string) => this.alarms.moved(unit),
    };
    const checkpoint_every_ms = site.store.checkpoint_every_s * 1000;
    const phase = unitPhases(site);
    const entering = new Entering({ ...common, ...rules, ...tells, checkpoint_every_ms, phase });
    this.pipeline = new Pipeline({
      ...{ ...units, entering },
      hours: new HoursOnStroke({ questions: this.questions, notices }),
      late: (runner, reading, isNew) => this.rewinder.note(runner, reading, isNew),
    });
    this.rewinder = new Rewinder({
      ...{ ...units, ...tells, entering, rules, fresh: make },
      backlog: () => this.pipeline.backlog,
      isBusy: (runner) => this.pipeline.isBusy(runner),
    });
    this.alarms = new AlarmPart({
      ...common,
      ...{ config: alarmsConfig, units: site.units },
      isUpToDate: () => this.pipeline.backlog === 0,
      announce: (message) => this.mqtt.announcer.alarms(message),
      raised: (event) => this.service.tell({ kind: 'event', unit: event.unit, event }),
      changed: (unit) => this.service.tell({ kind: 'alarms', unit }),
    });
    this.edgeNodes = new SparkplugHost({
      ...{ units: site.units, sources: site.sparkplug ?? [] },
      future_tolerance_ms: futureTolerance(site),
      now: () => Math.floor(clock.now()),
      steady: () => performance.now(),
      count: (name) => counters.add(name),
      notice: (kind, text) => notices.warn(kind, text),
      command: (topic, payload) => this.mqtt.command(topic, payload),
      add: (readings) => this.intake.add(readings),
    });
    this.intake = new Intake({
      units: site.units,
      sparkplug: this.edgeNodes,
      sources: site.sources,
      now: () => Math.floor(clock.now()),
      commit: (readings) => {
        journal.append(readings);
        this.pipeline.kick();
      },
      count: (name, by) => counters.add(name, by),
      unwanted: (topic) => this.mqtt.unsubscribe(topic),
      notice: (kind, text) => notices.warn(kind, text),
    });
    this.mqtt = new MqttPart({
      ...{ config: site.mqtt, site: site.name, version, intake: this.intake, clock, log, notices },
      counters,
      edgeNodes: this.edgeNodes,
      ...this.makeOwnNode(history, notices),
      heardLast: () => journal.read(journal.lastSeq - 1, 1)[0]?.arrival_ms ?? null,
      units: [...this.runners.keys()],
      access: this.access,
      command: (command, unit) => this.alarms.command(command, unit),
      connected: () => this.housekeeping.allowClosing(),
    });
    this.database = site.influx
      ? new DatabasePart({
          ...common,
          config: site.influx,
          units: site.units,
          event: (event) => this.alarms.event(event),
        })
      : null;
    this.notify = new NotifyPart({
      ...common,
      config: site.notify ?? { webhooks: [] },
      site: site.name,
      mqtt_prefix: site.mqtt.out_prefix,
      deliver: (topic, payload) => this.mqtt.deliver(topic, payload),
    });
    const counted = () => performance.now();
    this.steps = clock.isWall ? new ClockSteps(clock, counted, { counters, notices }) : null;
    const ages = new AgeClock({
      ...{ history, clock, counted },
      newest_ms: () =>
        Math.max(...[...this.runners.values()].map((one) => one.sure_ms ?? -Infinity)),
      failed: (thrown) => entering.storeFailed('history_failures', thrown),
    });
    const newest_ms = () => ages.now();
    this.store = new StorePart({
      ...{ ...common, site, newest_ms },
      trouble: () => (this.intake.stuck ? 'the journal refuses readings' : entering.trouble),
      retry: () => entering.retry(),
      forwarded: () => this.database?.cursor ?? Number.POSITIVE_INFINITY,
      event: (event) => this.alarms.event(event),
    });
    this.housekeeping = new Housekeeping({
      ...common,
      steps: this.steps,
      site,
      pipeline: this.pipeline,
      rewinder: this.rewinder,
      poll_ms,
      forwarded: () => this.database?.cursor ?? Number.POSITIVE_INFINITY,
      newest_ms,
    });
    this.speaker = new Speaker({
      ...{ questions: this.questions, history, notices, runners: this.runners },
      announcer: () => this.mqtt.announcer,
      backlog: () => this.pipeline.backlog,
      newestKept: (unit) => this.service.newestKept(unit),
      changed: (unit) => this.service.tell({ kind: 'state', unit }),
    });
    this.service = new DaemonService({
      ...{ siteName: site.name, version, runners: this.runners, history, counters, clock },
      store: site.store,
      leftOut: site.left_out ?? [],
      questions: this.questions,
      kept: (unit, table) => this.speaker.sayOffers(unit, table),
      scanTimes: this.scanTimes,
      health: () => this.health(),
      unready: () => this.unready(),
      backups: new Backups({
        ...{ site: site.name, version, journal, history, clock, counters, fresh: make },
        ...{ rewinder: this.rewinder, future_tolerance_ms: rules.future_tolerance_ms },
      }),
      backlogs: () => this.backlogs(),
      alarms: this.alarms,
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

  caughtUp(): Promise<void> {
    this.intake.flush();
    return this.pipeline.caughtUp();
  }

  private async startAll(): Promise<DaemonPlaces> {
    const { site, mqtt, journal, history, pipeline, database, housekeeping } = this;
    const { folder } = site.store;
    this.ending.push(() => this.notices.stop());
    const lock = new FolderLock(folder);
    await this.begin(
      () => lock.start(),
      () => lock.stop(),
    );
    await this.startTokens();
    await this.begin(
      () => mqtt.startBroker(),
      () => mqtt.stopBroker(),
    );
    // Before the journal: a damaged journal goes on behind what the saved states know of.
    await this.begin(
      () => history.start(),
      () => history.stop(),
    );
    await this.begin(
      () => journal.start(),
      () => journal.stop(),
    );
    this.ending.push(() => this.questions.stop());
    this.ending.push(() => this.speaker.stop());
    await this.begin(
      () => catchUp(journal, this.intake, pipeline, this.log),
      () => pipeline.stop(),
    );
    await this.begin(
      () => this.rewinder.start(),
      () => this.rewinder.stop(),
    );
    await this.begin(
      () => this.alarms.start(),
      () => this.alarms.stop(),
    );
    await this.begin(
      () => this.store.start(),
      () => this.store.stop(),
    );
    const url = this.options.http === false ? null : await this.startHttp();
    if (database) {
      await this.begin(
        () => database.start(),
        () => database.stop(),
      );
    }
    await this.begin(
      () => this.notify.start(),
      () => this.notify.stop(),
    );
    this.speaker.restate();
    await this.begin(
      () => mqtt.startLink(),
      () => mqtt.stopLink(),
    );
    const hourly = new Hourly({
      ...{ log: this.log, clock: this.clock, counters: this.counters },
      qualities: () => [...this.runners.values()].map(({ view }) => view.estimate?.quality ?? null),
      standing: () => this.service.standing().length,
      backlogs: () => this.backlogs(),
    });
    await this.begin(
      () => hourly.start(),
      () => hourly.stop(),
    );
    await this.begin(
      () => housekeeping.start(),
      () => housekeeping.stop(),
    );
    this.isUp = true;
    return { url, broker: mqtt.name, folder };
  }

  /** A token taken out of its file is refused while the daemon runs. */
  private async startTokens(): Promise<void> {
    const { tokens_file: file = null, tokens_inline: inline = [] } = this.site.http;
    if (file === null) return;
    const { access, log } = this;
    const watch = new TokensWatch({
      ...{ access, file, inline },
      info: (text) => log.info(text),
      error: (text) => log.error(text),
    });
    await this.begin(
      () => watch.start(),
      () => watch.stop(),
    );
  }

  private async begin(
    start: () => void | Promise<void>,
    end: () => void | Promise<void>,
  ): Promise<void> {
    // Before the start: what fails half-way is ended as well, and every end may come without one.
    this.ending.push(end);
    await start();
  }

  private async end(): Promise<void> {
    this.isUp = false;
    for (let end = this.ending.pop(); end; end = this.ending.pop()) await end();
  }

  private async startHttp(): Promise<string> {
    const server = createHttpServer(this.service, this.site.http, {
      log: this.log,
      pageFolder: pageFolder(),
      access: this.access,
    });
    this.ending.push(() => server.stop());
    return (await server.start()).url;
  }

  private backlogs(): Record<string, number> {
    const { database, notify, pipeline } = this;
    const forwarding = database ? { influxdb: database.backlog } : {};
    return { pipeline: pipeline.backlog, ...forwarding, ...notify.backlogs };
  }

  private makeOwnNode(history: History, notices: Notices): Pick<MqttPartOptions, 'ownNode'> {
    const { site, clock, counters } = this;
    const name = site.mqtt.sparkplug_node ?? null;
    if (name === null) return {};
    return {
      ownNode: (login) =>
        new OwnNodePart({
          ...{ name, login, history, counters, notices, units: site.units, site: site.name },
          ...{ version: this.options.version, client_id: site.mqtt.client_id },
          now: () => clock.now(),
          isStale: (unit) => this.service.now(unit)?.stale ?? true,
        }),
    };
  }

  private unready(): string[] {
    const { intake, pipeline } = this;
    const started = this.isUp && this.ended === null;
    return unreadyReasons({ started, isStuck: intake.stuck, backlog: pipeline.backlog });
  }

  private health(): HealthPart[] {
    const { mqtt, pipeline, clock } = this;
    const { folder } = this.site.store;
    const future = this.counters.get('future');
    return [
      brokerHealth(mqtt.name, mqtt.isConnected, mqtt.trouble, mqtt.refused),
      storeHealth(folder, this.intake.stuck, pipeline.backlog, pipeline.trouble),
      ...(this.database ? [this.database.health] : []),
      ...this.notify.health,
      ...(this.steps ? [clockHealth(clock.now(), this.steps.last)] : []),
      ...this.edgeNodes.states.map(edgeNodeHealth),
      ...(mqtt.ownNode ? [mqtt.ownNode.health] : []),
      ...[...this.runners.values()].map((runner) =>
        unitHealth(
          ...([runner, pipeline.failures.get(runner.unit.id), clock, future] as const),
          this.rewinder.words(runner.unit.id),
        ),
      ),
      ...(this.site.left_out ?? []).map(leftOutHealth),
    ];
  }
}

function sourceOf(config: DaemonOptions['configPath']): SiteSource | null {
  return typeof config === 'string' ? readSource(config) : config;
}
