import type { StoreConfig } from '../../config/site.js';
import type { UnitDefinition } from '../../core/definitions.js';
import { reasonOf } from '../../errors.js';
import { type AlarmRules, Alarms } from './alarms.js';
import { Checkpoints } from './checkpoints.js';
import { Cycles } from './cycles.js';
import { type Database, emptyBytes, openDatabase, openToRead, storeFailure } from './database.js';
import { Estimates } from './estimates.js';
import { EventQueue } from './eventQueue.js';
import { Events } from './events.js';
import { LateReadings } from './lateReadings.js';
import { Layouts } from './layouts.js';
import { Offers } from './offers.js';
import { Outbox } from './outbox.js';
import { Past } from './past.js';
import { Profiles } from './profiles.js';
import { applyRetention, forgetOldest, type RetentionCounts, thinEstimates } from './retention.js';
import { RewindPoints } from './rewindPoints.js';
import { Rewinds } from './rewinds.js';
import { Rollups } from './rollups.js';
import { HISTORY_SCHEMA } from './schema.js';
import { Sequence } from './sequence.js';
import {
  isDamage,
  moveAside,
  type Salvaged,
  type SetAside,
  takeOverRows,
  wasOurs,
} from './setAside.js';
import { WatchViews } from './watchViews.js';

const ROW = { key: 'rowid', most: Number.MAX_SAFE_INTEGER } as const;
/** What is taken over of a damaged history: all that cannot be made again, and is small. */
const TAKEN_OVER: readonly Salvaged[] = [
  ...['cursors', 'checkpoints', 'rewind_points', 'alarms', 'alarm_transitions', 'events', 'cycles'],
  ...['offers', 'tellings', 'rewinds', 'withdrawals'],
].map((table) => ({ table, ...ROW }));

/**
 * The local history: one SQLite file with estimates, dispatch answers, offers, profiles, events,
 * alarms with every transition, checkpoints, late readings and the forwarder's cursor. A power cut may undo the last
 * moments of it, checkpoints included, as a whole: the journal, which is synced, makes them again.
 */
export class History {
  private opened: {
    readonly database: Database;
    readonly rollups: Rollups;
    readonly estimates: Estimates;
    readonly profiles: Profiles;
    readonly events: Events;
    readonly alarms: Alarms;
    readonly checkpoints: Checkpoints;
    readonly outbox: Outbox;
    readonly offers: Offers;
    readonly cycles: Cycles;
    readonly watch: WatchViews;
    readonly rewindPoints: RewindPoints;
    readonly late: LateReadings;
    readonly rewinds: Rewinds;
    readonly sequence: Sequence;
  } | null = null;

  constructor(
    private readonly file: string,
    private readonly store: StoreConfig,
    private readonly rules: AlarmRules = { latching: [], out_of_service: [] },
    /** Told where the file was damaged and a fresh one has been begun. */
    private readonly setAside: (what: SetAside) => void = () => undefined,
  ) {}

  /** @throws RockhourError STORE_FAILED; not where it was damaged: it is set aside then */
  start(): void {
    if (this.opened) return;
    try {
      this.open(openDatabase(this.file, 'normal', HISTORY_SCHEMA));
    } catch (thrown) {
      if (!isDamage(thrown) || !wasOurs(this.file, 'estimates')) throw thrown;
      this.renew(thrown, true);
    }
  }

  /**
   * Sets the damaged file aside and goes on with a fresh one. States, alarms, runs and cursors are taken
   * over as far as they can be read; estimates are made again from the oldest state, where the journal
   * still reaches that far: of the last two days in general.
   *
   * @param remakes false while the daemon runs: its units are ahead, and their past stays in the old file
   */
  private renew(thrown: unknown, remakes: boolean): void {
    this.stop();
    const kept = moveAside(this.file);
    const fresh = openDatabase(this.file, 'normal', HISTORY_SCHEMA);
    const rows = fresh.transaction(() => takeOverRows(kept, fresh, TAKEN_OVER))();
    if (remakes) {
      fresh.exec(`DELETE FROM checkpoints WHERE unit IN (SELECT unit FROM rewind_points);
        DELETE FROM rewind_points WHERE (unit, time) NOT IN
          (SELECT unit, min(time) FROM rewind_points GROUP BY unit);`);
    }
    this.open(fresh);
    this.setAside({ kept, reason: reasonOf(thrown), rows });
  }

  /** For reports: reads alone, beside a daemon. @throws RockhourError STORE_FAILED */
  startToRead(): void {
    if (!this.opened) this.open(openToRead(this.file, HISTORY_SCHEMA));
  }

  private open(database: Database): void {
    const sequence = new Sequence(database);
    const alarms = new Alarms(database, this.rules);
    const layouts = new Layouts(database);
    const rollups = new Rollups(database, layouts);
    this.opened = {
      database,
      rollups,
      estimates: new Estimates(database, sequence, layouts, rollups),
      profiles: new Profiles(database),
      events: new Events(database, sequence, alarms),
      alarms,
      checkpoints: new Checkpoints(database),
      outbox: new Outbox(database),
      offers: new Offers(database),
      cycles: new Cycles(database, sequence),
      watch: new WatchViews(database),
      rewindPoints: new RewindPoints(database),
      late: new LateReadings(database),
      rewinds: new Rewinds(database, sequence),
      sequence,
    };
  }

  stop(): void {
    this.opened?.database.close();
    this.opened = null;
  }

  get estimates(): Estimates {
    return this.parts.estimates;
  }
  get profiles(): Profiles {
    return this.parts.profiles;
  }
  get events(): Events {
    return this.parts.events;
  }
  get alarms(): Alarms {
    return this.parts.alarms;
  }
  get checkpoints(): Checkpoints {
    return this.parts.checkpoints;
  }
  get outbox(): Outbox {
    return this.parts.outbox;
  }
  get offers(): Offers {
    return this.parts.offers;
  }
  get cycles(): Cycles {
    return this.parts.cycles;
  }
  get watch(): WatchViews {
    return this.parts.watch;
  }

  get rewindPoints(): RewindPoints {
    return this.parts.rewindPoints;
  }
  get late(): LateReadings {
    return this.parts.late;
  }
  get rewinds(): Rewinds {
    return this.parts.rewinds;
  }

  /** For what a rewind makes again of a unit. */
  past(unit: UnitDefinition, from_ms: number): Past {
    return new Past(this.parts, unit, from_ms);
  }

  /** What is told outside, for a receiver that keeps its own place in it. */
  eventQueue(receiver: string): EventQueue {
    return new EventQueue(() => this.parts.database, receiver);
  }

  /** A number kept under a name over restarts; null before the first. */
  kept(name: string): number | null {
    const value = this.parts.database.prepare('SELECT value FROM cursors WHERE name = ?').pluck();
    return (value.get(name) as number | undefined) ?? null;
  }

  keep(name: string, value: number): void {
    this.write(() =>
      this.parts.database
        .prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)')
        .run(name, value),
    );
  }

  /** Runs `write` in one transaction; SQLite's failures become errors of the catalogue. */
  write<T>(write: () => T): T {
    try {
      return this.parts.database.transaction(write)();
    } catch (thrown) {
      if (isDamage(thrown)) return this.writeAnew(thrown, write);
      if (thrown instanceof Error && 'code' in thrown && String(thrown.code).startsWith('SQLITE')) {
        throw storeFailure(`writing to the history ${this.file}`, thrown);
      }
      throw thrown;
    }
  }

  private writeAnew<T>(thrown: unknown, write: () => T): T {
    // Within a transaction of its own caller the outermost one is run again.
    if (this.opened?.database.inTransaction) throw thrown;
    try {
      this.renew(thrown, false);
      return this.parts.database.transaction(write)();
    } catch (again) {
      throw storeFailure(`writing to the history ${this.file}`, again);
    }
  }

  /** Number of the newest journal entry that a saved state has taken in; 0 where there is none. */
  get journalReach(): number {
    const found = this.parts.database.prepare(
      `SELECT max(n) FROM (SELECT max(journal_seq) AS n FROM checkpoints
         UNION ALL SELECT max(journal_seq) FROM rewind_points)`,
    );
    return (found.pluck().get() as number | null) ?? 0;
  }

  /** See applyRetention. */
  retain(now_ms: number, forwarded: number): RetentionCounts {
    const { database, rollups } = this.parts;
    return this.write(() => applyRetention(database, rollups, this.store, now_ms, forwarded));
  }

  /** Empty pages within the file, which are written to before it grows [bytes]. */
  get emptyBytes(): number {
    return emptyBytes(this.parts.database);
  }

  /** Thins a day of estimates before its time; gives the rows that went. See applyRetention. */
  thinEarly(now_ms: number, forwarded: number): number {
    const { database, rollups } = this.parts;
    const store = { ...this.store, thin_after_days: Math.min(1, this.store.thin_after_days) };
    return this.write(() => thinEstimates(database, rollups, store, now_ms, forwarded));
  }

  /** Deletes the oldest day of what is more than a week old and was forwarded; gives the rows. */
  forgetOldest(now_ms: number, forwarded: number): number {
    const { database, rollups } = this.parts;
    return this.write(() => forgetOldest(database, rollups, now_ms, forwarded));
  }

  /** Rolls up a day of what is not yet, as an older version left it; false where there is no such day. */
  rollUp(): boolean {
    return this.write(() => this.parts.rollups.fillBack());
  }

  private get parts(): NonNullable<History['opened']> {
    if (!this.opened) throw new RangeError('history must be started, got one that is not');
    return this.opened;
  }
}
