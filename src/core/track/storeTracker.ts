import { type BedTables, buildBedTables } from '../bed/tables.js';
import type { EstimatorDefinition, StoreDefinition } from '../definitions.js';
import { freshSensor, type SensorMemory } from './judge.js';
import type { Displaced } from './judgeDisplaced.js';
import { blankTube } from './start.js';
import { rememberReadings, rememberStart, restart, usableReadings } from './storeStart.js';
import { updateStore } from './storeUpdate.js';
import {
  predictTube,
  sharedTubeScratch,
  type TubeDrive,
  type TubeModel,
  type TubeScratch,
  type TubeState,
  tubeModel,
} from './tube.js';
import {
  resetWall,
  shareAround,
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
  /** Cell centres of the tubes [m]. */
  readonly x_m: Float64Array;
}

/** Everything a store's tracking remembers. */
export interface StoreState {
  readonly tubes: TubeState[];
  readonly sensors: SensorMemory[][];
  /** The layers at the wall, null where the definition has no wall steel. */
  readonly wall: WallState | null;
  started: boolean;
  /** Energy-equivalent position where the fronts were last known to be even across the bed [m]. */
  origin_m: number;
  /** Where a few readings say that the front stands elsewhere, by tube; see findDisplaced. */
  readonly displaced: (Displaced | null)[];
  /** Scans in a row in which most readings stood outside the gate. */
  missed: number;
  /** How far off the state of charge may be meanwhile [-]; absent in a state saved before there was this. */
  astray?: number;
  /** Time since the profile was last drawn anew [s]. */
  known_s: number;
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
    scratch: tubes.map((tube, k) => sharedTubeScratch(tube.layout, k)),
    wall: wallModel(tables, tubes),
    x_m: cellCentres(store.bed.length_m, (tubes[0] as TubeModel).layout.cells),
  };
}

function cellCentres(length_m: number, cells: number): Float64Array {
  const dx = length_m / cells;
  return Float64Array.from({ length: cells }, (_, i) => (i + 0.5) * dx);
}

export function startStore(model: StoreModel): StoreState {
  const tubes = model.tubes.map(blankTube);
  const wall =
    model.wall === null ? null : startWall(model.wall, model.tubes[0]?.layout.cells ?? 0);
  if (model.wall !== null && wall !== null) {
    resetWall(model.tables, wall, tubes[model.wall.tube] as TubeState);
  }
  return {
    wall,
    tubes,
    sensors: model.tubes.map((tube) => tube.string.thermocouples.map(freshSensor)),
    displaced: tubes.map(() => null),
    started: false,
    origin_m: 0,
    missed: 0,
    astray: 0,
    known_s: 0,
    settled: 0,
    used: 0,
  };
}

export type StoreStep = 'not_started' | 'predicted' | 'updated' | 'missed' | 'reacquired';

/** Sigma of a re-acquired profile over that of a first start. */
export const REACQUIRE_INFLATION = 2;
const SETTLED_MAX = 1000;
/** Unknown travel beyond this makes the linearised prediction worthless: re-acquire from readings [m]. */
const LOST_TRAVEL_M = 0.25;

/**
 * Takes one scan into a store: predicts every tube, judges every thermocouple, updates.
 *
 * @param drive null before the first scan (nothing to predict over)
 * @param unknownTravel_m one-sigma travel that no flow reading covered since readings stopped [m]
 * @param otherAnew another store through which the same gas flows has just been found elsewhere
 */
export function stepStore(
  model: StoreModel,
  state: StoreState,
  drive: TubeDrive | null,
  values: Float64Array,
  time_ms: number,
  unknownTravel_m: number,
  otherAnew = false,
): StoreStep {
  rememberReadings(model, state, values, time_ms);
  state.used = 0;
  state.settled = Math.min(SETTLED_MAX, state.settled + 1);
  if (!state.started) {
    const readings = usableReadings(model, state, time_ms);
    rememberStart(model, state, values, time_ms);
    if (readings.length < 2) return 'not_started';
    restart(model, state, time_ms, 1, null);
    state.started = true;
    return 'reacquired';
  }
  if (drive !== null) {
    state.known_s += drive.dt_s;
    model.tubes.forEach((tube, k) => {
      predictTube(tube, state.tubes[k] as TubeState, drive, model.scratch[k] as TubeScratch);
    });
    if (model.wall !== null && state.wall !== null) {
      const k = model.wall.tube;
      const beside = state.tubes[k] as TubeState;
      const before = model.wall.ring.length > 1 ? beside.enthalpy.slice() : null;
      stepWall(
        model.wall,
        model.tubes[k] as TubeModel,
        beside,
        state.wall,
        drive,
        model.scratch[k] as TubeScratch,
      );
      if (before !== null) shareAround(model.wall, state.tubes, before);
    }
  }
  const enough = usableReadings(model, state, time_ms).length >= 3;
  // In a gap it may have gone there and back: lines between readings assume no way.
  if (unknownTravel_m > LOST_TRAVEL_M && enough) {
    restart(model, state, time_ms, REACQUIRE_INFLATION, null);
    return 'reacquired';
  }
  if (otherAnew && enough && isBlindBetween(model, state)) {
    restart(model, state, time_ms, REACQUIRE_INFLATION, drive);
    return 'reacquired';
  }
  return updateStore(model, state, values, time_ms, drive);
}

/** Too soon after it was drawn anew itself to be drawn anew for another store. */
const SETTLED_LEAST = 10;

/**
 * Whether a front may be elsewhere without most readings showing it: an only string. What moved the
 * front of another store unseen has moved this one's.
 */
const isBlindBetween = (model: StoreModel, state: StoreState): boolean =>
  model.tubes.length === 1 && state.settled > SETTLED_LEAST;
