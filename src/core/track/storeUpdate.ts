import type { SensorVerdict } from '../estimate.js';
import { doubtBeside, GATE_SIGMAS, isBelieved, type SensorMemory } from './judge.js';
import { findDisplaced } from './judgeDisplaced.js';
import { judgeGroups } from './judgeGroup.js';
import { followStart, widenGuesses } from './judgeStart.js';
import { forgetSensor } from './judgeUndo.js';
import {
  type Candidate,
  innovation,
  type JudgeWork,
  judgeWork,
  predictTubeReadings,
} from './judgeWork.js';
import { predictReading } from './measurement.js';
import { applyReadings } from './readingUpdate.js';
import { judgeAll, memoryOf } from './storeJudge.js';
import { plausibleRange, restart } from './storeStart.js';
import {
  REACQUIRE_INFLATION,
  type StoreModel,
  type StoreState,
  type StoreStep,
} from './storeTracker.js';
import {
  type TubeDrive,
  type TubeModel,
  type TubeScratch,
  type TubeState,
  tubeTemperatures,
} from './tube.js';
import { followCorrection } from './wallZone.js';

/** Most readings outside the gate: a common cause, not the sensors. */
const MISS_SHARE = 0.4;
/** So many of them at least, or all of the two that a small store has. */
const MISS_LEAST = 3;
const MISS_SCANS = 3;

/** Judges and takes in the readings of one scan, after the prediction. */
export function updateStore(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
  drive: TubeDrive | null,
): StoreStep {
  const work = predictAll(model, state, values, time_ms, drive?.dt_s ?? 0);
  const { candidates } = work;
  followStart(model, state, work, drive);
  const [low, high] = plausibleRange(model);
  const usable = (c: Candidate): boolean => {
    const memory = memoryOf(state, c);
    return (
      c.value_K >= low && c.value_K <= high && isBelieved(memory) && time_ms >= memory.unsettled_ms
    );
  };
  // First the common cause (a card, a cold junction), else half a store's fault passes for a lost estimate.
  if (judgeGroups(model, state, work, usable, time_ms)) predictReadings(model, state, work);
  const sound = candidates.filter(usable);
  const outside = sound.filter((c) => Math.abs(innovation(c)) > GATE_SIGMAS * c.sigma_K);
  if (isLost(model, state, sound, outside)) {
    // Most readings miss: the estimate is in doubt, not the sensors, so the verdicts stay.
    state.missed++;
    state.astray = astrayShare(model, sound);
    if (state.missed < MISS_SCANS) return 'missed';
    restart(model, state, time_ms, REACQUIRE_INFLATION, drive);
    return 'reacquired';
  }
  state.missed = 0;
  state.astray = 0;
  const elsewhere = findDisplaced(model, state, work, drive);
  if (elsewhere === 'open') return 'missed';
  if (elsewhere === 'confirmed') {
    restart(model, state, time_ms, REACQUIRE_INFLATION, drive);
    return 'reacquired';
  }
  if (widenGuesses(model, state, work, drive, time_ms)) predictReadings(model, state, work);
  const before = candidates.map((c) => memoryOf(state, c).verdict);
  const accepted = judgeAll(model, state, work, drive, time_ms);
  model.tubes.forEach((tube, k) => {
    const tubeState = state.tubes[k] as TubeState;
    followSurprise(
      tubeState,
      sound.filter((c) => c.tube === k && isBelieved(memoryOf(state, c))),
    );
    const beside = model.wall?.tube === k ? state.wall : null;
    const old = beside && tubeTemperatures(tube, tubeState, new Float64Array(tube.layout.cells));
    applyReadings(
      tube,
      tubeState,
      accepted.filter((a) => a.tube === k),
      (model.scratch[k] as TubeScratch).temperature,
    );
    candidates.forEach((c, i) => {
      const memory = memoryOf(state, c);
      if (c.tube !== k || memory.verdict === before[i] || !BENDS.includes(memory.verdict)) return;
      forgetSensor(tube, tubeState, c.sensor, memory.off_K);
      if (memory.verdict === 'drifting') return;
      for (const other of candidates) {
        const near = other.tube === k && Math.abs(other.sensor - c.sensor) <= BENDS_PLACES;
        if (near && other !== c) doubtBeside(memoryOf(state, other), time_ms);
      }
    });
    if (beside === null || old === null) return;
    const now = tubeTemperatures(tube, tubeState, new Float64Array(tube.layout.cells));
    followCorrection(model.tables, beside, old, now);
  });
  rememberExpected(model, state, work);
  state.used = accepted.length;
  return state.used > 0 ? 'updated' : 'predicted';
}

/**
 * Whether the readings outside the gate are too many for sensors at fault. On an only string a front
 * that is elsewhere is seen by few: there two are enough that leave the gate in the same scan, unless
 * each reads what the other should.
 */
function isLost(
  model: StoreModel,
  state: StoreState,
  sound: readonly Candidate[],
  outside: readonly Candidate[],
): boolean {
  const least = Math.max(2, Math.min(MISS_LEAST, sound.length));
  if (outside.length >= least && outside.length > MISS_SHARE * sound.length) return true;
  if (model.tubes.length > 1 || outside.length < MISS_SHARE * sound.length) return false;
  const anew = outside.filter((c) => memoryOf(state, c).outside === 0);
  return anew.length > 1 && !(anew.length === 2 && areExchanged(anew as [Candidate, Candidate]));
}

function areExchanged([a, b]: readonly [Candidate, Candidate]): boolean {
  const reads = (c: Candidate, other: Candidate): boolean =>
    Math.abs(c.value_K - other.reading.value_K) <= GATE_SIGMAS * other.sigma_K;
  return reads(a, b) && reads(b, a);
}

/**
 * How far off the state of charge may be while the estimate is lost, as the readings themselves say:
 * their mean deviation over the span, and half of the way from one to the next [-].
 */
function astrayShare(model: StoreModel, sound: readonly Candidate[]): number {
  const span = model.store.reference_hot_K - model.store.reference_cold_K;
  const off = sound.reduce((sum, c) => sum + Math.abs(innovation(c)), 0) / sound.length;
  const perTube = sound.length / model.tubes.length;
  return off / Math.abs(span) + 0.5 / perTube;
}

/** Verdicts on sensors that were used for a while after they had gone wrong. */
const BENDS: readonly (SensorVerdict | null)[] = [
  'stuck',
  'drifting',
  'reversed',
  'swapped',
  'wrong_type',
];

/** Neighbours to either side that it may have taken along. */
const BENDS_PLACES = 2;

/** What the estimate expects of each thermocouple after the update, for the next scan's judgement. */
function rememberExpected(model: StoreModel, state: StoreState, work: JudgeWork): void {
  for (const c of work.candidates) {
    const tube = model.tubes[c.tube] as TubeModel;
    predictReading(tube, state.tubes[c.tube] as TubeState, c.sensor, work.reading);
    memoryOf(state, c).expected_K = work.reading.value_K;
  }
}

/** Scans over which a tube's surprise is averaged. */
const SURPRISE_SCANS = 15;
/** One reading adds at most the square of this many sigmas. */
const SURPRISE_SIGMAS = 10;

function followSurprise(tube: TubeState, sound: readonly Candidate[]): void {
  if (sound.length === 0) return;
  let sum = 0;
  for (const c of sound) sum += Math.min(SURPRISE_SIGMAS, Math.abs(innovation(c)) / c.sigma_K) ** 2;
  tube.surprise += (sum / sound.length - tube.surprise) / SURPRISE_SCANS;
}

function predictReadings(model: StoreModel, state: StoreState, work: JudgeWork): void {
  for (let k = 0; k < model.tubes.length; k++) predictTubeReadings(model, state, work, k);
}

/** Predictions of every thermocouple, missing ones included, with its reading. */
function predictAll(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
  dt_s: number,
): JudgeWork {
  const work = judgeWork(model);
  predictReadings(model, state, work);
  for (const c of work.candidates) {
    const memory = memoryOf(state, c);
    c.value_K = (values[model.channels[c.tube]?.[c.sensor] as number] as number) - memory.shift_K;
    followLag(memory, c, time_ms, dt_s);
  }
  return work;
}

/** Three times the longest lag of a thermowell, 180 s: 95 % of a step are over. */
const SETTLE_MS = 3 * 180_000;
/** Junctions see anything from none to all of the gas: half of it from the mean. */
const SHARE_REACH = 0.5;

/** Smaller changes of the lag from scan to scan are the gas's properties and a drifting flow. */
const JUMP_SHARE = 0.2;
/** How long a place keeps what the gas has put into it: half a cycle [s]. */
const REACH_S = 6 * 3600;

/**
 * Where the lag between gas and rock jumps, as when the flow stops or turns, a junction's reading
 * jumps by its own share of it, and late by its thermowell. Until then a reading that may yet
 * move by more than two sigma of its noise says nothing about the rock.
 */
function followLag(memory: SensorMemory, c: Candidate, time_ms: number, dt_s: number): void {
  const { lag_m, slope_K_m } = c.reading;
  const change = Math.abs(lag_m - memory.lag_m);
  const most = Math.max(Math.abs(lag_m), Math.abs(memory.lag_m));
  const jump = SHARE_REACH * change * Math.abs(slope_K_m);
  if (change > JUMP_SHARE * most && jump * jump > 4 * c.variance_K2) {
    memory.unsettled_ms = time_ms + SETTLE_MS;
  }
  memory.lag_m = lag_m;
  const keep = Math.exp(-dt_s / REACH_S);
  memory.reachCharge_m = Math.max(lag_m, memory.reachCharge_m * keep);
  memory.reachDischarge_m = Math.max(-lag_m, memory.reachDischarge_m * keep);
}
