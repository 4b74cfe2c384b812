import {
  GATE_SIGMAS,
  isBelieved,
  type Judgement,
  judgeSensor,
  type SensorEvidence,
  type SensorMemory,
} from './judge.js';
import { ownOf } from './judgeOwn.js';
import { ownReach, unseenRange, unseenReach } from './judgeReach.js';
import { guessLeft } from './judgeStart.js';
import { judgeSwaps } from './judgeSwap.js';
import { type Candidate, innovation, type JudgeWork, SHARE_SIGMA } from './judgeWork.js';
import type { AcceptedReading } from './readingUpdate.js';
import { plausibleRange } from './storeStart.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeDrive, TubeModel, TubeState } from './tube.js';

export const memoryOf = (state: StoreState, c: Candidate): SensorMemory =>
  state.sensors[c.tube]?.[c.sensor] as SensorMemory;

export type Accepted = AcceptedReading & { readonly tube: number };

/** Judges every thermocouple; returns those whose reading may be used, with their variances. */
export function judgeAll(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  drive: TubeDrive | null,
  time_ms: number,
): Accepted[] {
  const { candidates } = work;
  const range_K = plausibleRange(model);
  let present = 0;
  for (const c of candidates) if (Number.isFinite(c.value_K)) present++;
  const judgements = candidates.map((c): Judgement => {
    const tube = model.tubes[c.tube] as TubeModel;
    const reach_m = unseenReach(model, state, work, c);
    const evidence: SensorEvidence = {
      time_ms,
      dt_s: drive?.dt_s ?? 0,
      value_K: c.value_K,
      othersPresent: present > 0,
      predicted_K: c.reading.value_K,
      sigma_K: c.sigma_K,
      noiseSigma_K: Math.sqrt(c.variance_K2),
      rock_K: c.rock_K,
      rockSigma_K: c.rockSigma_K,
      placeSigma_K: Math.hypot(
        tube.estimator.position_sigma_m * c.reading.slope_K_m,
        SHARE_SIGMA * gasApart(model, memoryOf(state, c), c, drive),
      ),
      own: ownOf(model, state, work, c, ownReach(reach_m)),
      unseen_K: unseenAround(model, state, c, reach_m),
      offsetSigma_K: tube.estimator.offset_sigma_K,
      groupSigma_K: tube.estimator.group_offset_sigma_K,
      deadband_K: model.deadbands_K[c.tube]?.[c.sensor] ?? 0,
      range_K,
      supported: isSupported(state, work, c),
      movesAlike: movesAlike(state, work, c),
      guessed: guessLeft(memoryOf(state, c), drive) > 0,
      flowing: drive !== null && drive.massFlux_kg_m2s !== 0,
      inletAssumed: drive !== null && drive.massFlux_kg_m2s !== 0 && drive.inletSigma_K > 0,
      topGas_K: topGas(model, state, c, drive),
    };
    return judgeSensor(memoryOf(state, c), evidence);
  });
  const suspects = new Uint8Array(candidates.length);
  judgeSwaps(work, state.sensors.flat(), time_ms, suspects);
  const accepted: Accepted[] = [];
  candidates.forEach((c, i) => {
    const judgement = judgements[i] as Judgement;
    if (judgement === 'leave_out' || suspects[i] === 1) return;
    const innovation_K = innovation(c);
    let { variance_K2 } = c;
    // Enlarged until the innovation is three of its sigmas: it pulls, but not by its full length.
    if (judgement === 'soften') variance_K2 += innovation_K ** 2 / 9 - c.sigma_K ** 2;
    const { tube, sensor, reading, v } = c;
    accepted.push({ tube, sensor, reading, v, innovation_K, variance_K2 });
  });
  return accepted;
}

/** What the rock beside it may be by, unseen; looked at for the few that stand outside the gate. */
function unseenAround(
  model: StoreModel,
  state: StoreState,
  c: Candidate,
  reach_m: number,
): readonly [number, number] {
  if (!(reach_m > 0) || !(Math.abs(innovation(c)) > GATE_SIGMAS * c.sigma_K)) return SEEN;
  const tube = model.tubes[c.tube] as TubeModel;
  const tubeState = state.tubes[c.tube] as TubeState;
  const { layout } = tube;
  const learned_m = tubeState.further[layout.position + c.sensor - layout.cells] as number;
  return unseenRange(tube, tubeState, c.position_m + learned_m, reach_m);
}

const SEEN = [0, 0] as const;

/**
 * How far the gas at a junction may be from its rock [K]: the rock a lag upstream, to first order, and
 * where the flow has turned, what was taken for its place in the other direction as well;
 * within a few lags of the inlet the gas still has what it entered with, e^(-z/l) of the difference.
 */
export function gasApart(
  model: StoreModel,
  memory: SensorMemory,
  c: Candidate,
  drive: TubeDrive | null,
): number {
  const reach = memory.reachCharge_m + memory.reachDischarge_m;
  const behind = reach * Math.abs(c.reading.slope_K_m);
  const lag = Math.abs(c.reading.lag_m);
  if (drive === null || drive.massFlux_kg_m2s === 0 || !(lag > 0)) return behind;
  const { string } = model.tubes[c.tube] as TubeModel;
  const x = string.thermocouples[c.sensor]?.position_m as number;
  const from = drive.massFlux_kg_m2s > 0 ? x : model.store.bed.length_m - x;
  const entering = Math.abs(drive.inlet_K - c.rock_K) * Math.exp(-from / lag);
  // Without a reading of the inlet nothing is known of it.
  return Number.isFinite(entering) ? Math.max(behind, entering) : behind;
}

/** Deviation to the same side by this many sigmas bears another sensor out. */
const SUPPORT_SIGMAS = 2;

/**
 * True where a sensor beside it on its string, or most of those at its height on other strings,
 * deviate to the same side: then the profile is off there, not the sensor.
 */
function isSupported(state: StoreState, work: JudgeWork, c: Candidate): boolean {
  const z = innovation(c) / c.sigma_K;
  if (!(Math.abs(z) > GATE_SIGMAS)) return false;
  const agrees = (i: number): boolean => {
    const other = work.candidates[i] as Candidate;
    return (
      isBelieved(memoryOf(state, other)) &&
      (innovation(other) / other.sigma_K) * Math.sign(z) > SUPPORT_SIGMAS
    );
  };
  if (c.beside.some(agrees)) return true;
  const level = c.level.filter((i) => Number.isFinite((work.candidates[i] as Candidate).value_K));
  return level.length > 0 && level.filter(agrees).length * 2 > level.length;
}

/** Movements against the rock below this are no concern [K]; alike is by half as much to the same side. */
const MOVED_LEAST_K = 1;

/** True where a believed sensor beside it, or at its height, has left its usual deviation likewise. */
function movesAlike(state: StoreState, work: JudgeWork, c: Candidate): boolean {
  const own = memoryOf(state, c);
  const moved = own.recent_K - own.usual_K;
  if (!(Math.abs(moved) > MOVED_LEAST_K)) return false;
  const alike = (i: number): boolean => {
    const other = memoryOf(state, work.candidates[i] as Candidate);
    const likewise = (other.recent_K - other.usual_K) * Math.sign(moved);
    return isBelieved(other) && likewise > Math.max(MOVED_LEAST_K, Math.abs(moved) / 2);
  };
  return c.beside.some(alike) || c.level.some(alike);
}

/** Gas that enters at the top, for the topmost sensor of a string and those below uncovered ones [K]. */
function topGas(
  model: StoreModel,
  state: StoreState,
  c: Candidate,
  drive: TubeDrive | null,
): number {
  if (drive === null || drive.massFlux_kg_m2s === 0 || drive.inletSigma_K > 0) return Number.NaN;
  const chargesFromTop = model.store.charge_inlet_at === 'top';
  if (drive.massFlux_kg_m2s > 0 !== chargesFromTop) return Number.NaN;
  const { thermocouples } = (model.tubes[c.tube] as TubeModel).string;
  const place = thermocouples[c.sensor]?.position_m as number;
  for (let i = 0; i < thermocouples.length; i++) {
    const above = thermocouples[i]?.position_m as number;
    if (chargesFromTop ? above >= place : above <= place) continue;
    if (state.sensors[c.tube]?.[i]?.verdict !== 'uncovered') return Number.NaN;
  }
  return drive.inlet_K;
}
