import { MODEL_SIGMA } from '../dispatch/hours.js';
import { storeEnergy } from '../track/storeEnergy.js';
import type { StoreState } from '../track/storeTracker.js';
import { type Command, commandOf } from './command.js';
import type { PlanContext } from './context.js';
import { cutAtEdges } from './course.js';
import { type Evaluation, evaluate } from './evaluation.js';
import { directionOf, type Leg } from './leg.js';
import { createOutlook, type Outlook } from './outlook.js';
import type { Marches } from './spread.js';

/** Carries out legs from one state, with one machine and one set of beds. */
export interface Planner {
  readonly outlook: Outlook;
  /** How far past its end each run is followed [s]. */
  readonly beyond_s: number;
  /** What the machine is told; its pieces end at every edge of the legs. */
  command(legs: readonly Leg[]): Command;
  evaluate(command: Command, marches?: Marches): Evaluation;
}

/** A reserve of so many sigmas is as good as certain. */
const SIGMAS = 4;
const LEAST_BEYOND_S = 1800;
const MOST_BEYOND_S = 8 * 3600;

/**
 * @param end_s end of the last leg [s]
 */
export function createPlanner(context: PlanContext, legs: readonly Leg[], end_s: number): Planner {
  const { model, state, before } = context;
  const outlook = createOutlook(model, state, loadOf(legs, model.unit.rated_power_W));
  const beyond_s = beyondOf(outlook, legs);
  const ceilings = context.ceilings(end_s);
  const edges = legs.flatMap(({ from_s, to_s }) => [from_s, to_s]);
  const until_s = end_s + longestRamp(context);
  return {
    outlook,
    beyond_s,
    command: (own) => {
      const inside = own.flatMap(({ from_s, to_s }) => [from_s, to_s]);
      const command = commandOf(model.unit, own, ceilings, before, until_s);
      return cutAtEdges(command, [...edges, ...inside]);
    },
    evaluate: (command, marches) => {
      const own = marches ?? {
        best: () => outlook.best(command, { beyond_s }),
        march: (change) => outlook.march(command, change, { beyond_s }),
        marchFine: (change) => outlook.marchFine(command, change, { beyond_s }),
      };
      return evaluate(outlook, command, own, beyond_s);
    },
  };
}

/** Power of the running legs over rated power, mean over their time; 1 where none runs. */
function loadOf(legs: readonly Leg[], rated_W: number): number {
  let energy = 0;
  let time = 0;
  for (const leg of legs) {
    if (directionOf(leg) === null) continue;
    energy += leg.power_W * (leg.to_s - leg.from_s);
    time += leg.to_s - leg.from_s;
  }
  return time > 0 ? energy / time / rated_W : 1;
}

/** So that the last leg's ramp down to standing is part of the command [s]. */
function longestRamp({ model }: PlanContext): number {
  const { operation, charge, discharge } = model.unit.limits;
  const rates = operation?.ramp_W_s;
  const down = (max_W: number, rate: number | null | undefined): number =>
    rate ? max_W / rate : 0;
  return Math.max(
    down(charge.power_max_W, rates?.charge),
    down(discharge.power_max_W, rates?.discharge),
  );
}

/**
 * How far past its end a run has to be followed so that what is not reached there is as good as
 * certain: four sigmas of its time, from what the stores' charge, meter and machine leave open.
 */
function beyondOf({ model, state, calibration }: Outlook, legs: readonly Leg[]): number {
  const { rated_hours, rated_power_W } = model.unit;
  const relative = Math.hypot(
    MODEL_SIGMA,
    ...calibration.covariance.map((row, i) => Math.sqrt(row[i] as number)),
  );
  const soc = Math.max(
    ...model.stores.map((store, s) => storeEnergy(store, state.stores[s] as StoreState).soc_sigma),
  );
  let run_s = 0;
  let longest_s = 0;
  let last: Leg | null = null;
  for (const leg of legs) {
    const goesOn = last?.mode === leg.mode && last.to_s === leg.from_s;
    run_s = directionOf(leg) === null ? 0 : (goesOn ? run_s : 0) + leg.to_s - leg.from_s;
    longest_s = Math.max(longest_s, run_s);
    last = leg;
  }
  const powers = legs.filter((leg) => directionOf(leg) !== null).map((leg) => leg.power_W);
  const full_s = (rated_hours * 3600 * rated_power_W) / Math.min(rated_power_W, ...powers);
  const sigma_s = Math.hypot(soc * full_s, relative * longest_s);
  return Math.min(MOST_BEYOND_S, Math.max(LEAST_BEYOND_S, SIGMAS * sigma_s));
}
