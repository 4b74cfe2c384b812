import { GATE_SIGMAS, UNCHANGED_K } from './judge.js';
import { isBelieved, type SensorMemory } from './judgeMemory.js';
import { widen } from './judgeUndo.js';
import { type Candidate, innovation, type JudgeWork } from './judgeWork.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeDrive, TubeModel, TubeState } from './tube.js';

/**
 * Between thermocouples a profile is drawn at its start by guess. Until the front has travelled from
 * one to the next, a reading that lies between what they read at the start shows that guess wrong, not the
 * sensor: with three on a string that is half of a charge.
 */
export interface Start {
  /** What the profile may be on either side of it, as far as the next thermocouples [K]. */
  low_K: number;
  high_K: number;
  /** Way that rock's temperature still has to come from below and above in x until the guess has passed [m]. */
  below_m: number;
  above_m: number;
}

/** What leaps by more than this share of what was guessed in one scan is the sensor, not a front. */
const LEAP_SHARE = 0.1;
/**
 * A front comes step by step: where it goes less than this in a scan [m], a reading that changes by more
 * than so many times what it did in the scan before, and than noise allows, is no front's.
 */
const ANNOUNCED_WAY_M = 0.05;
const ANNOUNCED_TIMES = 3;
/** So near to the entering gas it may have been left by the bed [K]. */
const GAS_K = 8;

/**
 * Way of a guess that has yet to pass a sensor in the direction of the flow [m]; 0 = none. At rest
 * there is one until rock from either side has come.
 */
export function guessLeft(memory: Start, drive: TubeDrive | null): number {
  if (drive === null || drive.massFlux_kg_m2s === 0) {
    return Math.min(memory.below_m, memory.above_m);
  }
  return drive.massFlux_kg_m2s > 0 ? memory.below_m : memory.above_m;
}

/**
 * Widens a tube where readings that its guessed profile may have had stand outside the gate: by what
 * they are off, over half of the way that was guessed. Call before judging.
 *
 * @returns true where a covariance was changed
 */
export function widenGuesses(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  drive: TubeDrive | null,
  time_ms: number,
): boolean {
  let changed = false;
  // Other rock comes only with the gas.
  if (drive === null || drive.massFlux_kg_m2s === 0) return false;
  const slow = travelOf(model, drive) < ANNOUNCED_WAY_M;
  for (const c of work.candidates) {
    const memory = state.sensors[c.tube]?.[c.sensor] as SensorMemory;
    const guess_m = guessLeft(memory, drive);
    if (guess_m === 0 || memory.outside > 0 || !isBelieved(memory)) continue;
    const off = Math.abs(innovation(c));
    const room = GATE_SIGMAS * c.sigma_K;
    if (!(off > room)) continue;
    const read = c.value_K;
    const most = LEAP_SHARE * (memory.high_K - memory.low_K);
    const leap = Math.max(room, slow ? Math.min(most, announced(model, memory, c)) : most);
    // Right after the flow began nothing was used, and the rock went on meanwhile.
    const leapt = Number.isFinite(memory.before_K)
      ? Math.abs(read - memory.before_K) > leap
      : time_ms < memory.unsettled_ms;
    if (leapt || Math.abs(read - drive.inlet_K) < GAS_K) continue;
    if (read < memory.low_K - room || read > memory.high_K + room) continue;
    const tube = model.tubes[c.tube] as TubeModel;
    widen(tube, state.tubes[c.tube] as TubeState, c.sensor, off, guess_m / 2);
    changed = true;
  }
  return changed;
}

/** Way of a front in this scan, at the mid of the temperatures [m]. */
function travelOf({ tables }: StoreModel, drive: TubeDrive): number {
  const s = tables.segments >> 1;
  return (
    (Math.abs(drive.massFlux_kg_m2s) * drive.dt_s * (tables.fluidHeatCapacity[s] as number)) /
    (tables.heatCapacity[s] as number)
  );
}

/**
 * What a reading may change by in this scan as that of the scan before announced it [K]. A value that was
 * only repeated, as where a channel is slower than the scans, announces nothing.
 */
function announced(model: StoreModel, { came_K = 0 }: SensorMemory, c: Candidate): number {
  const came = Math.abs(came_K);
  const deadband_K = model.deadbands_K[c.tube]?.[c.sensor] ?? 0;
  if (!(came > Math.max(UNCHANGED_K, deadband_K))) return Number.POSITIVE_INFINITY;
  // Of two readings: part of what came before was no more than this.
  const noise_K = Math.sqrt(2 * c.variance_K2);
  return GATE_SIGMAS * noise_K + ANNOUNCED_TIMES * Math.max(0, came - noise_K);
}

/** Thermocouples as near as this to one another draw a front as it is: eight along the bed. */
const DENSE_SHARE = 1 / 8;
/** Heat capacity and flow are known to a fifth before anything was learned. */
const ROOM = 1.2;

/** Call before judging: notes the start, and how far the front has gone since. */
export function followStart(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  drive: TubeDrive | null,
): void {
  if (state.settled <= 1) {
    work.candidates.forEach((c, i) => {
      noteStart(model, state.sensors[c.tube]?.[c.sensor] as SensorMemory, work, c, i);
    });
    return;
  }
  if (drive === null || drive.massFlux_kg_m2s === 0) return;
  const travel = travelOf(model, drive);
  const side = drive.massFlux_kg_m2s > 0 ? 'below_m' : 'above_m';
  for (const sensors of state.sensors) {
    for (const memory of sensors) memory[side] = Math.max(0, memory[side] - travel);
  }
}

function noteStart(
  model: StoreModel,
  memory: SensorMemory,
  work: JudgeWork,
  c: Candidate,
  i: number,
): void {
  const { thermocouples } = (model.tubes[c.tube] as TubeModel).string;
  const { reference_cold_K: cold, reference_hot_K: hot, bed } = model.store;
  const place = (k: number): number => thermocouples[k]?.position_m as number;
  const x = place(c.sensor);
  memory.low_K = c.reading.value_K;
  memory.high_K = c.reading.value_K;
  for (const side of [-1, 1]) {
    const next = c.sensor + side;
    const outermost = next < 0 || next >= thermocouples.length;
    const beside = (work.candidates[i + side] as Candidate | undefined)?.reading.value_K as number;
    memory.low_K = Math.min(memory.low_K, outermost ? cold : beside);
    memory.high_K = Math.max(memory.high_K, outermost ? hot : beside);
    const end = side < 0 ? x : bed.length_m - x;
    const gap = outermost ? end : Math.abs(place(next) - x);
    const guess = gap < DENSE_SHARE * bed.length_m ? 0 : ROOM * gap;
    if (side < 0) memory.below_m = guess;
    else memory.above_m = guess;
  }
}
