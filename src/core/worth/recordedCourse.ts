import type { UnitDefinition } from '../definitions.js';
import type { RejectedSensor } from '../estimate.js';
import type { Scan } from '../scan/scan.js';
import { readConditions } from '../track/conditions.js';
import { driveOf, storeOutlets, unknownTravel } from '../track/drive.js';
import { withoutImplausible } from '../track/plausible.js';
import type { StoreState } from '../track/storeTracker.js';
import type { TubeDrive } from '../track/tube.js';
import { advance, startUnit } from '../unit.js';
import { type UnitModel, unitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import type { Course, CourseStep, TubeMean } from './course.js';
import { outOfUse } from './outOfUse.js';

/** A course in the making: the estimator runs along, and its means are kept. */
export interface CourseRecorder {
  readonly model: UnitModel;
  readonly state: UnitState;
  readonly steps: CourseStep[];
  start: Float64Array[][] | null;
  open: OpenStep | null;
}

/** Scans that make one step: sums over time of what drives the stores. */
interface OpenStep {
  readonly mode: CourseStep['mode'];
  scans: number;
  drives: TubeDrive[];
}

/** Longest step [s]: covariances change over hours. */
const STEP_S = 300;
/** Shortest recording of which a course is made [s]. */
export const LEAST_COURSE_S = 4 * 3600;
const ASK = { hours_at_W: [], profile: false };

/** A recorder with nothing taken yet; its course begins once every store has started. */
export function recordCourse(unit: UnitDefinition): CourseRecorder {
  return { model: unitModel(unit), state: startUnit(unit), steps: [], start: null, open: null };
}

/**
 * Takes one scan of a recording: the estimator as a whole goes on by it, and what moved the beds
 * since the last one is kept, several scans to a step.
 *
 * @throws RangeError for a scan not later than the last, or of the wrong length
 */
export function takeScan(recorder: CourseRecorder, raw: Scan): void {
  const { model, state } = recorder;
  const { scan } = withoutImplausible(model.ranges, raw);
  const moving = recorder.start !== null && state.time_ms !== null;
  const dt_s = state.time_ms === null ? 0 : (scan.time_ms - state.time_ms) / 1000;
  const drives = moving ? drivesOf(model, state, scan, dt_s) : null;
  advance(model.unit, state, raw, ASK);
  if (drives === null) {
    if (state.stores.every((store) => store.started)) recorder.start = enthalpies(state);
    return;
  }
  const { open } = recorder;
  if (open !== null && open.mode !== state.mode) close(recorder);
  const read = model.thermocouples.some((i) => Number.isFinite(scan.values[i])) ? 1 : 0;
  if (recorder.open === null) recorder.open = { mode: state.mode, scans: read, drives };
  else {
    recorder.open.scans += read;
    recorder.open.drives = recorder.open.drives.map((a, s) => joined(a, drives[s] as TubeDrive));
  }
  if ((recorder.open.drives[0]?.dt_s ?? 0) >= STEP_S) close(recorder);
}

function drivesOf(model: UnitModel, state: UnitState, scan: Scan, dt_s: number): TubeDrive[] {
  // Copies: what conditions remember goes on in `advance`.
  const conditionsState = structuredClone(state.conditions);
  const travelled = { ...state, unknownTravel_m: [...state.unknownTravel_m] };
  const outlets = storeOutlets(model, state, scan);
  const conditions = readConditions(
    model.unit,
    model.map,
    model.machine,
    conditionsState,
    scan,
    dt_s,
    outlets,
  );
  return model.stores.map((_, s) => {
    const travel = unknownTravel(model, travelled, s, dt_s, conditions);
    return driveOf(model, s, conditions, scan, dt_s, outlets, travel);
  });
}

/** Two stretches as one: heat carried in, time and unknown travel stay what they were together. */
function joined(a: TubeDrive, b: TubeDrive): TubeDrive {
  const dt_s = a.dt_s + b.dt_s;
  const mean = (x: number, y: number): number => (x * a.dt_s + y * b.dt_s) / dt_s;
  const flux = mean(a.massFlux_kg_m2s, b.massFlux_kg_m2s);
  const gas = Math.abs(a.massFlux_kg_m2s) * a.dt_s;
  const more = Math.abs(b.massFlux_kg_m2s) * b.dt_s;
  const inlet = gas + more > 0 ? (gas * a.inlet_K + more * b.inlet_K) / (gas + more) : b.inlet_K;
  return {
    massFlux_kg_m2s: flux,
    inlet_K: inlet,
    inletSigma_K: Math.sqrt(mean(a.inletSigma_K ** 2, b.inletSigma_K ** 2)),
    ambient_K: mean(a.ambient_K, b.ambient_K),
    dt_s,
    travelSigma_m: Math.hypot(a.travelSigma_m, b.travelSigma_m),
    ...standing(a, b),
  };
}

/** Gas at both ends while standing, as a mean over time of what was read. */
function standing(a: TubeDrive, b: TubeDrive): Pick<TubeDrive, 'standing_K'> {
  const [x, y] = [a.standing_K, b.standing_K];
  if (x === undefined || y === undefined) {
    const one = x ?? y;
    return one === undefined ? {} : { standing_K: one };
  }
  const mean = (end: keyof typeof x): number => {
    if (!Number.isFinite(x[end])) return y[end];
    if (!Number.isFinite(y[end])) return x[end];
    return (x[end] * a.dt_s + y[end] * b.dt_s) / (a.dt_s + b.dt_s);
  };
  return {
    standing_K: {
      charge_inlet: mean('charge_inlet'),
      discharge_inlet: mean('discharge_inlet'),
    },
  };
}

function enthalpies(state: UnitState): Float64Array[][] {
  return state.stores.map(({ tubes }) => tubes.map((t) => Float64Array.from(t.enthalpy)));
}

function close(recorder: CourseRecorder): void {
  const { open, state } = recorder;
  if (open === null) return;
  const means = state.stores.map(({ tubes }) =>
    tubes.map(
      (t): TubeMean => ({
        enthalpy: Float64Array.from(t.enthalpy),
        further: Float64Array.from(t.further),
        gasLag_m: Float64Array.from(t.gasLag_m),
      }),
    ),
  );
  const walls = structuredClone(state.stores.map(({ wall }) => wall));
  const { mode, drives, scans } = open;
  const known_s = state.stores.map((store) => store.known_s);
  recorder.steps.push({ mode, drives, scans, means, walls, known_s });
  recorder.open = null;
}

/**
 * The course of what was taken: a quarter of the time with all thermocouples, a quarter for the
 * loss to tell, and sigmas over the rest. Those out of use at its end count as such throughout.
 *
 * @returns null where it covers less than `LEAST_COURSE_S` since every store has started
 */
export function courseOf(
  recorder: CourseRecorder,
): { course: Course; rejected: RejectedSensor[]; covered_s: number } | null {
  close(recorder);
  const { model, state, steps, start } = recorder;
  const ends: number[] = [];
  let covered_s = 0;
  for (const step of steps) {
    covered_s += step.drives[0]?.dt_s ?? 0;
    ends.push(covered_s);
  }
  if (start === null || covered_s < LEAST_COURSE_S) return null;
  const after = (share: number): number => ends.findIndex((t) => t >= share * covered_s) + 1;
  const rejected = model.stores.flatMap((store, s) =>
    outOfUse(store, state.stores[s] as StoreState),
  );
  return {
    course: {
      steps,
      loss_at: after(0.25),
      weigh_from: Math.min(after(0.5), steps.length - 1),
      start,
    },
    rejected,
    covered_s,
  };
}
