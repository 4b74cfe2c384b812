import { type HeatCapacity, heatCapacities } from '../dispatch/heatCapacity.js';
import type { EndCause } from '../estimate.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { type AheadModel, type BedsAhead, startAhead } from './bedsAhead.js';
import { longest_s } from './capabilityPaths.js';
import { contentOf } from './content.js';
import type { PlanContext } from './context.js';
import type { MarchOptions } from './episode.js';
import { nominalCeiling } from './greatest.js';
import { type LimitRun, runToLimit } from './limitToLimit.js';
import { createOutlook } from './outlook.js';
import { settledFull } from './settledBeds.js';

/** How the unit usually runs, for what is asked about cycles to come. */
export interface UsualAsk {
  /** Taken from the grid per usual charge [J]; absent: what gives the rated energy. */
  readonly charge_J?: number;
  /** Discharging [W]; absent: rated power. */
  readonly power_W?: number;
}

export const USUAL_CHARGES = ['asked', 'rated_energy'] as const;

/** Beds that give less of the rated energy when full can neither be charged nor discharged. */
const LEAST_SHARE = 0.02;

/** Everything that marches of usual cycles need. */
export interface Usual {
  readonly models: UnitModel;
  readonly state: UnitState;
  readonly model: AheadModel;
  readonly options: MarchOptions;
  readonly capacity: readonly HeatCapacity[];
  readonly now: BedsAhead;
  readonly charging_W: number;
  readonly power_W: number;
  /** Taken per usual charge, unless a rule ends it before [J]. */
  readonly charge_J: number;
  readonly charge_from: (typeof USUAL_CHARGES)[number];
  /** The same from now on: less what now can be given already [J]. */
  readonly firstCharge_J: number;
  /** Electricity given over taken, over a cycle from limit to limit [-]. */
  readonly round_trip: number;
  /** Electricity given over what each store gives, in its discharge [-]. */
  readonly perStore: readonly number[];
  /** True where the present beds can neither be charged nor discharged. */
  readonly locked: boolean;
  /** From now to full, from there to empty; from there to full and to empty once more. */
  readonly toFull: LimitRun;
  readonly toEmpty: LimitRun;
  readonly nextFull: LimitRun;
  readonly nextEmpty: LimitRun;
  /** From now to empty at once. */
  readonly nowEmpty: LimitRun;
}

/**
 * The usual cycle: a charge at the greatest power that takes `charge_J` or as much as its rules
 * allow, and a discharge at constant power to the rule that ends it. What it is worth is taken from a
 * cycle from limit to limit that follows on the present beds. The first charge from now takes less,
 * by what can be given already over the round trip. Of beds that cannot be moved, the cycle that tells
 * its worth follows on those of a settled cycle instead (`settledFull`).
 *
 * @throws RangeError for a charge or a power that is not above 0 or beyond the machine, and where the
 *   unit cannot charge at all
 */
export function usualCycle(context: PlanContext, ask: UsualAsk): Usual {
  const { model: models, state } = context;
  const { unit } = models;
  const power_W = ask.power_W ?? unit.rated_power_W;
  const { power_min_W, power_max_W } = unit.limits.discharge;
  if (!(power_W > 0 && power_W >= power_min_W && power_W <= power_max_W)) {
    throw new RangeError(`power_W = ${power_W}: expected ${power_min_W} to ${power_max_W}`);
  }
  if (ask.charge_J !== undefined && !(ask.charge_J > 0 && Number.isFinite(ask.charge_J))) {
    throw new RangeError(`charge_J = ${ask.charge_J}: expected a finite number above 0`);
  }
  const outlook = createOutlook(models, state, power_W / unit.rated_power_W);
  const { ahead: model, options } = outlook.beds();
  const capacity = heatCapacities(models, state);
  const now = startAhead(model);
  const charging_W = nominalCeiling(model, 'charge').power_W;
  if (!(charging_W > 0 && charging_W >= unit.limits.charge.power_min_W)) {
    throw new RangeError(
      `connection.import_max_W = ${charging_W}: expected the least charging power, ${unit.limits.charge.power_min_W}, or more`,
    );
  }
  const up = (from: BedsAhead): LimitRun =>
    runToLimit(
      model,
      from,
      'charge',
      charging_W,
      { time_s: longest_s(model, charging_W) },
      options,
    );
  const down = (from: BedsAhead): LimitRun =>
    runToLimit(model, from, 'discharge', power_W, { time_s: longest_s(model, power_W) }, options);
  const toFull = up(now);
  const toEmpty = down(toFull.end);
  const rated_J = unit.rated_power_W * unit.rated_hours * 3600;
  const own = up(toEmpty.end);
  // One store full and the other empty: what a cycle is worth is then that of the model's.
  const locked = down(own.end).energy_J < LEAST_SHARE * rated_J;
  const instead = locked ? settledFull(model) : null;
  if (locked && instead === null) {
    throw new RangeError(`power_W = ${power_W}: expected a power that a full unit can give`);
  }
  const nextFull = instead === null ? own : up(down(instead).end);
  const nextEmpty = down(nextFull.end);
  const round_trip = nextEmpty.energy_J / nextFull.energy_J;
  const full = contentOf(model, nextFull.end, capacity);
  const empty = contentOf(model, nextEmpty.end, capacity);
  const charge_J = ask.charge_J ?? rated_J / round_trip;
  const nowEmpty = down(now);
  return {
    models,
    state,
    model,
    options,
    capacity,
    now,
    charging_W,
    power_W,
    charge_J,
    firstCharge_J: Math.max(0, charge_J - nowEmpty.energy_J / round_trip),
    charge_from: ask.charge_J === undefined ? 'rated_energy' : 'asked',
    round_trip,
    perStore: full.map((value, s) => nextEmpty.energy_J / 3.6e9 / (value - (empty[s] as number))),
    locked,
    toFull,
    toEmpty,
    nextFull,
    nextEmpty,
    nowEmpty,
  };
}

/**
 * A usual charge: what is usual, or as much as its rules allow.
 *
 * @param energy_J what is usual; from the present beds on `firstCharge_J`
 */
export function usualCharge(usual: Usual, from: BedsAhead, energy_J = usual.charge_J): LimitRun {
  const { model, options, charging_W } = usual;
  const enough = { time_s: longest_s(model, charging_W), energy_J };
  return runToLimit(model, from, 'charge', charging_W, enough, options);
}

/** A discharge to the rule that ends it. */
export function toEmpty(usual: Usual, from: BedsAhead, model = usual.model): LimitRun {
  const { options, power_W } = usual;
  const enough = { time_s: longest_s(model, power_W) };
  return runToLimit(model, from, 'discharge', power_W, enough, options);
}

/** One run of a cycle at the edge. */
export interface RunFigures {
  readonly hours: number;
  readonly energy_MWh_el: number;
  /** null: it took what is usual. */
  readonly ends_by: EndCause | null;
}

export function runFigures({ hours, energy_J, ends_by }: LimitRun): RunFigures {
  return { hours, energy_MWh_el: energy_J / 3.6e9, ends_by };
}
