import type { EventKind, WatchEvent } from '../watch/event.js';

/** What a rewind says otherwise of an alarm or alert than was told; what was told stays told. */
export interface RewindDifference {
  readonly id: string;
  readonly kind: EventKind;
  readonly transition: WatchEvent['transition'];
  /** ISO 8601 UTC, source time. */
  readonly time: string;
  /** true: it was told, and with the late readings it did not happen; false: the other way round. */
  readonly told: boolean;
}

/** A rewind of a unit: which scans were made again with readings that came late, and what it changed. */
export interface RewindRecord {
  readonly unit: string;
  /** When it was done, ISO 8601 UTC by the machine's clock. */
  readonly done: string;
  /** Source times of the first and the last scan that was made again, ISO 8601 UTC. */
  readonly from: string;
  readonly to: string;
  readonly scans: number;
  /** Late readings that are now in their scans. */
  readonly late_used: number;
  /** Estimates that have changed, and the greatest revision that one has since. */
  readonly revised: number;
  readonly revision: number;
  /** At most `MOST_DIFFERENCES`; `differences_left_out` are more. */
  readonly differences: readonly RewindDifference[];
  readonly differences_left_out: number;
  /** Where the unit was put back to a backup: of when its state is, and who did it; else absent. */
  readonly restored?: { readonly state_of: string; readonly who: string };
  /**
   * Where a damaged history had lost them: estimates that are there again, and whether no saved state was
   * left, so that they are of an estimator begun anew; else absent.
   */
  readonly remade?: { readonly estimates: number; readonly afresh: boolean };
}

export const MOST_DIFFERENCES = 100;
