import { statfsSync } from 'node:fs';
import type { History } from '../adapters/history/history.js';
import type { Journal } from '../adapters/history/journal.js';
import type { SetAside } from '../adapters/history/setAside.js';
import type { SiteConfig } from '../config/site.js';
import type { WatchEvent } from '../core/watch/event.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';
import { StoreWatch } from './storeWatch.js';

export interface StorePartOptions {
  readonly site: SiteConfig;
  readonly journal: Journal;
  readonly history: History;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly log: Log;
  /** Why journal or history could not be written the last time; null where they could. */
  trouble(): string | null;
  /** Stores what waits since the history could not be written. */
  retry(): void;
  /** Cursor of the forwarder; Infinity where there is none. */
  forwarded(): number;
  /** Newest source time of all units, as far as it is trusted [ms]; -Infinity before the first. */
  newest_ms(): number;
  /** An event that is new. */
  event(event: WatchEvent): void;
}

const LOOK_EVERY_MS = 5000;
const DAY_MS = 86_400_000;
/** Pieces thinned at a look: each takes some 20 ms. */
const PIECES = 5;
/** Entries of the journal deleted in one piece. */
const ENTRIES = 50_000;
/** Readings younger than this stay where late readings may go back to them [ms]. */
const READINGS_MS = 2 * DAY_MS;

/** The local store's room and health: thinned before the disk is full, and told where it is. */
export class StorePart {
  private timer: NodeJS.Timeout | null = null;
  private readonly watch: StoreWatch;
  /** Told, but not in the history yet. */
  private unstored: WatchEvent[] = [];
  /** Set aside before there was anybody to be told. */
  private early: { file: 'journal' | 'history'; what: SetAside }[] = [];
  private stands = false;

  constructor(private readonly options: StorePartOptions) {
    const { site } = options;
    this.watch = new StoreWatch(site.units, site.store.keep_free_MB ?? 0, () => this.stands);
  }

  start(): void {
    const { history, clock, event } = this.options;
    this.stands = history.alarms.active().some(({ kind }) => kind === 'disk_full');
    for (const { file, what } of this.early.splice(0)) this.tell(file, what);
    for (const one of this.store()) event(one);
    this.timer ??= setInterval(() => this.look(), LOOK_EVERY_MS / Math.max(1, clock.speed));
  }

  stop(): void {
    if (this.timer) clearInterval(this.timer);
    this.timer = null;
  }

  /** A damaged file was set aside, perhaps while the daemon still starts. */
  damaged(file: 'journal' | 'history', what: SetAside): void {
    this.options.log.error(
      `${file}.sqlite was damaged: ${what.reason}; kept as ${what.kept}, goes on with a fresh one ` +
        `and ${what.rows} rows of the old one` +
        (what.lost === undefined ? '' : `; ${what.lost} entries are lost`),
    );
    this.options.counters.add('stores_set_aside');
    this.options.counters.add('journal_entries_lost', what.lost ?? 0);
    if (this.timer) this.tell(file, what);
    else this.early.push({ file, what });
  }

  private tell(file: 'journal' | 'history', what: SetAside): void {
    this.unstored.push(...this.watch.damaged(file, what, Math.floor(this.options.clock.now())));
  }

  private look(): void {
    const { clock, trouble, retry, event } = this.options;
    let room = this.room();
    for (let n = 0; n < PIECES && room !== null && this.isShort(room); n++) {
      if (!this.thin()) break;
      room = this.room();
    }
    // A plant that has fallen silent brings no scan to try with.
    if (trouble() !== null) retry();
    const found = this.watch.step({ time_ms: Math.floor(clock.now()), room, trouble: trouble() });
    this.unstored.push(...found);
    const stored = this.store();
    // What cannot be stored is said all the same, once.
    for (const one of this.unstored.length > 0 ? found : stored) event(one);
  }

  /** Puts what waits into the history; gives what is new there, nothing while it cannot be written. */
  private store(): WatchEvent[] {
    const { history, counters, notices } = this.options;
    if (this.unstored.length === 0) return [];
    try {
      const fresh = history.write(() => this.unstored.filter((one) => history.events.add(one)));
      this.unstored = [];
      return fresh;
    } catch (thrown) {
      counters.add('history_failures');
      notices.warn('history_failures', reasonOf(thrown));
      return [];
    }
  }

  private isShort(room: number): boolean {
    return room < (this.options.site.store.keep_free_MB ?? 0) * 1e6;
  }

  /** Room for the store [bytes]: of the disk, and pages that its files hold empty. */
  private room(): number | null {
    const { site, journal, history } = this.options;
    try {
      const { bavail, bsize } = statfsSync(site.store.folder);
      return bavail * bsize + journal.emptyBytes + history.emptyBytes;
    } catch {
      return null;
    }
  }

  /**
   * Thins one piece: estimates of more than a day to one per `thin_to_s`; readings that are in every
   * saved state; pictures and estimates of more than a week. What has not been forwarded, and what a
   * restart works off, stays. False where nothing is left to thin.
   */
  private thin(): boolean {
    const { site, history, journal, clock, counters, notices, forwarded } = this.options;
    // As for retention: by a clock that was set years ahead all would be old.
    const now_ms = Math.floor(Math.min(clock.now(), this.options.newest_ms()));
    if (now_ms === Number.NEGATIVE_INFINITY) return false;
    try {
      const covered = history.checkpoints.coveredSeq(site.units.map(({ id }) => id));
      const early = history.thinEarly(now_ms, forwarded());
      let { rows } = early;
      if (rows === 0 && !early.more) {
        rows = journal.forget(Math.min(covered, journal.seqBefore(now_ms - READINGS_MS)), ENTRIES);
      }
      if (rows === 0 && !early.more) rows = history.forgetOldest(now_ms, forwarded());
      counters.add('rows_thinned_early', rows);
      if (rows > 0) {
        notices.warn(
          'rows_thinned_early',
          'the disk is nearly full: the local store is thinned early',
        );
      }
      return rows > 0 || early.more;
    } catch (thrown) {
      counters.add('history_failures');
      notices.warn('history_failures', reasonOf(thrown));
      return false;
    }
  }
}
