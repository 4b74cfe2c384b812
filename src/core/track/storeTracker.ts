import { type BedTables, buildBedTables } from '../bed/tables.js';
import type { EstimatorDefinition, StoreDefinition } from '../definitions.js';
import { freshSensor, type Judgement, judgeSensor, type SensorMemory } from './judge.js';
import {
  applyReading,
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
} from './tube.js';

/** What never changes of a store: one tube per string over common property tables. */
export interface StoreModel {
  readonly store: StoreDefinition;
  readonly tables: BedTables;
  readonly tubes: readonly TubeModel[];
  /** Channel index of each thermocouple, by tube and sensor. */
  readonly channels: readonly (readonly number[])[];
  readonly deadbands_K: readonly (readonly number[])[];
  readonly scratch: readonly TubeScratch[];
}

/** Everything a store's tracking remembers. */
export interface StoreState {
  readonly tubes: TubeState[];
  readonly sensors: SensorMemory[][];
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
  };
}

export function startStore(model: StoreModel): StoreState {
  return {
    tubes: model.tubes.map(blankTube),
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
  }
  if (unknownTravel_m > LOST_TRAVEL_M && usableReadings(model, state, values).length >= 3) {
    restart(model, state, values, REACQUIRE_INFLATION);
    return 'reacquired';
  }
  return update(model, state, values, time_ms);
}

interface Candidate {
  readonly tube: number;
  readonly sensor: number;
  readonly value_K: number;
  readonly outside: boolean;
}

function update(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
): StoreStep {
  const candidates = judgeAll(model, state, values, time_ms);
  const outside = candidates.filter((c) => c.outside).length;
  if (candidates.length === 0) return 'predicted';
  if (outside >= 3 && outside > MISS_SHARE * candidates.length) {
    state.missed++;
    if (state.missed < MISS_SCANS) return 'missed';
    restart(model, state, values, REACQUIRE_INFLATION);
    return 'reacquired';
  }
  state.missed = 0;
  const reading: ReadingModel = { value_K: 0, cell: 0, weight: 0, slope_K_m: 0, lag_m: 0 };
  for (const { tube, sensor, value_K, outside: out } of candidates) {
    if (out) continue;
    const tubeModel = model.tubes[tube] as TubeModel;
    const tubeState = state.tubes[tube] as TubeState;
    const scratch = model.scratch[tube] as TubeScratch;
    predictReading(tubeModel, tubeState, sensor, reading);
    const projected = projectReading(tubeModel, tubeState, sensor, reading, scratch.gain);
    const variance = projected + readingVariance(tubeModel, reading);
    applyReading(
      tubeModel,
      tubeState,
      value_K - reading.value_K,
      variance,
      scratch.gain,
      scratch.temperature,
    );
    state.used++;
  }
  return state.used > 0 ? 'updated' : 'predicted';
}

/**
 * Judges every thermocouple against the prediction before any update of this scan. While most
 * readings miss, the verdicts are left alone: the estimate is in doubt, not the sensors.
 */
function judgeAll(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
): Candidate[] {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const margin = 0.35 * (hot - cold);
  const reading: ReadingModel = { value_K: 0, cell: 0, weight: 0, slope_K_m: 0, lag_m: 0 };
  const rows: { tube: number; sensor: number; value: number; predicted: number; sigma: number }[] =
    [];
  let present = 0;
  let beyond = 0;
  for (let k = 0; k < model.tubes.length; k++) {
    const tube = model.tubes[k] as TubeModel;
    const scratch = model.scratch[k] as TubeScratch;
    for (let s = 0; s < tube.layout.sensors; s++) {
      const value = values[model.channels[k]?.[s] as number] as number;
      const tubeState = state.tubes[k] as TubeState;
      predictReading(tube, tubeState, s, reading);
      const projected = projectReading(tube, tubeState, s, reading, scratch.gain);
      const sigma = Math.sqrt(projected + readingVariance(tube, reading));
      if (Number.isFinite(value)) {
        present++;
        if (
          state.sensors[k]?.[s]?.verdict === null &&
          Math.abs(value - reading.value_K) > 4.5 * sigma
        ) {
          beyond++;
        }
      }
      rows.push({ tube: k, sensor: s, value, predicted: reading.value_K, sigma });
    }
  }
  const inDoubt = beyond >= 3 && beyond > MISS_SHARE * present;
  const out: Candidate[] = [];
  for (const row of rows) {
    const memory = state.sensors[row.tube]?.[row.sensor] as SensorMemory;
    const innovation = Math.abs(row.value - row.predicted);
    if (inDoubt) {
      if (Number.isFinite(row.value) && memory.verdict === null) {
        out.push({ ...row, value_K: row.value, outside: innovation > 4.5 * row.sigma });
      }
      continue;
    }
    const judgement: Judgement = judgeSensor(memory, {
      time_ms,
      value_K: row.value,
      othersPresent: present > 0,
      predicted_K: row.predicted,
      sigma_K: row.sigma,
      deadband_K: model.deadbands_K[row.tube]?.[row.sensor] ?? 0,
      range_K: [cold - margin, hot + margin],
    });
    if (judgement === 'use') out.push({ ...row, value_K: row.value, outside: false });
  }
  return out;
}

function usableReadings(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
): { tube: number; sensor: number; position_m: number; value_K: number }[] {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const margin = 0.35 * (hot - cold);
  const out: { tube: number; sensor: number; position_m: number; value_K: number }[] = [];
  model.tubes.forEach((tube, k) => {
    tube.string.thermocouples.forEach((thermocouple, s) => {
      const value = values[model.channels[k]?.[s] as number] as number;
      const verdict = state.sensors[k]?.[s]?.verdict ?? null;
      if (verdict !== null && verdict !== 'open') return;
      if (!(value > cold - margin && value < hot + margin)) return;
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
  });
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
      const margin = 0.35 * (hot - cold);
      judgeSensor(state.sensors[k]?.[s] as SensorMemory, {
        time_ms,
        value_K: values[model.channels[k]?.[s] as number] as number,
        othersPresent: true,
        predicted_K: (hot + cold) / 2,
        sigma_K: (hot - cold) / 2,
        deadband_K: 0,
        range_K: [cold - margin, hot + margin],
      });
    }
  });
}
