import { planSubsteps } from '../bed/kernel.js';
import { type CycleStep, type SettledCycle, settledCycle } from '../cycle/settledCycle.js';
import type { Mode } from '../definitions.js';
import type { Conditions } from '../track/conditions.js';
import { driveOf } from '../track/drive.js';
import type { StoreState } from '../track/storeTracker.js';
import type { TubeDrive, TubeState } from '../track/tube.js';
import type { WallState } from '../track/wallZone.js';
import type { UnitModel } from '../unitModel.js';

/** A tube's mean as the covariance needs it: where the front stands, and the factors. */
export type TubeMean = Pick<TubeState, 'enthalpy' | 'further' | 'gasLag_m'>;

/** A step of a course, the same for all stores of a unit. */
export interface CourseStep {
  readonly mode: Mode;
  /** What moves each store's tubes. */
  readonly drives: readonly TubeDrive[];
  /** Scans of readings taken in at the end of the step; 0 = none yet, or none came. */
  readonly scans: number;
  /** Mean of each store's tubes after the step; absent where the model alone moves it. */
  readonly means?: readonly (readonly TubeMean[])[];
  /** With the means: the layers at each store's wall, null where there are none. */
  readonly walls?: readonly (WallState | null)[];
  /** With the means: time since each store's profile was last drawn anew [s]. */
  readonly known_s?: readonly number[];
}

/**
 * What a unit goes through while sensors are weighed. All thermocouples are there until the step
 * `loss_at`; from `weigh_from` on sigmas are counted.
 */
export interface Course {
  readonly steps: readonly CourseStep[];
  readonly loss_at: number;
  readonly weigh_from: number;
  /** Enthalpy at the start, by store and tube [J/m3 of bed]. */
  readonly start: readonly (readonly Float64Array[])[];
  /** States of the stores to start from with all that is known; without them nothing is known yet. */
  readonly states?: readonly StoreState[];
}

/** Longest steps of a course [s], and how often readings are taken in: covariances change over hours. */
const FLOWING_STEP_S = 300;
export const STANDING_STEP_S = 900;
const READ_EVERY_S = 300;
const HOUR_S = 3600;
const DAY_H = 24;
/** Stood at least after each charge and discharge [s]. */
const LEAST_STAND_S = HOUR_S;
/** Cycles that all thermocouples see from an ignorant start: the second changes sigma by percents. */
const BEFORE_CYCLES = 2;
/** Cycles between the loss and the one that is weighed: what was known of the bed has left it. */
const SETTLING_CYCLES = 1;

/**
 * The course of a settled daily cycle at the greatest charging and the rated discharging power,
 * between the rules that end them; what is left of the day is stood, half after each.
 *
 * Scans arrive at the unit's period, so after a time t the readings of t/period scans are taken in
 * at once: their white noise is averaged, what moves slowly between is not.
 */
export function cycleCourse(model: UnitModel): { course: Course; cycle: SettledCycle } {
  const { unit } = model;
  const steps: CourseStep[] = [];
  let start: Float64Array[][] = [];
  const cycle = settledCycle(unit, model.machine, {
    cells: unit.estimator.cells,
    step_s: flowingStep_s(model),
    stand_step_s: Math.max(STANDING_STEP_S, unit.scan_period_s),
    stand_s: (running_h) => Math.max(LEAST_STAND_S, ((DAY_H - running_h) / 2) * HOUR_S),
    each: (step) => {
      if (steps.length === 0) {
        start = model.stores.map((store, s) =>
          store.tubes.map(() => Float64Array.from(step.enthalpy[s] as Float64Array)),
        );
      }
      steps.push(courseStep(model, step));
    },
  });
  const cycles = BEFORE_CYCLES + SETTLING_CYCLES + 1;
  const course: Course = {
    steps: Array.from({ length: cycles }, () => readSeldom(steps)).flat(),
    loss_at: BEFORE_CYCLES * steps.length,
    weigh_from: (BEFORE_CYCLES + SETTLING_CYCLES) * steps.length,
    start,
  };
  return { course, cycle };
}

/** Takes readings in no more often than `READ_EVERY_S`, and at the end of each phase. */
export function readSeldom(steps: readonly CourseStep[]): CourseStep[] {
  let waiting_s = 0;
  let scans = 0;
  return steps.map((step, n): CourseStep => {
    waiting_s += step.drives[0]?.dt_s ?? 0;
    scans += step.scans;
    if (waiting_s < READ_EVERY_S && steps[n + 1]?.mode === step.mode) return { ...step, scans: 0 };
    const read = { ...step, scans };
    waiting_s = 0;
    scans = 0;
    return read;
  });
}

/**
 * As many of the pieces that the bed's model takes at the greatest flow as fit in the longest step:
 * a step a little longer than its last whole piece would cost one more.
 */
export function flowingStep_s({ unit, machine, stores }: UnitModel): number {
  let most = 0;
  settledCycle(unit, machine, {
    each: ({ flow_kg_s }) => {
      most = Math.max(most, Math.abs(flow_kg_s));
    },
  });
  const pieces = (dt_s: number): number =>
    Math.max(
      ...stores.map(({ store, tables }) =>
        planSubsteps(tables, unit.estimator.cells, {
          massFlux_kg_m2s: most / store.bed.area_m2,
          inlet_K: store.reference_hot_K,
          ambient_K: unit.ambient_K,
          dt_s,
          heatTransferFactor: 1,
          wallLoss_W_m3K: 0,
        }),
      ),
    );
  let best = FLOWING_STEP_S;
  for (let dt = FLOWING_STEP_S; dt >= FLOWING_STEP_S / 2; dt -= 10) {
    if (dt / pieces(dt) > best / pieces(best)) best = dt;
  }
  return Math.max(best, unit.scan_period_s);
}

/** Through `driveOf`, so that an inlet without a sensor is as uncertain as when tracking. */
export function courseStep(
  model: UnitModel,
  step: Omit<CycleStep, 'enthalpy'>,
  ambient_K = model.unit.ambient_K,
): CourseStep {
  const { unit, map } = model;
  const values = new Float64Array(unit.channels.length).fill(Number.NaN);
  const end = step.mode === 'discharge' ? 'discharge_inlet' : 'charge_inlet';
  model.stores.forEach(({ store }, s) => {
    const channel = map.gas[store.id]?.[end] ?? -1;
    if (channel >= 0) values[channel] = step.inlets_K[s] as number;
  });
  const conditions: Conditions = {
    mode: step.mode,
    flow_kg_s: step.flow_kg_s,
    flowKnown: true,
    flowStandIn: false,
    power_W: Number.NaN,
    ambient_K,
  };
  const scan = { time_ms: 0, values, held: new Uint8Array(values.length) };
  const outlets = { charge: step.outlets, discharge: step.outlets };
  return {
    mode: step.mode,
    scans: step.dt_s / unit.scan_period_s,
    drives: model.stores.map((_, s) => driveOf(model, s, conditions, scan, step.dt_s, outlets, 0)),
  };
}
