import { MODEL_SIGMA } from '../dispatch/hours.js';
import { storeEnergy } from '../track/storeEnergy.js';
import type { StoreState } from '../track/storeTracker.js';
import { type Command, commandOf } from './command.js';
import type { PlanContext } from './context.js';
import { type Course, cutAtEdges } from './course.js';
import type { MarchOptions } from './episode.js';
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

/** A reserve of so many sigmas is as good as certain: 1 in 700 is short all the same. */
const SIGMAS = 3;
const LEAST_BEYOND_S = 1800;
/** Bare beds, and what is changed by a per cent, break by so much of a run sooner or later at most. */
const LESS_FINE = 0.05;
const LEAST_FURTHER_S = 600;
const MOST_BEYOND_S = 4 * 3600;

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
      return evaluate(
        outlook,
        command,
        marches ?? plainMarches(outlook, command, beyond_s),
        beyond_s,
      );
    },
  };
}

function plainMarches(outlook: Outlook, command: Command, beyond_s: number): Marches {
  let further: Partial<MarchOptions> = { beyond_s };
  return {
    best: () => {
      const best = outlook.best(command, { beyond_s });
      further = { beyond_s: asFarAs(best) };
      return best;
    },
    march: (change) => outlook.march(command, change, further),
    marchFine: (change) => outlook.marchFine(command, change, further),
  };
}

/**
 * How far marches for gradients follow each run: further than the best one found a rule broken, so
 * that it breaks here too. A rule that these did not reach would have no slope, and no sigma. Where
 * the best one found none, no further than the run.
 */
export function asFarAs(best: Course): (from_s: number, held_s: number) => number {
  return (from_s, held_s) => {
    const like = best.episodes.find(
      (episode) => episode.from_s < held_s && episode.held_s > from_s,
    );
    const broken = [...(like?.times_s ?? [])].filter(Number.isFinite);
    if (like === undefined || broken.length === 0) return 0;
    const last_s = Math.max(...broken);
    return Math.max(0, last_s - held_s) + LESS_FINE * (last_s - like.from_s) + LEAST_FURTHER_S;
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
 * certain: three sigmas of its time, from what the stores' charge, meter and machine leave open.
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
  const running = legs.filter((leg) => directionOf(leg) !== null);
  const total_s = (mode: Leg['mode']): number =>
    running.reduce((sum, leg) => sum + (leg.mode === mode ? leg.to_s - leg.from_s : 0), 0);
  const powers = running.map((leg) => leg.power_W);
  const full_s = (rated_hours * 3600 * rated_power_W) / Math.min(rated_power_W, ...powers);
  const sigma_s = Math.hypot(
    soc * full_s,
    relative * total_s('charge'),
    relative * total_s('discharge'),
  );
  return Math.min(MOST_BEYOND_S, Math.max(LEAST_BEYOND_S, SIGMAS * sigma_s));
}
