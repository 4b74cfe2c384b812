import { GATE_SIGMAS } from './judge.js';
import {
  applyReadings,
  predictReading,
  projectReading,
  type ReadingModel,
  readingVariance,
} from './measurement.js';
import {
  type Candidate,
  innovation,
  judgeAll,
  memoryOf,
  rejectFaultyGroups,
} from './storeJudge.js';
import { plausibleRange, restart } from './storeStart.js';
import {
  REACQUIRE_INFLATION,
  type StoreModel,
  type StoreState,
  type StoreStep,
} from './storeTracker.js';
import { type TubeModel, type TubeScratch, type TubeState, tubeTemperatures } from './tube.js';
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
): StoreStep {
  const candidates = predictAll(model, state, values);
  const [low, high] = plausibleRange(model);
  const within = (c: Candidate): boolean => c.value_K >= low && c.value_K <= high;
  // First the common cause (a card, a cold junction), else half a store's fault passes for a lost estimate.
  const believed = candidates.filter((c) => within(c) && memoryOf(state, c).verdict === null);
  rejectFaultyGroups(model, state, believed, time_ms);
  const sound = believed.filter((c) => memoryOf(state, c).verdict === null);
  const outside = sound.filter((c) => Math.abs(innovation(c)) > GATE_SIGMAS * c.sigma_K);
  const least = Math.max(2, Math.min(MISS_LEAST, sound.length));
  if (outside.length >= least && outside.length > MISS_SHARE * sound.length) {
    // Most readings miss: the estimate is in doubt, not the sensors, so the verdicts stay.
    state.missed++;
    if (state.missed < MISS_SCANS) return 'missed';
    restart(model, state, values, REACQUIRE_INFLATION);
    return 'reacquired';
  }
  state.missed = 0;
  const accepted = judgeAll(model, state, candidates, time_ms);
  model.tubes.forEach((tube, k) => {
    followSurprise(
      state.tubes[k] as TubeState,
      sound.filter((c) => c.tube === k && memoryOf(state, c).verdict === null),
    );
    const tubeState = state.tubes[k] as TubeState;
    const beside = model.wall?.tube === k ? state.wall : null;
    const before = beside && tubeTemperatures(tube, tubeState, new Float64Array(tube.layout.cells));
    applyReadings(
      tube,
      tubeState,
      accepted.filter((c) => c.tube === k),
      (model.scratch[k] as TubeScratch).temperature,
    );
    if (beside === null || before === null) return;
    const after = tubeTemperatures(tube, tubeState, new Float64Array(tube.layout.cells));
    followCorrection(model.tables, beside, before, after);
  });
  rememberExpected(model, state, candidates);
  state.used = accepted.length;
  return state.used > 0 ? 'updated' : 'predicted';
}

/** What the estimate expects of each thermocouple after the update, for the next scan's judgement. */
function rememberExpected(
  model: StoreModel,
  state: StoreState,
  candidates: readonly Candidate[],
): void {
  const reading: ReadingModel = { value_K: 0, cell: 0, weight: 0, slope_K_m: 0, lag_m: 0 };
  for (const c of candidates) {
    const tube = model.tubes[c.tube] as TubeModel;
    predictReading(tube, state.tubes[c.tube] as TubeState, c.sensor, reading);
    memoryOf(state, c).expected_K = reading.value_K;
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

/** Prediction, P H' and innovation sigma of every thermocouple, missing ones included. */
function predictAll(model: StoreModel, state: StoreState, values: Float64Array): Candidate[] {
  return model.tubes.flatMap((tube, k) => {
    const tubeState = state.tubes[k] as TubeState;
    const scratch = model.scratch[k] as TubeScratch;
    return tube.string.thermocouples.map((_, sensor): Candidate => {
      const reading: ReadingModel = { value_K: 0, cell: 0, weight: 0, slope_K_m: 0, lag_m: 0 };
      predictReading(tube, tubeState, sensor, reading);
      const v = scratch.projections[sensor] as Float64Array;
      const projected = projectReading(tube, tubeState, sensor, reading, v);
      const sigma_K = Math.sqrt(projected + readingVariance(tube, reading));
      const value_K = values[model.channels[k]?.[sensor] as number] as number;
      return { tube: k, sensor, value_K, reading, v, sigma_K };
    });
  });
}
