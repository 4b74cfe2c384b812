import { clear, isBelieved, type SensorEvidence, type SensorMemory, set } from './judgeMemory.js';
import { followMovement, movesAsRock } from './judgeMovement.js';
import { ownFault } from './judgeOwn.js';
import { followUsual, usualFault } from './judgeUsual.js';
import { judgeWiring, WIRING } from './judgeWiring.js';

export {
  doubtBeside,
  freshSensor,
  isBelieved,
  releaseFromGroup,
  rename,
  type SensorEvidence,
  type SensorMemory,
  shiftWithGroup,
} from './judgeMemory.js';

/** Scans and limits of the judgement. */
export const GATE_SIGMAS = 4.5;
const OUTSIDE_SCANS = 5;
const SOUND_SIGMAS = 3;
const SOUND_SCANS = 20;
/** An offset within the class: two sigma are its tolerance. */
const CLASS_SIGMAS = 2;
const STUCK_S = 600;
/** A stuck sensor must have moved this often again before it is believed. */
const STUCK_CHANGES = 5;
const STUCK_MIN_MOVE_K = 4;
/** An unchanged reading is not used once the rock should have moved by this [K]. */
const SUSPECT_MOVE_K = 1.5;
/** A reading that repeats within this is unchanged: below the resolution of usual input cards. */
export const UNCHANGED_K = 0.01;
/** Wild readings within an hour of one another that make an outlier, and the least of them [K]. */
const SPIKES = 3;
const SPIKE_MS = 3600_000;
const SPIKE_K = 5;
/** Gas and reading agree within this, rock and gas differ by more [K]; scans in a row. */
const IN_GAS_K = 4;
const IN_GAS_SCANS = 5;

/** `soften`: use it with its variance enlarged, since it deviates far but is borne out by others. */
export type Judgement = 'use' | 'soften' | 'leave_out';

/**
 * Judges one thermocouple in one scan: whether its reading may be used, and its verdict.
 *
 * - `open`: missing while others of the store deliver; ends with the next reading.
 * - `reversed`: reads as far below its cold junction as the rock is above it: three scans in which
 *   its value moved against the rock by as much, or stood mirrored by more than 40 K.
 * - `burst`: outside the range that the plant can produce.
 * - `stuck`: unchanged for 10 min or more while the bed model has moved the rock beside it by more
 *   than 4 K and six sigma of the innovation; it is left out from 1.5 K on. A value that is rightly
 *   steady is never stuck.
 * - `uncovered`: the topmost reads as the gas that enters there and not as rock, for five scans.
 * - `offset` / `drifting`: five scans in a row outside 4.5 sigma without support from the sensors
 *   beside it; drifting where the innovation grew by a third or more since the first of them, and by
 *   more than it had leapt at that first. Slow drift and an offset beyond the class are told by its
 *   usual deviation (see judgeUsual), and where a front never passes by what the filter had to take for
 *   the sensor's own (see judgeOwn). What rock unseen between thermocouples would explain is no fault,
 *   unless the reading leapt there (see judgeReach).
 * - `wrong_type`: it was off, and reads what another type's table makes of the rock's temperature.
 * - `outlier`: three wild readings, each back within five scans, none more than an hour from the next.
 *
 * A rejected sensor returns after 20 scans in a row within 3 sigma and within half of what it was off
 * by (a slow drift: back by half of what it moved by from what was usual), taken where the rest tells
 * the rock well enough to show that; a stuck one must also have changed its value again, since the
 * rock passes its frozen value twice in every cycle, and a wrongly wired one must have followed the
 * rock's movement.
 */
export function judgeSensor(memory: SensorMemory, evidence: SensorEvidence): Judgement {
  const { value_K: value, time_ms } = evidence;
  if (!Number.isFinite(value)) {
    if (evidence.othersPresent && isBelieved(memory)) {
      set(memory, 'open', time_ms, 'no reading while others of the store deliver', 0);
    }
    memory.outside = 0;
    followMovement(memory, evidence);
    return 'leave_out';
  }
  if (memory.verdict === 'open') clear(memory);
  const innovation = value - evidence.predicted_K;
  followMovement(memory, evidence);
  const miswired = judgeWiring(memory, evidence, innovation);
  const [low, high] = evidence.range_K;
  if (value < low || value > high) {
    if (memory.verdict !== 'burst' && !WIRING.includes(memory.verdict)) {
      const shown = (value - 273.15).toFixed(1);
      const text = `reads ${shown} degC, beyond what the plant can produce`;
      set(memory, 'burst', time_ms, text, innovation);
    }
    memory.sound = 0;
    return 'leave_out';
  }
  followChange(memory, evidence);
  if (miswired && isBelieved(memory)) return 'leave_out';
  if (isBelieved(memory)) return judgeSound(memory, evidence, innovation);
  if (memory.verdict === 'outlier') {
    if (Math.abs(innovation) > GATE_SIGMAS * evidence.sigma_K) memory.spike_ms = time_ms;
    if (time_ms - memory.spike_ms > SPIKE_MS) clear(memory);
    return 'leave_out';
  }
  judgeRecovery(memory, evidence, innovation);
  return 'leave_out';
}

function judgeRecovery(memory: SensorMemory, evidence: SensorEvidence, innovation: number): void {
  const off = Math.abs(innovation);
  const limit = memory.off_K > 0 ? memory.off_K / 2 : Number.POSITIVE_INFINITY;
  const side = memory.driftSide;
  const away = side === 0 ? off : side * (innovation - memory.mended_K);
  if (off > SOUND_SIGMAS * evidence.sigma_K || away > limit || isStuck(memory, evidence)) {
    memory.sound = 0;
    return;
  }
  // Where what it was off by would not stand outside the gate, nothing is learned. Its own offset is
  // that of a stranger again and no part of it: only how well the rest tells the rock there is.
  const told = Math.hypot(evidence.rockSigma_K, evidence.noiseSigma_K ?? Number.POSITIVE_INFINITY);
  if (GATE_SIGMAS * Math.min(told, evidence.sigma_K) > 2 * limit) return;
  if (WIRING.includes(memory.verdict)) {
    if (memory.sound === 0) memory.read_K = memory.modelled_K = 0;
    else if (!movesAsRock(memory)) {
      memory.sound = Math.min(memory.sound + 1, SOUND_SCANS - 1);
      return;
    }
  }
  memory.sound++;
  const moves = memory.verdict !== 'stuck' || memory.changes >= STUCK_CHANGES;
  if (memory.sound < SOUND_SCANS || !moves) return;
  // A mended or exchanged one has an offset of its own, and what was usual may have been learned wrong.
  if (side !== 0) memory.usual_K = Number.NaN;
  clear(memory);
}

function judgeSound(memory: SensorMemory, evidence: SensorEvidence, innovation: number): Judgement {
  const { time_ms } = evidence;
  if (isStuck(memory, evidence)) {
    const moved = Math.abs(memory.moved_K);
    const minutes = Math.round((time_ms - memory.changed_ms) / 60_000);
    const text = `unchanged for ${minutes} min while the rock there moved by ${moved.toFixed(1)} K`;
    set(memory, 'stuck', time_ms, text, 0);
    return 'leave_out';
  }
  if (Math.abs(memory.moved_K) > Math.max(SUSPECT_MOVE_K, 2 * evidence.deadband_K)) {
    return 'leave_out';
  }
  // The junction has not yet followed the gas that no longer flows, or flows anew.
  if (time_ms < memory.unsettled_ms) {
    if (!hasLeapt(memory, evidence, innovation)) noteInside(memory, evidence, innovation);
    return 'leave_out';
  }
  followUsual(memory, evidence);
  const supported = evidence.supported || time_ms < memory.doubt_ms;
  const fault = (supported ? null : usualFault(memory, evidence)) ?? ownFault(memory, evidence);
  if (fault !== null) {
    set(memory, fault.verdict, time_ms, fault.evidence, fault.off_K);
    if (fault.verdict === 'drifting') {
      memory.driftSide = Math.sign(memory.recent_K - memory.usual_K);
      // What its class does not allow was no offset of its own: it was learned from a bent profile.
      const own = Math.abs(memory.usual_K) <= CLASS_SIGMAS * evidence.offsetSigma_K;
      memory.mended_K = own ? memory.usual_K : 0;
    }
    return 'leave_out';
  }
  const within = Math.abs(innovation) <= GATE_SIGMAS * evidence.sigma_K;
  if (within || supported) {
    if (within && memory.outside > 0) countSpike(memory, evidence);
    if (memory.verdict === 'outlier') return 'leave_out';
    memory.outside = 0;
    memory.inGas = 0;
    noteInside(memory, evidence, innovation);
    return within ? 'use' : 'soften';
  }
  if (memory.outside === 0 && isUnseen(memory, evidence, innovation)) {
    memory.inGas = 0;
    noteInside(memory, evidence, innovation);
    return 'soften';
  }
  if (memory.outside === 0) memory.firstOutside_K = innovation;
  memory.outside++;
  const gas = evidence.topGas_K;
  const inGas =
    Math.abs(evidence.value_K - gas) < IN_GAS_K &&
    Math.abs(evidence.predicted_K - gas) > 2 * IN_GAS_K;
  memory.inGas = inGas ? memory.inGas + 1 : 0;
  if (memory.inGas >= IN_GAS_SCANS) {
    const text = `reads ${(evidence.value_K - 273.15).toFixed(1)} degC like the gas that enters there, ${Math.abs(innovation).toFixed(1)} K from the rock`;
    set(memory, 'uncovered', time_ms, text, innovation);
  } else if (memory.outside >= OUTSIDE_SCANS) {
    const sigmas = Math.abs(innovation) / evidence.sigma_K;
    const text = `${innovation.toFixed(1)} K from the estimate (${sigmas.toFixed(1)} sigma) for ${memory.outside} scans`;
    set(memory, hasGrown(memory, innovation) ? 'drifting' : 'offset', time_ms, text, innovation);
  }
  return 'leave_out';
}

/**
 * True where rock that stands within the reach of what no other thermocouple sees (judgeReach) would
 * read like this, and the reading came there step by step, as a front does.
 */
function isUnseen(memory: SensorMemory, evidence: SensorEvidence, innovation: number): boolean {
  const { unseen_K, sigma_K, noiseSigma_K } = evidence;
  if (unseen_K === undefined || noiseSigma_K === undefined) return false;
  const beyond = Math.sign(innovation) * (innovation - unseen_K[innovation > 0 ? 1 : 0]);
  if (!(beyond <= GATE_SIGMAS * sigma_K)) return false;
  return !hasLeapt(memory, evidence, innovation);
}

/** What it deviated by and read when it was used, or when it was let settle and had not leapt. */
function noteInside(memory: SensorMemory, { value_K }: SensorEvidence, innovation: number): void {
  memory.inside_K = innovation;
  memory.insideRead_K = value_K;
}

/**
 * A sensor that steps takes its reading and its deviation along. Where the deviation alone has jumped,
 * as at a change of the flow, the estimate has; where the reading alone has, the rock.
 */
function hasLeapt(memory: SensorMemory, evidence: SensorEvidence, innovation: number): boolean {
  const { value_K, noiseSigma_K = Number.POSITIVE_INFINITY } = evidence;
  const deviation = Math.abs(innovation - memory.inside_K);
  const reading = Math.abs(value_K - (memory.insideRead_K ?? Number.NaN));
  return Math.min(deviation, reading) > GATE_SIGMAS * Math.SQRT2 * noiseSigma_K;
}

/**
 * A drift comes step by step: four more scans add more than the one before them did. What leapt
 * and then grew by less is a step that a front passes.
 */
function hasGrown(memory: SensorMemory, innovation: number): boolean {
  const first = Math.abs(memory.firstOutside_K);
  const since = Math.abs(innovation) - first;
  const leapt = Math.abs(memory.firstOutside_K - memory.inside_K);
  return since > 0.33 * first && !(leapt > since);
}

/** A wild reading has come back: three within an hour of one another are no chance. */
function countSpike(memory: SensorMemory, evidence: SensorEvidence): void {
  const { time_ms } = evidence;
  if (Math.abs(memory.firstOutside_K) < SPIKE_K) return;
  memory.spikes = time_ms - memory.spike_ms > SPIKE_MS ? 1 : memory.spikes + 1;
  memory.spike_ms = time_ms;
  if (memory.spikes < SPIKES) return;
  const text = `${memory.spikes} wild readings that came back, the last one off by ${memory.firstOutside_K.toFixed(1)} K`;
  set(memory, 'outlier', time_ms, text, memory.firstOutside_K);
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
