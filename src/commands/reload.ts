import { readSource, type SiteSource, siteOf } from '../config/load.js';
import type { SiteConfig } from '../config/site.js';
import type { Daemon, DaemonPlaces } from '../daemon.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import { stopInTime } from './stopping.js';

/** A configuration and the text that it was made of. */
export interface Configured {
  readonly source: SiteSource;
  readonly site: SiteConfig;
}

export interface ReloadingOptions {
  readonly log: Log;
  create(config: Configured): Pick<Daemon, 'start' | 'stop'>;
  /** A daemon is up, after the start and after each reload. */
  up(site: SiteConfig, places: DaemonPlaces): void;
  /** No daemon runs any more: neither the new configuration nor the one before could be started. */
  lost(thrown: unknown): void;
}

/** Nobody waits for the end of a daemon that gives way to the next; it usually takes a second [ms]. */
const RELOAD_STOP_MS = 30_000;

/**
 * A daemon whose configuration can be read anew: the one that runs saves its state and ends, the next
 * restores it and takes in what has come to the broker meanwhile, as in any restart. A configuration
 * with faults changes nothing; one that a daemon cannot start with gives way to the one before.
 */
export class Reloading {
  private daemon: Pick<Daemon, 'start' | 'stop'> | null = null;
  private current: Configured | null = null;
  /** What is under way; the next waits for it. */
  private turn: Promise<void> = Promise.resolve();
  private waits = false;
  private stopped = false;

  constructor(private readonly options: ReloadingOptions) {}

  /** @throws what the daemon throws where it cannot start */
  async start(config: Configured): Promise<void> {
    this.turn = this.begin(config);
    await this.turn;
  }

  /** Never throws: what is wrong goes to the log. Asked for while one waits already, it does nothing. */
  async reload(path: string): Promise<void> {
    if (this.waits || this.stopped) return;
    this.waits = true;
    const before = this.turn.catch(() => undefined);
    this.turn = before.then(async () => {
      this.waits = false;
      if (!this.stopped) await this.change(path);
    });
    await this.turn.catch((thrown: unknown) => this.options.lost(thrown));
  }

  /** Ends the daemon, also while it starts or changes. */
  async stop(): Promise<void> {
    this.stopped = true;
    await this.daemon?.stop();
    await this.turn.catch(() => undefined);
    await this.daemon?.stop();
  }

  private async begin(config: Configured): Promise<void> {
    const daemon = this.options.create(config);
    this.daemon = daemon;
    const places = await daemon.start();
    this.current = config;
    if (!this.stopped) this.options.up(config.site, places);
  }

  private async change(path: string): Promise<void> {
    const { log } = this.options;
    const { current } = this;
    let next: Configured;
    try {
      const source = readSource(path);
      next = { source, site: siteOf(source) };
    } catch (thrown) {
      log.error(
        `SIGHUP: the configuration stays as it was, ${path} has faults: ${reasonOf(thrown)}`,
      );
      return;
    }
    log.info('SIGHUP: reads the configuration again; the state is kept');
    // The next one needs its folder and its ports: with what was left behind it could not start.
    if (this.daemon) await stopInTime(this.daemon, RELOAD_STOP_MS);
    try {
      await this.begin(next);
    } catch (thrown) {
      if (current === null) throw thrown;
      log.error(`SIGHUP: goes back to the configuration before: ${reasonOf(thrown)}`);
      await this.begin(current);
    }
  }
}
