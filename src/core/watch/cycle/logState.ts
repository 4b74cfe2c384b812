import type { Direction, Mode, UnitDefinition } from '../../definitions.js';
import type { CycleRules } from './cycleScan.js';
import type { Ends } from './ends.js';
import { type Moments, startMoments } from './moments.js';
import type { Rates, Stretch } from './stretch.js';

/** Shortest standing that is a stand of its own: below a trading block, above a change-over [s]. */
const PAUSE_S = 600;
/** Running that begins a run: so long and so many scans, as no flicker of a mode is. */
const CONFIRM_S = 120;
export const CONFIRM_SCANS = 2.5;
/** So many scans without a reading leave a run complete. */
const GAP_SCANS = 5;

/** What the cycle log remembers of a unit. Plain and bounded. */
export interface CycleLogState {
  /** Number of the last record. */
  no: number;
  mode: Mode;
  begunBefore: boolean;
  /** The run that is under way; null before every store has started. */
  open: Stretch | null;
  /** What followed it, as long as it may be a pause or a flicker. */
  beside: Stretch | null;
  /** Evidence that the run is over, and that one in a direction has begun [s]. */
  against_s: number;
  readonly running_s: Record<Direction, number>;
  last: Ends | null;
  rates: Rates | null;
  /** Time since power was read [s]. */
  power_age_s: number;
  /** The unit at the last scan with any reading, and the time of the last one with a thermocouple [ms]. */
  seen: Ends | null;
  bed_ms: number | null;
  /** Sums over all time since the moments began [MWh_el]. */
  drawn_MWh: number;
  delivered_MWh: number;
  moments: Moments;
}

export function startCycleLog(): CycleLogState {
  return {
    ...{ no: 0, mode: 'stand', begunBefore: true, open: null, beside: null, against_s: 0 },
    running_s: { charge: 0, discharge: 0 },
    ...{ last: null, rates: null, power_age_s: 0, seen: null, bed_ms: null },
    ...{ drawn_MWh: 0, delivered_MWh: 0, moments: startMoments() },
  };
}

/**
 * How runs of a unit are told apart. A run is over once it has stood for 10 min, and for longer than a
 * change-over with a warm start takes, so that neither these nor a ramp end one; never for less than five
 * scans. One in a direction has begun after two minutes and three scans.
 */
export function cycleRules(unit: UnitDefinition): CycleRules {
  const scan_s = unit.scan_period_s;
  const operation = unit.limits.operation;
  const over_s = operation ? operation.change_over_s + operation.start.warm.time_s + CONFIRM_S : 0;
  return {
    unit: unit.id,
    pause_s: Math.max(PAUSE_S, GAP_SCANS * scan_s, over_s),
    confirm_s: Math.max(CONFIRM_S, CONFIRM_SCANS * scan_s),
    gap_s: GAP_SCANS * scan_s,
    scan_s: 2 * scan_s,
  };
}
