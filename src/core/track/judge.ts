import type { SensorVerdict } from '../estimate.js';

/** What is remembered of one thermocouple to judge it. Plain values, bounded. */
export interface SensorMemory {
  verdict: SensorVerdict | null;
  since_ms: number;
  evidence: string;
  /** Last reading, and when it last changed [K]. */
  last_K: number;
  changed_ms: number;
  /**
   * How far the bed model alone has moved the rock beside it since then [K]: the sum of its steps,
   * not the change of the estimate, which a frozen reading holds back.
   */
  moved_K: number;
  /** What the estimate expected after the last scan [K], NaN before the first. */
  expected_K: number;
  /** Scans in a row outside the gate, and the innovation at the first of them [K]. */
  outside: number;
  firstOutside_K: number;
  /** Scans in a row that a rejected sensor has looked sound. */
  sound: number;
  /** Times that the value changed since the verdict, capped at SOUND_SCANS. */
  changes: number;
}

export function freshSensor(): SensorMemory {
  return {
    verdict: null,
    since_ms: 0,
    evidence: '',
    last_K: Number.NaN,
    changed_ms: 0,
    moved_K: 0,
    expected_K: Number.NaN,
    outside: 0,
    firstOutside_K: 0,
    sound: 0,
    changes: 0,
  };
}

/** One sensor's reading against what the tube expects. */
export interface SensorEvidence {
  readonly time_ms: number;
  /** NaN = missing. */
  readonly value_K: number;
  /** Other thermocouples of the store delivered in this scan. */
  readonly othersPresent: boolean;
  readonly predicted_K: number;
  /** Standard deviation of the innovation [K]. */
  readonly sigma_K: number;
  /** Smallest change that this channel reports [K]. */
  readonly deadband_K: number;
  /** Range of temperatures that the plant can produce [K]. */
  readonly range_K: readonly [number, number];
  /** Sensors beside it deviate to the same side: the profile is off there, not the sensor. */
  readonly supported: boolean;
}

/** Scans and limits of the judgement. */
export const GATE_SIGMAS = 4.5;
const OUTSIDE_SCANS = 5;
const SOUND_SIGMAS = 3;
const SOUND_SCANS = 20;
const STUCK_S = 600;
/** A stuck sensor must have moved this often again before it is believed. */
const STUCK_CHANGES = 5;
const STUCK_MIN_MOVE_K = 4;
/** An unchanged reading is not used once the rock should have moved by this [K]. */
const SUSPECT_MOVE_K = 1.5;
/** A reading that repeats within this is unchanged: below the resolution of usual input cards. */
const UNCHANGED_K = 0.01;

/** `soften`: use it with its variance enlarged, since it deviates far but is borne out by others. */
export type Judgement = 'use' | 'soften' | 'leave_out';

/**
 * Judges one thermocouple in one scan: whether its reading may be used, and its verdict.
 *
 * - `open`: missing while others of the store deliver; ends with the next reading.
 * - `burst`: outside the range that the plant can produce.
 * - `stuck`: unchanged for 10 min or more while the bed model has moved the rock beside it by more
 *   than 4 K and six sigma of the innovation; it is left out from 1.5 K on. A value that is rightly
 *   steady is never stuck.
 * - `offset` / `drifting`: five scans in a row outside 4.5 sigma without support from the sensors
 *   beside it; drifting where the innovation grew by a third or more since the first of them.
 *
 * A rejected sensor returns after 20 scans in a row within 3 sigma; a stuck one must also have
 * changed its value again, since the rock passes its frozen value twice in every cycle.
 */
export function judgeSensor(memory: SensorMemory, evidence: SensorEvidence): Judgement {
  const { value_K: value, time_ms } = evidence;
  if (!Number.isFinite(value)) {
    if (evidence.othersPresent && memory.verdict === null) {
      set(memory, 'open', time_ms, 'no reading while others of the store deliver');
    }
    memory.outside = 0;
    return 'leave_out';
  }
  if (memory.verdict === 'open') clear(memory);
  const [low, high] = evidence.range_K;
  if (value < low || value > high) {
    if (memory.verdict !== 'burst') {
      const shown = (value - 273.15).toFixed(1);
      set(memory, 'burst', time_ms, `reads ${shown} degC, beyond what the plant can produce`);
    }
    memory.sound = 0;
    return 'leave_out';
  }
  followChange(memory, evidence);
  const innovation = value - evidence.predicted_K;
  const within = Math.abs(innovation) <= GATE_SIGMAS * evidence.sigma_K;
  if (memory.verdict === null) return judgeSound(memory, evidence, innovation, within);
  if (Math.abs(innovation) <= SOUND_SIGMAS * evidence.sigma_K && !isStuck(memory, evidence)) {
    memory.sound++;
    const moves = memory.verdict !== 'stuck' || memory.changes >= STUCK_CHANGES;
    if (memory.sound >= SOUND_SCANS && moves) clear(memory);
  } else memory.sound = 0;
  return 'leave_out';
}

function judgeSound(
  memory: SensorMemory,
  evidence: SensorEvidence,
  innovation: number,
  within: boolean,
): Judgement {
  if (isStuck(memory, evidence)) {
    const moved = Math.abs(memory.moved_K);
    const minutes = Math.round((evidence.time_ms - memory.changed_ms) / 60_000);
    set(
      memory,
      'stuck',
      evidence.time_ms,
      `unchanged for ${minutes} min while the rock there moved by ${moved.toFixed(1)} K`,
    );
    return 'leave_out';
  }
  if (Math.abs(memory.moved_K) > Math.max(SUSPECT_MOVE_K, 2 * evidence.deadband_K)) {
    return 'leave_out';
  }
  if (within || evidence.supported) {
    memory.outside = 0;
    return within ? 'use' : 'soften';
  }
  if (memory.outside === 0) memory.firstOutside_K = innovation;
  memory.outside++;
  if (memory.outside >= OUTSIDE_SCANS) {
    const grown = Math.abs(innovation) > 1.33 * Math.abs(memory.firstOutside_K);
    const sigmas = Math.abs(innovation) / evidence.sigma_K;
    set(
      memory,
      grown ? 'drifting' : 'offset',
      evidence.time_ms,
      `${innovation.toFixed(1)} K from the estimate (${sigmas.toFixed(1)} sigma) for ${memory.outside} scans`,
    );
  }
  return 'leave_out';
}

function followChange(memory: SensorMemory, evidence: SensorEvidence): void {
  const threshold = Math.max(UNCHANGED_K, evidence.deadband_K);
  if (!(Math.abs(evidence.value_K - memory.last_K) <= threshold)) {
    memory.last_K = evidence.value_K;
    memory.changed_ms = evidence.time_ms;
    memory.moved_K = 0;
    if (memory.verdict !== null && memory.changes < SOUND_SCANS) memory.changes++;
  } else if (Number.isFinite(memory.expected_K)) {
    memory.moved_K += evidence.predicted_K - memory.expected_K;
  }
}

function isStuck(memory: SensorMemory, evidence: SensorEvidence): boolean {
  if (evidence.time_ms - memory.changed_ms < STUCK_S * 1000) return false;
  const moved = Math.abs(memory.moved_K);
  return moved > Math.max(STUCK_MIN_MOVE_K, 6 * evidence.sigma_K, 2 * evidence.deadband_K);
}

function set(
  memory: SensorMemory,
  verdict: SensorVerdict,
  time_ms: number,
  evidence: string,
): void {
  memory.verdict = verdict;
  memory.since_ms = time_ms;
  memory.evidence = evidence;
  memory.sound = 0;
  memory.changes = 0;
}

/** Rejects a sensor for what its whole group shows; see groupFaults. */
export function rejectWithGroup(memory: SensorMemory, time_ms: number, evidence: string): void {
  if (memory.verdict === null) set(memory, 'group_fault', time_ms, evidence);
}

function clear(memory: SensorMemory): void {
  memory.verdict = null;
  memory.evidence = '';
  memory.outside = 0;
  memory.sound = 0;
}
