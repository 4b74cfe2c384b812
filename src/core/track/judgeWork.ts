import {
  emptyReading,
  predictReading,
  projectReading,
  type ReadingModel,
  readingVariance,
} from './measurement.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeModel, TubeScratch, TubeState } from './tube.js';

/** A reading against its prediction, before any update of this scan. */
export interface Candidate {
  readonly tube: number;
  readonly sensor: number;
  /** Nominal place, from the charge inlet along the bed [m]. */
  readonly position_m: number;
  /** The reading less the step of its group; NaN = missing. */
  value_K: number;
  readonly reading: ReadingModel;
  /** P H' (a row of the tube's scratch) and the sigma of the innovation [K]. */
  readonly v: Float64Array;
  sigma_K: number;
  /** White variance of the reading [K2]. */
  variance_K2: number;
  /**
   * The rock at the sensor's nominal place (and what the reading shares with its group), as it would
   * be estimated if nothing were known beforehand of its own offset, and its sigma [K]; infinite
   * where nothing else tells.
   */
  rock_K: number;
  rockSigma_K: number;
  /** Those beside it on its string, and those at its height on other strings. */
  readonly beside: readonly number[];
  readonly level: readonly number[];
}

/** Thermocouples that share a card, cable or cold junction. */
export interface Group {
  readonly name: string;
  readonly members: readonly number[];
}

/** What judging needs of a store, made once: no scan allocates it again. */
export interface JudgeWork {
  readonly candidates: readonly Candidate[];
  readonly groups: readonly Group[];
  /** Index of each candidate's group, -1 = none. */
  readonly groupOf: readonly number[];
  /** Index of the first candidate of each tube. */
  readonly first: readonly number[];
  readonly id: readonly string[];
  readonly reading: ReadingModel;
}

/** Reading, without the step of its group, less its prediction [K]; NaN = missing. */
export const innovation = (c: Candidate): number => c.value_K - c.reading.value_K;

const known = new WeakMap<StoreModel, JudgeWork>();

/** Junctions see any share of the gas from none to all, evenly spread: 1/sqrt(12). */
export const SHARE_SIGMA = 0.29;

/** Sensors at one height: within this share of the bed's length. */
const LEVEL_SHARE = 1 / 40;

/** The store's candidates and groups, made once for a model; one array of them over all tubes. */
export function judgeWork(model: StoreModel): JudgeWork {
  const before = known.get(model);
  if (before !== undefined) return before;
  const places = model.tubes.flatMap((tube, k) =>
    tube.string.thermocouples.map((t, sensor) => ({ tube: k, sensor, ...t })),
  );
  const reach = model.store.bed.length_m * LEVEL_SHARE;
  const indices = (fits: (other: (typeof places)[number]) => boolean): number[] =>
    places.flatMap((other, i) => (fits(other) ? [i] : []));
  const candidates = places.map(
    ({ tube, sensor, position_m }): Candidate => ({
      tube,
      sensor,
      position_m,
      value_K: Number.NaN,
      reading: emptyReading((model.tubes[tube] as TubeModel).layout.cells),
      v: (model.scratch[tube] as TubeScratch).projections[sensor] as Float64Array,
      sigma_K: 0,
      variance_K2: 0,
      rock_K: 0,
      rockSigma_K: 0,
      beside: indices((o) => o.tube === tube && Math.abs(o.sensor - sensor) === 1),
      level: indices((o) => o.tube !== tube && Math.abs(o.position_m - position_m) <= reach),
    }),
  );
  const names = [...new Set(places.map((p) => p.group))].filter((name) => name !== null);
  const work: JudgeWork = {
    candidates,
    groups: names.map((name) => ({ name, members: indices((p) => p.group === name) })),
    groupOf: places.map((p) => (p.group === null ? -1 : names.indexOf(p.group))),
    first: model.tubes.map((_, k) => places.findIndex((p) => p.tube === k)),
    id: places.map((p) => p.id),
    reading: emptyReading(model.tubes[0]?.layout.cells ?? 0),
  };
  known.set(model, work);
  return work;
}

/** A covariance below this share of the variance is rounding. */
const ROUNDING = 1e-9;

/** Prediction, P H' and innovation sigma of every thermocouple of a tube, missing ones included. */
export function predictTubeReadings(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  k: number,
): void {
  const tube = model.tubes[k] as TubeModel;
  const tubeState = state.tubes[k] as TubeState;
  const { layout } = tube;
  const start = work.first[k] as number;
  for (let sensor = 0; sensor < layout.sensors; sensor++) {
    const c = work.candidates[start + sensor] as Candidate;
    predictReading(tube, tubeState, sensor, c.reading);
    const projected = projectReading(tube, tubeState, sensor, c.reading, c.v);
    c.variance_K2 = readingVariance(tube, c.reading);
    c.sigma_K = Math.sqrt(projected + c.variance_K2);
    const own = layout.offset + sensor;
    const offset = tubeState.further[own - layout.cells] as number;
    const ownVariance = tubeState.covariance[own * (layout.size + 1)] as number;
    // The prior of the offset taken out again, as in judgeUndo: P of the rest grows by c c'/(s^2 - P_oo).
    const cross = (c.v[own] as number) - ownVariance;
    const left = tube.estimator.offset_sigma_K ** 2 - ownVariance;
    const rest = Math.max(1e-6, projected - cross - (c.v[own] as number));
    const place = tubeState.further[layout.position + sensor - layout.cells] as number;
    // Where it has no say in the rest, as after judgeUndo, nothing of it is in what they tell.
    const apart = Math.abs(cross) < ROUNDING * ownVariance;
    c.rock_K =
      c.reading.value_K -
      offset -
      place * c.reading.slope_K_m +
      (left > 0 && !apart ? (cross * offset) / left : 0);
    c.rockSigma_K = Number.POSITIVE_INFINITY;
    if (left > 0 || apart) c.rockSigma_K = Math.sqrt(rest + (apart ? 0 : (cross * cross) / left));
  }
}
