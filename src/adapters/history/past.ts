import type { UnitDefinition } from '../../core/definitions.js';
import type { Estimate, ProfileView } from '../../core/estimate.js';
import type { WatchView } from '../../core/watch/causes.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import { LEVELS_MS } from './buckets.js';
import type { Cycles } from './cycles.js';
import type { Database } from './database.js';
import type { Estimates } from './estimates.js';
import type { Profiles } from './profiles.js';
import type { Rewinds } from './rewinds.js';
import type { Rollups } from './rollups.js';
import type { Measured } from './series.js';
import { WatchViews } from './watchViews.js';

interface Parts {
  readonly database: Database;
  readonly estimates: Estimates;
  readonly rollups: Rollups;
  readonly profiles: Profiles;
  readonly cycles: Cycles;
  readonly rewinds: Rewinds;
}

/** A scan that was made again. */
export interface ScanAgain {
  readonly estimate: Estimate;
  readonly measured: Measured;
  readonly profile: ProfileView | null;
  readonly watch?: WatchView | undefined;
  readonly cycle?: CycleRecord | undefined;
}

/** Roll-ups are made anew in pieces of this length [ms]. */
const PIECE_MS = LEVELS_MS[1];

/**
 * Rewrites what the history has of a unit, scan by scan from a time on: estimates, profiles, views of
 * the watch, runs, roll-ups. Begun again after a kill it comes to the same, and what was rewritten
 * before does not get another revision. To be called within transactions.
 */
export class Past {
  /** Estimates that have changed. */
  revised = 0;
  /** Estimates that were lost and are there again, and times of the first and the last of them [ms]. */
  filled = 0;
  filledFrom_ms: number | null = null;
  filledTo_ms: number | null = null;
  private reached_ms: number;
  private rolled_ms: number;
  private isWithdrawn = false;
  private readonly watch: WatchViews;
  private readonly runs = new Set<number>();

  /** @param from_ms no scan that is made again has a time before it */
  constructor(
    private readonly parts: Parts,
    private readonly unit: UnitDefinition,
    readonly from_ms: number,
  ) {
    this.reached_ms = from_ms;
    this.rolled_ms = from_ms;
    this.watch = new WatchViews(parts.database);
  }

  /**
   * Enters the next scan.
   * @param end_ms the next scan has no time before it
   * @param newest_ms of the newest estimate there is
   */
  enter(
    { estimate, measured, profile, watch, cycle }: ScanAgain,
    end_ms: number,
    newest_ms: number,
  ) {
    const { estimates, profiles, cycles, rewinds } = this.parts;
    const span = { from_ms: this.reached_ms, end_ms };
    const { id } = this.unit;
    if (!this.isWithdrawn && estimates.differs(this.unit, estimate, span)) {
      rewinds.withdraw(id, span.from_ms, Math.max(newest_ms, end_ms - 1));
      this.isWithdrawn = true;
    }
    if (estimates.revise(this.unit, estimate, measured, span, this.isWithdrawn)) this.revised++;
    if (profile) profiles.revise(profile, span.from_ms);
    this.watch.forget(id, span.from_ms, end_ms);
    if (watch) this.watch.add(watch);
    if (cycle) {
      cycles.revise(cycle);
      this.runs.add(Date.parse(cycle.from));
    }
    this.reached_ms = end_ms;
    if (end_ms - this.rolled_ms >= PIECE_MS) this.roll();
  }

  /** Enters a scan that was lost; where there is an estimate of its time nothing changes. */
  fill({ estimate, measured, profile, watch, cycle }: ScanAgain): void {
    const { estimates, profiles, cycles } = this.parts;
    const time_ms = Date.parse(estimate.time);
    const told = estimates.dispatchAt(this.unit.id, time_ms);
    const whole = told === null ? estimate : { ...estimate, dispatch: told };
    if (estimates.add(this.unit, whole, measured)) {
      this.filled++;
      this.filledFrom_ms ??= time_ms;
      this.filledTo_ms = time_ms;
    }
    if (profile) profiles.add(profile);
    if (watch) this.watch.add(watch);
    if (cycle) cycles.add(cycle);
  }

  /** The last scan is entered: what was told beyond is void. */
  end(): void {
    this.roll();
    const span = { from_ms: this.from_ms, end_ms: this.reached_ms };
    this.parts.cycles.forget(this.unit.id, span, this.runs);
  }

  private roll(): void {
    this.parts.rollups.redo(this.unit.id, this.rolled_ms, this.reached_ms);
    this.rolled_ms = this.reached_ms;
  }
}
