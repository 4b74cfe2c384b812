import { type BedTables, buildBedTables } from '../bed/tables.js';
import type { EstimatorDefinition, StoreDefinition } from '../definitions.js';
import {
  freshSensor,
  GATE_SIGMAS,
  judgeSensor,
  rejectWithGroup,
  type SensorMemory,
} from './judge.js';
import {
  type AcceptedReading,
  applyReadings,
  predictReading,
  projectReading,
  type ReadingModel,
  readingVariance,
} from './measurement.js';
import { blankTube, type StartReading, startTube } from './start.js';
import {
  createTubeScratch,
  predictTube,
  type TubeDrive,
  type TubeModel,
  type TubeScratch,
  type TubeState,
  tubeModel,
  tubeTemperatures,
} from './tube.js';
import {
  followCorrection,
  resetWall,
  startWall,
  stepWall,
  type WallModel,
  type WallState,
  wallModel,
} from './wallZone.js';

/** What never changes of a store: one tube per string over common property tables. */
export interface StoreModel {
  readonly store: StoreDefinition;
  readonly tables: BedTables;
  readonly tubes: readonly TubeModel[];
  /** Channel index of each thermocouple, by tube and sensor. */
  readonly channels: readonly (readonly number[])[];
  readonly deadbands_K: readonly (readonly number[])[];
  readonly scratch: readonly TubeScratch[];
  readonly wall: WallModel | null;
}

/** Everything a store's tracking remembers. */
export interface StoreState {
  readonly tubes: TubeState[];
  readonly sensors: SensorMemory[][];
  /** The zone at the wall, null where the definition has no wall steel. */
  readonly wall: WallState | null;
  started: boolean;
  /** Scans in a row in which most readings stood outside the gate. */
  missed: number;
  /** Scans since the profile was last re-acquired, capped. */
  settled: number;
  /** Readings used in the last scan. */
  used: number;
}

export function storeModel(
  store: StoreDefinition,
  estimator: EstimatorDefinition,
  channels: readonly (readonly number[])[],
  deadbands_K: readonly (readonly number[])[],
): StoreModel {
  const tables = buildBedTables(store.bed, store.reference_cold_K, store.reference_hot_K);
  const tubes = store.strings.map((string) => tubeModel(store, string, estimator, tables));
  return {
    store,
    tables,
    tubes,
    channels,
    deadbands_K,
    scratch: tubes.map((tube) => createTubeScratch(tube.layout)),
    wall: wallModel(tables, tubes),
  };
}

export function startStore(model: StoreModel): StoreState {
  const tubes = model.tubes.map(blankTube);
  const wall = model.wall === null ? null : startWall(model.tubes[0]?.layout.cells ?? 0);
  if (model.wall !== null && wall !== null) {
    resetWall(model.tables, wall, tubes[model.wall.tube] as TubeState);
  }
  return {
    wall,
    tubes,
    sensors: model.tubes.map((tube) => tube.string.thermocouples.map(freshSensor)),
    started: false,
    missed: 0,
    settled: 0,
    used: 0,
  };
}

export type StoreStep = 'not_started' | 'predicted' | 'updated' | 'missed' | 'reacquired';

/** Most readings outside the gate: a common cause, not the sensors. */
const MISS_SHARE = 0.4;
const MISS_SCANS = 3;
const REACQUIRE_INFLATION = 2;
const SETTLED_MAX = 1000;
/** Unknown travel beyond this makes the linearised prediction worthless: re-acquire from readings [m]. */
const LOST_TRAVEL_M = 0.25;

/**
 * Takes one scan into a store: predicts every tube, judges every thermocouple, updates.
 *
 * @param drive null before the first scan (nothing to predict over)
 * @param unknownTravel_m one-sigma travel that no flow reading covered since readings stopped [m]
 */
export function stepStore(
  model: StoreModel,
  state: StoreState,
  drive: TubeDrive | null,
  values: Float64Array,
  time_ms: number,
  unknownTravel_m: number,
): StoreStep {
  state.used = 0;
  state.settled = Math.min(SETTLED_MAX, state.settled + 1);
  if (!state.started) {
    const readings = usableReadings(model, state, values);
    if (readings.length < 2) return 'not_started';
    restart(model, state, values, 1);
    rememberStart(model, state, values, time_ms);
    state.started = true;
    return 'reacquired';
  }
  if (drive !== null) {
    model.tubes.forEach((tube, k) => {
      predictTube(tube, state.tubes[k] as TubeState, drive, model.scratch[k] as TubeScratch);
    });
    if (model.wall !== null && state.wall !== null) {
      const k = model.wall.tube;
      stepWall(
        model.wall,
        model.tubes[k] as TubeModel,
        state.tubes[k] as TubeState,
        state.wall,
        drive,
        model.scratch[k] as TubeScratch,
      );
    }
  }
  if (unknownTravel_m > LOST_TRAVEL_M && usableReadings(model, state, values).length >= 3) {
    restart(model, state, values, REACQUIRE_INFLATION);
    return 'reacquired';
  }
  return update(model, state, values, time_ms);
}

/** A reading against its prediction, before any update of this scan. */
interface Candidate {
  readonly tube: number;
  readonly sensor: number;
  readonly value_K: number;
  readonly reading: ReadingModel;
  /** P H' (a row of the tube's scratch) and the sigma of the innovation [K]. */
  readonly v: Float64Array;
  readonly sigma_K: number;
}

function update(
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
  if (outside.length >= 3 && outside.length > MISS_SHARE * sound.length) {
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

const innovation = (c: Candidate): number => c.value_K - c.reading.value_K;

const memoryOf = (state: StoreState, c: Candidate): SensorMemory =>
  state.sensors[c.tube]?.[c.sensor] as SensorMemory;

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

/** Judges every thermocouple; returns those whose reading may be used, with their variances. */
function judgeAll(
  model: StoreModel,
  state: StoreState,
  candidates: readonly Candidate[],
  time_ms: number,
): (AcceptedReading & { tube: number })[] {
  const range_K = plausibleRange(model);
  const present = candidates.filter((c) => Number.isFinite(c.value_K)).length;
  const accepted: (AcceptedReading & { tube: number })[] = [];
  for (const c of candidates) {
    const judgement = judgeSensor(memoryOf(state, c), {
      time_ms,
      value_K: c.value_K,
      othersPresent: present > 0,
      predicted_K: c.reading.value_K,
      sigma_K: c.sigma_K,
      deadband_K: model.deadbands_K[c.tube]?.[c.sensor] ?? 0,
      range_K,
      supported: isSupported(model, state, candidates, c),
    });
    if (judgement === 'leave_out') continue;
    const innovation_K = innovation(c);
    const tube = model.tubes[c.tube] as TubeModel;
    let variance_K2 = readingVariance(tube, c.reading);
    // Enlarged until the innovation is three of its sigmas: it pulls, but not by its full length.
    if (judgement === 'soften') variance_K2 += innovation_K ** 2 / 9 - c.sigma_K ** 2;
    accepted.push({ ...c, innovation_K, variance_K2 });
  }
  return accepted;
}

/** Deviation to the same side by this many sigmas bears another sensor out. */
const SUPPORT_SIGMAS = 2;

/**
 * True where a sensor beside it on its string, or most of those at its height on other strings,
 * deviate to the same side: then the profile is off there, not the sensor.
 */
function isSupported(
  model: StoreModel,
  state: StoreState,
  candidates: readonly Candidate[],
  c: Candidate,
): boolean {
  const z = innovation(c) / c.sigma_K;
  if (!(Math.abs(z) > GATE_SIGMAS)) return false;
  const agrees = (other: Candidate): boolean =>
    memoryOf(state, other).verdict === null &&
    (innovation(other) / other.sigma_K) * Math.sign(z) > SUPPORT_SIGMAS;
  const beside = candidates.filter((o) => o.tube === c.tube && Math.abs(o.sensor - c.sensor) === 1);
  if (beside.some(agrees)) return true;
  const place = (o: Candidate): number =>
    model.tubes[o.tube]?.string.thermocouples[o.sensor]?.position_m as number;
  const reach = model.store.bed.length_m / 40;
  const level = candidates.filter(
    (o) =>
      o.tube !== c.tube && Number.isFinite(o.value_K) && Math.abs(place(o) - place(c)) <= reach,
  );
  return level.length > 0 && level.filter(agrees).length * 2 > level.length;
}

/** A group is at fault where this share of it deviates to one side and the rest of the store does not. */
const GROUP_SHARE = 0.8;
const GROUP_SIGMAS = 3;
const GROUP_LEAST = 4;

/**
 * A card or cold junction that fails moves all its thermocouples by about the same: first the common
 * cause is judged, before each sensor by itself.
 */
function rejectFaultyGroups(
  model: StoreModel,
  state: StoreState,
  sound: readonly Candidate[],
  time_ms: number,
): void {
  const groupOf = (c: Candidate): string | null =>
    model.tubes[c.tube]?.string.thermocouples[c.sensor]?.group ?? null;
  const names = new Set(sound.map(groupOf));
  if (names.size < 2) return;
  for (const name of names) {
    if (name === null) continue;
    const own = sound.filter((c) => groupOf(c) === name);
    if (own.length < GROUP_LEAST) continue;
    const z = own.map((c) => innovation(c) / c.sigma_K);
    const up = z.filter((v) => v > GROUP_SIGMAS).length;
    const down = z.filter((v) => v < -GROUP_SIGMAS).length;
    if (Math.max(up, down) < GROUP_SHARE * own.length) continue;
    const others = sound.filter((c) => groupOf(c) !== name);
    const off = others.filter((c) => Math.abs(innovation(c)) > GROUP_SIGMAS * c.sigma_K).length;
    if (others.length === 0 || off > (1 - GROUP_SHARE) * others.length) continue;
    const mean = own.reduce((sum, c) => sum + innovation(c), 0) / own.length;
    const evidence = `${Math.max(up, down)} of ${own.length} thermocouples of group ${name} moved together by ${mean.toFixed(1)} K, the others did not`;
    for (const c of own) rejectWithGroup(memoryOf(state, c), time_ms, evidence);
  }
}

/** Temperatures that the plant can produce, with room for its excursions [K]. */
function plausibleRange(model: StoreModel): readonly [number, number] {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const margin = 0.35 * (hot - cold);
  return [cold - margin, hot + margin];
}

function usableReadings(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
): { tube: number; sensor: number; position_m: number; value_K: number }[] {
  const [low, high] = plausibleRange(model);
  const out: { tube: number; sensor: number; position_m: number; value_K: number }[] = [];
  model.tubes.forEach((tube, k) => {
    tube.string.thermocouples.forEach((thermocouple, s) => {
      const value = values[model.channels[k]?.[s] as number] as number;
      const verdict = state.sensors[k]?.[s]?.verdict ?? null;
      if (verdict !== null && verdict !== 'open') return;
      if (!(value > low && value < high)) return;
      out.push({ tube: k, sensor: s, position_m: thermocouple.position_m, value_K: value });
    });
  });
  return out;
}

/** Draws every tube's profile anew through its readings (through all strings' where it has too few). */
function restart(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  inflate: number,
): void {
  const readings = usableReadings(model, state, values);
  model.tubes.forEach((tube, k) => {
    const own = readings.filter((r) => r.tube === k);
    const source = own.length >= 2 ? own : readings;
    if (source.length < 2) return;
    const start: StartReading[] = source.map((r) => ({
      position_m: r.position_m,
      value_K: r.value_K,
      sensor: r.tube === k ? r.sensor : -1,
    }));
    startTube(tube, state.tubes[k] as TubeState, start, inflate);
    if (model.wall?.tube === k && state.wall !== null) {
      resetWall(model.tables, state.wall, state.tubes[k] as TubeState);
    }
  });
  for (const memory of state.sensors.flat()) {
    // What moved was the estimate that is given up, not the rock.
    memory.moved_K = 0;
    memory.expected_K = Number.NaN;
  }
  state.missed = 0;
  state.settled = 0;
  state.used = readings.length;
}

/** Verdicts of the first scan: only what needs no prediction. */
function rememberStart(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
): void {
  const readings = new Set(
    usableReadings(model, state, values).map((r) => `${r.tube}/${r.sensor}`),
  );
  model.tubes.forEach((tube, k) => {
    for (let s = 0; s < tube.layout.sensors; s++) {
      if (readings.has(`${k}/${s}`)) continue;
      const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
      judgeSensor(state.sensors[k]?.[s] as SensorMemory, {
        time_ms,
        value_K: values[model.channels[k]?.[s] as number] as number,
        othersPresent: true,
        predicted_K: (hot + cold) / 2,
        sigma_K: (hot - cold) / 2,
        deadband_K: 0,
        range_K: plausibleRange(model),
        supported: false,
      });
    }
  });
}
