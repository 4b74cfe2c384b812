import type { SensorVerdict } from '../estimate.js';
import type { Movement } from './judgeMovement.js';
import type { Own } from './judgeOwn.js';
import type { Start } from './judgeStart.js';
import type { Usual } from './judgeUsual.js';

/** What is remembered of one thermocouple to judge it. Plain values, bounded. */
export interface SensorMemory extends Movement, Usual, Start {
  verdict: SensorVerdict | null;
  since_ms: number;
  evidence: string;
  /** Last reading there was, and when; what a profile is drawn from where few report in a scan. */
  seen_K: number;
  seen_ms: number;
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
  /** Innovation when it was last used [K], NaN where it was not since it was believed. */
  inside_K: number;
  /** What it read then [K]; absent in older states. */
  insideRead_K?: number;
  /** Scans in a row that a rejected sensor has looked sound. */
  sound: number;
  /** Times that the value changed since the verdict, capped at SOUND_SCANS. */
  changes: number;
  /** How far it was off when the verdict was given [K]; 0 = not known. */
  off_K: number;
  /** To which side a slow drift went, 0 = it was none; and what it deviated by before that [K]. */
  driftSide: number;
  mended_K: number;
  /** Scans in a row in which a reading of the kind of a wiring fault was seen. */
  miswired: number;
  /** Wild readings that came back within OUTSIDE_SCANS, and when the last one was. */
  spikes: number;
  spike_ms: number;
  /** Step that its card or cold junction has taken [K]; it is taken off the reading. */
  shift_K: number;
  /** When its group was found out, and how, for as long as a step is taken off. */
  groupSince_ms: number;
  groupEvidence: string;
  /** Until when the junction has not followed a change of the flow; the lag then [m]. */
  unsettled_ms: number;
  lag_m: number;
  /** Greatest lags of late, with and against the charge [m]: what its own share of the gas may have put into its place. */
  reachCharge_m: number;
  reachDischarge_m: number;
  /** Time that its own states have been beyond what its class allows [s]; absent in older states. */
  impossible_s?: number;
  /** Scans in a row that fit the gas at the top of the store, not the rock. */
  inGas: number;
  /** Scans in a row in which it and another one moved as if they were swapped, and which other. */
  swapScans: number;
  swapWith: number;
}

/** A sensor of which nothing is known yet: no verdict, no step, temperatures NaN until they are read [K]. */
export function freshSensor(): SensorMemory {
  return {
    verdict: null,
    since_ms: 0,
    evidence: '',
    seen_K: Number.NaN,
    seen_ms: 0,
    last_K: Number.NaN,
    changed_ms: 0,
    moved_K: 0,
    expected_K: Number.NaN,
    outside: 0,
    firstOutside_K: 0,
    inside_K: Number.NaN,
    insideRead_K: Number.NaN,
    sound: 0,
    changes: 0,
    off_K: 0,
    driftSide: 0,
    mended_K: 0,
    miswired: 0,
    spikes: 0,
    spike_ms: 0,
    shift_K: 0,
    groupSince_ms: 0,
    groupEvidence: '',
    unsettled_ms: 0,
    lag_m: Number.NaN,
    reachCharge_m: 0,
    reachDischarge_m: 0,
    inGas: 0,
    swapScans: 0,
    swapWith: -1,
    doubt_ms: 0,
    guess_ms: 0,
    before_K: Number.NaN,
    came_K: Number.NaN,
    read_K: 0,
    modelled_K: 0,
    sinceRead_K: 0,
    sinceModelled_K: 0,
    unread_K: 0,
    assumed_ms: Number.NEGATIVE_INFINITY,
    firstRead_K: Number.NaN,
    firstRock_K: Number.NaN,
    recent_K: Number.NaN,
    usual_K: Number.NaN,
    usualRock_K: Number.NaN,
    usualSigma_K: Number.NaN,
    usualPlace_K: Number.NaN,
    passing: 0,
    usualAge_s: 0,
    beyond_s: 0,
    low_K: Number.NaN,
    high_K: Number.NaN,
    below_m: 0,
    above_m: 0,
  };
}

/** One sensor's reading against what the tube expects. */
export interface SensorEvidence {
  readonly time_ms: number;
  /** Since the scan before [s]. */
  readonly dt_s: number;
  /** NaN = missing. */
  readonly value_K: number;
  /** Other thermocouples of the store delivered in this scan. */
  readonly othersPresent: boolean;
  readonly predicted_K: number;
  /** Standard deviation of the innovation [K]. */
  readonly sigma_K: number;
  /** Of the reading alone [K]; without it the rock is not told from its own offset. */
  readonly noiseSigma_K?: number;
  /** The rock there, told without the sensor's own offset, and its sigma [K]; see Candidate. */
  readonly rock_K: number;
  readonly rockSigma_K: number;
  /** What the errors of its place and its own share of the gas make there, one sigma [K]. */
  readonly placeSigma_K: number;
  /** Coldest and hottest rock that may stand there unseen, less that estimated [K]; absent: none. */
  readonly unseen_K?: readonly [number, number];
  /** Its own offset and place as learned; absent: not looked at. */
  readonly own?: Own;
  /** Prior sigma of an offset, and of one that a group shares [K]. */
  readonly offsetSigma_K: number;
  readonly groupSigma_K: number;
  /** Smallest change that this channel reports [K]. */
  readonly deadband_K: number;
  /** Range of temperatures that the plant can produce [K]. */
  readonly range_K: readonly [number, number];
  /** Sensors beside it deviate to the same side: the profile is off there, not the sensor. */
  readonly supported: boolean;
  /** One beside it has moved to the same side against its rock: the profile is off, not the sensor. */
  readonly movesAlike: boolean;
  /** The profile there is still the guess of its start, between thermocouples; see judgeStart. */
  readonly guessed: boolean;
  /** Gas flows: what stands in a front is passed by it. */
  readonly flowing: boolean;
  /** Gas flows in at a temperature that nothing measures: how the model moves the rock is a guess. */
  readonly inletAssumed?: boolean;
  /** Temperature of the gas that enters at the top, where this is its topmost sensor; else NaN [K]. */
  readonly topGas_K: number;
}

/** A sensor of a shifted group is used like a sound one, without the step of its group. */
export const isBelieved = (memory: SensorMemory): boolean =>
  memory.verdict === null || memory.verdict === 'group_fault';

/** Gives a verdict; `off_K` is how far off it was, 0 where that is not known. */
export function set(
  memory: SensorMemory,
  verdict: SensorVerdict,
  time_ms: number,
  evidence: string,
  off_K: number,
): void {
  memory.verdict = verdict;
  memory.since_ms = time_ms;
  memory.evidence = evidence;
  memory.off_K = Math.abs(off_K);
  memory.driftSide = 0;
  memory.sound = 0;
  memory.changes = 0;
}

/** A verdict in place of another for the same fault keeps its time. */
export function rename(
  memory: SensorMemory,
  verdict: SensorVerdict,
  time_ms: number,
  evidence: string,
  off_K: number,
): void {
  const since = isBelieved(memory) ? time_ms : memory.since_ms;
  set(memory, verdict, since, evidence, off_K);
}

/** How long a sensor is not judged after one beside it was found out: the passage of a front. */
const DOUBT_MS = 3 * 3600_000;

/** One beside it was found out: what it usually deviated by was measured against a bent profile. */
export function doubtBeside(memory: SensorMemory, time_ms: number): void {
  memory.doubt_ms = time_ms + DOUBT_MS;
  memory.outside = 0;
  memory.usual_K = Number.NaN;
  memory.beyond_s = 0;
}

/** Marks a sensor for what its whole group shows, beside what it shows itself; see judgeGroup. */
export function shiftWithGroup(
  memory: SensorMemory,
  time_ms: number,
  evidence: string,
  by_K: number,
): void {
  memory.shift_K += by_K;
  memory.groupSince_ms = time_ms;
  memory.groupEvidence = evidence;
  if (isBelieved(memory)) set(memory, 'group_fault', time_ms, evidence, 0);
  memory.outside = 0;
}

/** The group's offset is back within its class. */
export function releaseFromGroup(memory: SensorMemory): void {
  memory.shift_K = 0;
  memory.groupSince_ms = 0;
  memory.groupEvidence = '';
  if (memory.verdict === 'group_fault') clear(memory);
}

/** Ends the sensor's own verdict; while a step of its group is taken off [K], that verdict shows again. */
export function clear(memory: SensorMemory): void {
  const shifted = memory.shift_K !== 0;
  memory.verdict = shifted ? 'group_fault' : null;
  if (shifted) memory.since_ms = memory.groupSince_ms;
  memory.evidence = shifted ? memory.groupEvidence : '';
  memory.outside = 0;
  memory.sound = 0;
  memory.off_K = 0;
  memory.driftSide = 0;
  memory.inside_K = Number.NaN;
  memory.insideRead_K = Number.NaN;
  memory.miswired = 0;
  memory.spikes = 0;
  memory.inGas = 0;
  memory.beyond_s = 0;
  memory.recent_K = Number.NaN;
}
