import type { StoreConfig } from '../../config/site.js';
import type { UnitDefinition } from '../../core/definitions.js';
import { reasonOf } from '../../errors.js';
import type { AlarmRules, Alarms } from './alarms.js';
import type { Checkpoints } from './checkpoints.js';
import type { Cycles } from './cycles.js';
import { type Database, emptyBytes, openDatabase, openToRead, storeFailure } from './database.js';
import type { Estimates } from './estimates.js';
import { EventQueue } from './eventQueue.js';
import type { Events } from './events.js';
import { freshHistory } from './freshHistory.js';
import { guarded } from './guarded.js';
import { guardedParts, type HandedOut, type HistoryParts, partsOf } from './historyParts.js';
import type { LateReadings } from './lateReadings.js';
import type { Offers } from './offers.js';
import type { Outbox } from './outbox.js';
import { Past } from './past.js';
import type { Profiles } from './profiles.js';
import {
  applyRetention,
  forgetOldest,
  type RetentionCounts,
  type Thinned,
  thinEstimates,
} from './retention.js';
import type { RewindPoints } from './rewindPoints.js';
import type { Rewinds } from './rewinds.js';
import { HISTORY_SCHEMA } from './schema.js';
import { isDamage, type SetAside, wasOurs } from './setAside.js';
import { takeBack } from './takenBack.js';
import type { WatchViews } from './watchViews.js';

/** Name under which it is kept up to when estimates of a unit were lost and are to be made again. */
const lostName = (unit: string) => `estimates of ${unit} lost before`;

/** Estimates of a unit that a damaged history held: those of before a time. */
export interface Lost {
  readonly unit: string;
  readonly before_ms: number;
}

/**
 * The local history: one SQLite file with estimates, dispatch answers, offers, profiles, events,
 * alarms with every transition, checkpoints, late readings and the forwarder's cursor. A power cut may undo the last
 * moments of it, checkpoints included, as a whole: the journal, which is synced, makes them again.
 */
export class History {
  private opened: HistoryParts | null = null;

  /** The same parts, each call of which acts on damage. */
  private handedOut: HandedOut | null = null;
  private isToRead = false;
  private isWriting = false;

  constructor(
    private readonly file: string,
    private readonly store: StoreConfig,
    private readonly rules: AlarmRules = { latching: [], out_of_service: [] },
    /** Told where the file was damaged and a fresh one has been begun. */
    private readonly setAside: (what: SetAside) => void = () => undefined,
    /** What units that run have told: damaged meanwhile, it is lost and made again beside them. */
    private readonly told: () => readonly Lost[] = () => [],
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
   * @param atStart units go back to the oldest state; else they are ahead, and what they have told is
   *   noted as lost, to be made again beside them
   */
  private renew(thrown: unknown, atStart: boolean): void {
    this.stop();
    const { fresh, kept, rows } = freshHistory(this.file, (database) => {
      const note = database.prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)');
      for (const { unit, before_ms } of atStart ? [] : this.told())
        note.run(lostName(unit), before_ms);
      if (!atStart) return;
      database.exec(`DELETE FROM checkpoints WHERE unit IN (SELECT unit FROM rewind_points);
        DELETE FROM rewind_points WHERE (unit, time) NOT IN
          (SELECT unit, min(time) FROM rewind_points GROUP BY unit);`);
    });
    this.open(fresh);
    this.setAside({ kept, reason: reasonOf(thrown), rows });
  }

  /**
   * Acts on damage that a question has met, as on damage met by a write.
   * @returns whether it was damage, and a fresh history is in use
   */
  mend(thrown: unknown): boolean {
    const { opened, isToRead } = this;
    if (!isDamage(thrown) || opened === null || isToRead) return false;
    // Within a transaction the whole of it is run again, by `write`.
    if (this.isWriting || opened.database.inTransaction) return false;
    try {
      this.renew(thrown, false);
      return true;
    } catch (again) {
      throw storeFailure(`reading the history ${this.file}`, again);
    }
  }

  private ask<T>(read: () => T): T {
    try {
      return read();
    } catch (thrown) {
      if (!this.mend(thrown)) throw thrown;
      return read();
    }
  }

  /** For reports: reads alone, beside a daemon. @throws RockhourError STORE_FAILED */
  startToRead(): void {
    if (this.opened) return;
    this.isToRead = true;
    this.open(openToRead(this.file, HISTORY_SCHEMA));
  }

  private open(database: Database): void {
    this.opened = partsOf(database, this.rules);
    this.handedOut = guardedParts(this.opened, (thrown) => (this.mend(thrown) ? this.parts : null));
  }

  stop(): void {
    this.opened?.database.close();
    this.opened = null;
    this.handedOut = null;
  }

  get estimates(): Estimates {
    return this.handed.estimates;
  }
  get profiles(): Profiles {
    return this.handed.profiles;
  }
  get events(): Events {
    return this.handed.events;
  }
  get alarms(): Alarms {
    return this.handed.alarms;
  }
  get checkpoints(): Checkpoints {
    return this.handed.checkpoints;
  }
  get outbox(): Outbox {
    return this.handed.outbox;
  }
  get offers(): Offers {
    return this.handed.offers;
  }
  get cycles(): Cycles {
    return this.handed.cycles;
  }
  get watch(): WatchViews {
    return this.handed.watch;
  }

  get rewindPoints(): RewindPoints {
    return this.handed.rewindPoints;
  }
  get late(): LateReadings {
    return this.handed.late;
  }
  get rewinds(): Rewinds {
    return this.handed.rewinds;
  }

  /** For what a rewind makes again of a unit. */
  past(unit: UnitDefinition, from_ms: number): Past {
    return new Past(this.parts, unit, from_ms);
  }

  /** What is told outside, for a receiver that keeps its own place in it. */
  eventQueue(receiver: string): EventQueue {
    const queue = new EventQueue(() => this.parts.database, receiver);
    return guarded(queue, (thrown) => (this.mend(thrown) ? queue : null));
  }

  /** A number kept under a name over restarts; null before the first. */
  kept(name: string): number | null {
    const sql = 'SELECT value FROM cursors WHERE name = ?';
    const value = this.ask(() => this.parts.database.prepare(sql).pluck().get(name));
    return (value as number | undefined) ?? null;
  }

  keep(name: string, value: number): void {
    this.write(() =>
      this.parts.database
        .prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)')
        .run(name, value),
    );
  }

  /** Up to when estimates of a unit were lost and are not made again yet [ms]; null where none were. */
  lostBefore(unit: string): number | null {
    return this.kept(lostName(unit));
  }

  /** They are made again. */
  remade(unit: string): void {
    this.parts.database.prepare('DELETE FROM cursors WHERE name = ?').run(lostName(unit));
  }

  /** Runs `write` in one transaction; SQLite's failures become errors of the catalogue. */
  write<T>(write: () => T): T {
    try {
      return this.transact(write);
    } catch (thrown) {
      if (isDamage(thrown)) return this.writeAnew(thrown, write);
      if (thrown instanceof Error && 'code' in thrown && String(thrown.code).startsWith('SQLITE')) {
        throw storeFailure(`writing to the history ${this.file}`, thrown);
      }
      throw thrown;
    }
  }

  private transact<T>(write: () => T): T {
    const isOutermost = !this.isWriting;
    this.isWriting = true;
    try {
      return this.parts.database.transaction(write)();
    } finally {
      if (isOutermost) this.isWriting = false;
    }
  }

  private writeAnew<T>(thrown: unknown, write: () => T): T {
    // Within a transaction of its own caller the outermost one is run again.
    if (this.isWriting || this.opened?.database.inTransaction) throw thrown;
    try {
      this.renew(thrown, false);
      return this.transact(write);
    } catch (again) {
      throw storeFailure(`writing to the history ${this.file}`, again);
    }
  }

  /** Number of the newest journal entry that a saved state has taken in; 0 where there is none. */
  get journalReach(): number {
    const sql = `SELECT max(n) FROM (SELECT max(journal_seq) AS n FROM checkpoints
         UNION ALL SELECT max(journal_seq) FROM rewind_points)`;
    const found = this.ask(() => this.parts.database.prepare(sql).pluck().get());
    return (found as number | null) ?? 0;
  }

  /** See applyRetention. */
  retain(now_ms: number, forwarded: number): RetentionCounts {
    const { database, rollups } = this.parts;
    return this.write(() => applyRetention(database, rollups, this.store, now_ms, forwarded));
  }

  /** Empty pages within the file, which are written to before it grows [bytes]. */
  get emptyBytes(): number {
    return this.ask(() => emptyBytes(this.parts.database));
  }

  /** Thins a piece of estimates that are old enough. See applyRetention. */
  thin(now_ms: number, forwarded: number): Thinned {
    return this.thinAfter(this.store.thin_after_days, now_ms, forwarded);
  }

  /** Thins a piece of estimates before their time. */
  thinEarly(now_ms: number, forwarded: number): Thinned {
    return this.thinAfter(Math.min(1, this.store.thin_after_days), now_ms, forwarded);
  }

  private thinAfter(thin_after_days: number, now_ms: number, forwarded: number): Thinned {
    const { database, rollups } = this.parts;
    const store = { ...this.store, thin_after_days };
    return this.write(() => thinEstimates(database, rollups, store, now_ms, forwarded));
  }

  /** Deletes a piece of the oldest day of what is more than a week old and was forwarded; gives the rows. */
  forgetOldest(now_ms: number, forwarded: number): number {
    const { database, rollups } = this.parts;
    return this.write(() => forgetOldest(database, rollups, now_ms, forwarded));
  }

  /** See takeBack. */
  takeBack(unit: string, after_ms: number): number {
    return this.write(() => takeBack(this.parts, unit, after_ms));
  }

  /** Rolls up a day of what is not yet, as an older version left it; false where there is no such day. */
  rollUp(): boolean {
    return this.write(() => this.parts.rollups.fillBack());
  }

  private get handed(): HandedOut {
    if (!this.handedOut) throw new RangeError('history must be started, got one that is not');
    return this.handedOut;
  }

  private get parts(): HistoryParts {
    if (!this.opened) throw new RangeError('history must be started, got one that is not');
    return this.opened;
  }
}
