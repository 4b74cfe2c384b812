import type { History } from '../adapters/history/history.js';
import { InfluxForwarder } from '../adapters/history/influxForwarder.js';
import type { HealthPart } from '../adapters/http/service.js';
import type { InfluxConfig } from '../config/site.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { WatchEvent } from '../core/watch/event.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import { DatabaseWatch } from './databaseWatch.js';
import { databaseHealth } from './health.js';
import type { Notices } from './notices.js';

export interface DatabasePartOptions {
  readonly config: InfluxConfig;
  readonly units: readonly UnitDefinition[];
  readonly history: History;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly log: Log;
  /** An event that is new. */
  event(event: WatchEvent): void;
}

const LOOK_EVERY_MS = 1000;
/** Events kept while the history cannot be written. */
const MOST_UNSTORED = 1000;

/** The forwarder to the time-series database and the alert that it cannot be reached. */
export class DatabasePart {
  private readonly forwarder: InfluxForwarder;
  private watch: DatabaseWatch | null = null;
  private timer: NodeJS.Timeout | null = null;
  /** Raised or returned, but not in the history yet. */
  private unstored: WatchEvent[] = [];

  constructor(private readonly options: DatabasePartOptions) {
    const { config, history, counters, notices, log } = options;
    this.forwarder = new InfluxForwarder({
      config,
      outbox: () => history.outbox,
      count: (name, by) => counters.add(name, by),
      down: (reason) =>
        log.warn(
          `InfluxDB at ${config.url} cannot be written to: ${reason}; what is due waits in the local store`,
        ),
      up: () => log.info(`InfluxDB at ${config.url} is written to again`),
      refused: (reason) => notices.warn('influx_set_aside', `a point was refused: ${reason}`),
    });
  }

  get health(): HealthPart {
    return databaseHealth(this.forwarder, this.options.history.outbox);
  }

  /** Entries that wait to be forwarded. */
  get backlog(): number {
    return this.options.history.outbox.backlog;
  }

  /** Everything up to here has been forwarded. */
  get cursor(): number {
    return this.options.history.outbox.cursor;
  }

  start(): void {
    const { units, history, clock } = this.options;
    const stands = history.alarms.active().map(({ id }) => id);
    this.watch = new DatabaseWatch(units, new Set(stands));
    this.forwarder.start();
    this.timer = setInterval(() => this.look(), LOOK_EVERY_MS / Math.max(1, clock.speed));
  }

  async stop(): Promise<void> {
    if (this.timer) clearInterval(this.timer);
    this.timer = null;
    await this.forwarder.stop();
  }

  private look(): void {
    const { clock } = this.options;
    const { proven, trouble } = this.forwarder;
    // Nothing has been tried yet: neither up nor down.
    if (!proven && trouble === null) return;
    this.unstored.push(...(this.watch?.step(clock.now(), trouble) ?? []));
    if (this.unstored.length > 0) this.store();
  }

  /** Puts what waits into the history and tells it; where that cannot be written, with a later look. */
  private store(): void {
    const { history, counters, notices, event } = this.options;
    try {
      const fresh = history.write(() => this.unstored.filter((one) => history.events.add(one)));
      this.unstored = [];
      for (const one of fresh) event(one);
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      counters.add('events_lost', this.unstored.splice(MOST_UNSTORED).length);
      notices.warn('history_failures', reasonOf(thrown));
    }
  }
}
