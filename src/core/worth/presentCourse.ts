import { halfCycle } from '../cycle/settledCycle.js';
import type { Direction, Mode } from '../definitions.js';
import type { RejectedSensor } from '../estimate.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import { streamsOf } from '../track/streams.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import {
  type Course,
  type CourseStep,
  courseStep,
  flowingStep_s,
  readSeldom,
  STANDING_STEP_S,
} from './course.js';
import { outOfUse } from './outOfUse.js';

/** What lies ahead of a unit as it is now. */
export interface PresentCourse {
  readonly course: Course;
  readonly mode: Mode;
  readonly hours: number;
  /** Out of use now. */
  readonly rejected: readonly RejectedSensor[];
}

const HOUR_S = 3600;
/** Hours looked ahead at most; a discharge or charge that is shorter than the least is none. */
const MOST_H = 12;
const LEAST_H = 1;
/** Stood where neither is possible. */
const STAND_H = 6;

/**
 * The hours ahead, from the present state with all that the filter knows: a discharge at rated power
 * until a rule ends it, where there is none of an hour a charge, else standing. Whatever is lost is
 * lost at once.
 *
 * @returns null before every store has started
 */
export function presentCourse(model: UnitModel, state: UnitState): PresentCourse | null {
  if (!state.stores.every((store) => store.started)) return null;
  const { mode, steps } = ahead(model, state, 'discharge') ??
    ahead(model, state, 'charge') ?? { mode: 'stand', steps: standing(model, state) };
  const seconds = steps.reduce((sum, step) => sum + (step.drives[0]?.dt_s ?? 0), 0);
  return {
    mode,
    hours: seconds / HOUR_S,
    rejected: model.stores.flatMap((store, s) => outOfUse(store, state.stores[s] as StoreState)),
    course: {
      steps: readSeldom(steps),
      loss_at: 0,
      weigh_from: 0,
      start: state.stores.map(({ tubes }) => tubes.map((t) => t.enthalpy)),
      states: state.stores,
    },
  };
}

function ahead(
  model: UnitModel,
  state: UnitState,
  direction: Direction,
): { mode: Mode; steps: CourseStep[] } | null {
  const steps: CourseStep[] = [];
  let time_s = 0;
  const start = model.stores.map((store, s) => meanEnthalpy(store, state.stores[s] as StoreState));
  halfCycle(model.unit, model.machine, direction, start, {
    step_s: flowingStep_s(model),
    each: (step) => {
      if (time_s < MOST_H * HOUR_S) steps.push(courseStep(model, step, state.ambient_K));
      time_s += step.dt_s;
    },
  });
  return time_s >= LEAST_H * HOUR_S ? { mode: direction, steps } : null;
}

/** Area-weighted enthalpy over the cross-section [J/m3 of bed]. */
function meanEnthalpy(store: StoreModel, state: StoreState): Float64Array {
  const mean = new Float64Array(store.tubes[0]?.layout.cells ?? 0);
  for (const { share, enthalpy } of streamsOf(store, state)) {
    for (let i = 0; i < mean.length; i++) {
      mean[i] = (mean[i] as number) + share * (enthalpy[i] as number);
    }
  }
  return mean;
}

function standing(model: UnitModel, state: UnitState): CourseStep[] {
  const step = courseStep(
    model,
    {
      mode: 'stand',
      flow_kg_s: 0,
      inlets_K: model.stores.map(({ store }) => store.reference_cold_K),
      outlets: { hot_K: Number.NaN, cold_K: null },
      dt_s: Math.max(STANDING_STEP_S, model.unit.scan_period_s),
    },
    state.ambient_K,
  );
  return Array.from(
    { length: Math.round((STAND_H * HOUR_S) / (step.drives[0]?.dt_s ?? 1)) },
    () => step,
  );
}
