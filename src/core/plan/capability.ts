import type { Direction } from '../definitions.js';
import { heatCapacities } from '../dispatch/heatCapacity.js';
import type { EndCause } from '../estimate.js';
import { type BedsAhead, startAhead } from './bedsAhead.js';
import {
  chargeOf,
  longest_s,
  type Path,
  type PathMarch,
  type PathSample,
  pathOf,
} from './capabilityPaths.js';
import { byStore, contentOf } from './content.js';
import type { PlanContext } from './context.js';
import { energyBetween } from './course.js';
import { nominalCeiling, type PowerLimit } from './greatest.js';
import { type LimitRun, runToLimit } from './limitToLimit.js';
import { createOutlook } from './outlook.js';
import { fewestPoints, largestError } from './piecewise.js';
import { settledFull } from './settledBeds.js';

export interface CapabilityAsk {
  /** Largest error of the curves over rated power [-]; 0.01 where absent. */
  readonly tolerance?: number;
}

/** A point of a curve; straight lines run between them. */
export interface CapabilityPoint {
  /** As the unit publishes it: dispatchable energy over rated energy at rated power. */
  readonly state_of_charge: number;
  /** Greatest net power at the connection point. */
  readonly power_MW_el: number;
  readonly limited_by: PowerLimit;
  /** Given from here to empty at rated power; or taken from here to full, at the charging power. */
  readonly energy_MWh_el: number;
  /** Above the discharged reference, by store. */
  readonly stored_MWh_th: Record<string, number>;
}

export interface CapabilityCurve {
  readonly direction: Direction;
  /** Power that the beds were marched with, less where the greatest flow gives less. */
  readonly marched_at_MW_el: number;
  /**
   * 0: from the present beds; n: from the n-th cycle after, since the beds as they are now hardly
   * reach anywhere; null: from a settled cycle of the model, since these cannot be moved at all.
   */
  readonly after_cycles: number | null;
  readonly points: CapabilityPoint[];
  /** Of the straight lines against every step of the marches. */
  readonly largest_error_MW_el: number;
  readonly tolerance_MW_el: number;
  /** Steps of the marches that the error was taken over. */
  readonly steps: number;
  /** The rule that ends the direction where its curve ends; null: none within the time looked ahead. */
  readonly ends_by: EndCause | null;
  /** Still given below rated power once the state of charge is 0; 0 while charging. */
  readonly beyond_MWh_el: number;
  /** Why the unit cannot run in this direction; null: it can. */
  readonly refused: string | null;
}

export interface Capability {
  readonly state_of_charge: number;
  /** Where a charge from now would end. */
  readonly full_from_now: number;
  readonly rated_power_MW_el: number;
  readonly rated_hours: number;
  readonly discharge: CapabilityCurve;
  readonly charge: CapabilityCurve;
  /** Of the last cycle marched from limit to limit, null where one direction is refused. */
  readonly cycle: CycleFigures | null;
}

export interface CycleFigures {
  /** How many were marched, and whether the last repeated the one before. */
  readonly cycles: number;
  readonly settled: boolean;
  /** Where its charge ends. */
  readonly full_state_of_charge: number;
  readonly charge_MWh_el: number;
  readonly discharge_MWh_el: number;
  readonly round_trip: number;
  /** Electricity over what each store takes in, or gives. */
  readonly charge_MWh_el_per_MWh_th: Record<string, number>;
  readonly discharge_MWh_el_per_MWh_th: Record<string, number>;
}

const J_PER_MWH = 3.6e9;
const TOLERANCE = 0.01;
const TOLERANCES: readonly [number, number] = [0.0005, 0.2];
/** A cycle repeats itself where its discharge differs by less, over the rated hours. */
const SETTLED = 0.005;
const MOST_CYCLES = 4;
/** Beds that reach this share of the last cycle's state of charge give the curve. */
const ENOUGH = 0.5;
/** Beds that reach less can neither be charged nor discharged: one store is full, the other empty. */
const LEAST_REACH = 0.02;

/**
 * Greatest power in both directions against state of charge.
 *
 * The present beds are charged at the greatest power to the rule that ends it (full), from there
 * discharged at rated power to the rule that ends that (empty), charged again, and so on until the
 * cycle repeats itself. The first discharge from full to empty and the first charge from empty to
 * full give the curves, so that these have the shape of the present fronts; where the beds as they
 * are reach less than half of the state of charge of the last cycle, too little to have a shape, the
 * first that reach so far (`after_cycles`); where they cannot be moved at all, those of a settled
 * cycle of the model (`settledFull`). At every step the greatest power is that of `greatestPower`. State of charge along
 * a discharge is the time left at rated power; along a charge it comes from discharges rolled out on
 * the way. At 0 a discharge stops and at the last point a charge does.
 *
 * The curves are drawn with the fewest points that keep within the tolerance of every step (see
 * `fewestPoints`); their largest error is computed.
 *
 * @throws RangeError for a tolerance outside 0.0005 to 0.2
 */
export function capabilityOf(context: PlanContext, ask: CapabilityAsk): Capability {
  const { unit } = context.model;
  const tolerance = ask.tolerance ?? TOLERANCE;
  if (!(tolerance >= TOLERANCES[0] && tolerance <= TOLERANCES[1])) {
    throw new RangeError(
      `tolerance = ${tolerance}: expected ${TOLERANCES[0]} to ${TOLERANCES[1]} of rated power`,
    );
  }
  const { ahead: model, options } = createOutlook(context.model, context.state).beds();
  const capacity = heatCapacities(context.model, context.state);
  const march: PathMarch = { model, options, capacity };
  const now = startAhead(model);
  const refused = { charge: refusal(march, 'charge'), discharge: refusal(march, 'discharge') };
  const charging_W = nominalCeiling(model, 'charge').power_W;
  const down = (from: BedsAhead): Path => pathOf(march, from, 'discharge', unit.rated_power_W);
  const most = { time_s: longest_s(model, charging_W) };
  const up = (from: BedsAhead): LimitRun =>
    runToLimit(model, from, 'charge', charging_W, most, options);
  const charges = refused.charge === null;
  const full = charges ? up(now) : null;
  let cycles = cyclesFrom(down(full?.end ?? now), charges ? up : null, down, unit.rated_hours);
  const stuck = charges && reachOf(cycles.downs.at(-1)) < LEAST_REACH;
  const instead = stuck ? settledFull(model) : null;
  if (instead !== null) cycles = cyclesFrom(down(instead), up, down, unit.rated_hours);
  const { downs, ups, settled } = cycles;
  const tolerance_W = tolerance * unit.rated_power_W;
  const curve = (direction: Direction): CapabilityCurve => {
    // A charge reaches as far as the discharge after it begins.
    const after = reaching(direction === 'charge' ? downs.slice(1) : downs);
    const power_W = direction === 'charge' ? charging_W : unit.rated_power_W;
    const after_cycles = instead === null ? after : null;
    const given = { power_W, tolerance_W, after_cycles, refused: refused[direction] };
    if (given.refused !== null) return drawn(march, direction, undefined, given);
    const from = downs[after] as Path;
    const path = direction === 'charge' ? pathOf(march, from.run.end, direction, power_W) : from;
    return drawn(march, direction, path, given);
  };
  const lastUp = ups.at(-1);
  return {
    state_of_charge: chargeOf(march, now),
    full_from_now: chargeOf(march, full?.end ?? now),
    rated_power_MW_el: unit.rated_power_W / 1e6,
    rated_hours: unit.rated_hours,
    discharge: curve('discharge'),
    charge: curve('charge'),
    cycle:
      lastUp === undefined || refused.discharge !== null
        ? null
        : figures(march, lastUp, downs.slice(-2) as [Path, Path], { cycles: ups.length, settled }),
  };
}

/** Discharges and the charges between them, from the first on until the cycle repeats itself. */
function cyclesFrom(
  first: Path,
  up: ((from: BedsAhead) => LimitRun) | null,
  down: (from: BedsAhead) => Path,
  rated_hours: number,
): { readonly downs: Path[]; readonly ups: LimitRun[]; readonly settled: boolean } {
  const downs = [first];
  const ups: LimitRun[] = [];
  while (up !== null && downs.length <= MOST_CYCLES) {
    const before = downs.at(-1) as Path;
    const charge = up(before.run.end);
    const next = down(charge.end);
    ups.push(charge);
    downs.push(next);
    if (Math.abs(next.run.hours - before.run.hours) < SETTLED * rated_hours) {
      return { downs, ups, settled: true };
    }
  }
  return { downs, ups, settled: false };
}

/** State of charge that a path reaches. */
function reachOf(path: Path | undefined): number {
  return path?.samples.at(-1)?.soc ?? 0;
}

/** The first path that reaches far enough against the last; 0 of none. */
function reaching(paths: readonly Path[]): number {
  const settled = reachOf(paths.at(-1));
  return Math.max(
    0,
    paths.findIndex((path) => reachOf(path) >= ENOUGH * settled),
  );
}

function refusal({ model }: PathMarch, direction: Direction): string | null {
  const { power_W, limited_by } = nominalCeiling(model, direction);
  const least = model.unit.limits[direction].power_min_W;
  if (power_W > 0 && power_W >= least) return null;
  const through = (power_W / 1e6).toFixed(3);
  return `${limited_by}: ${through} MW_el at most, the least power is ${(least / 1e6).toFixed(3)} MW_el`;
}

function drawn(
  { model }: PathMarch,
  direction: Direction,
  path: Path | undefined,
  given: {
    readonly power_W: number;
    readonly tolerance_W: number;
    readonly after_cycles: number | null;
    readonly refused: string | null;
  },
): CapabilityCurve {
  const samples = path?.samples ?? [];
  const line = samples.map(({ soc, power_W }) => ({ x: soc, y: power_W }));
  const kept = line.length === 0 ? [] : fewestPoints(line, given.tolerance_W);
  const curve = kept.map((i) => line[i] as (typeof line)[number]);
  return {
    direction,
    marched_at_MW_el: given.power_W / 1e6,
    after_cycles: given.after_cycles,
    points: kept.map((i): CapabilityPoint => {
      const sample = samples[i] as PathSample;
      return {
        state_of_charge: sample.soc,
        power_MW_el: sample.power_W / 1e6,
        limited_by: sample.limited_by,
        energy_MWh_el: sample.energy_J / J_PER_MWH,
        stored_MWh_th: byStore(model, sample.content_MWh_th),
      };
    }),
    largest_error_MW_el: curve.length === 0 ? 0 : largestError(curve, line) / 1e6,
    tolerance_MW_el: given.tolerance_W / 1e6,
    steps: line.length,
    ends_by: path?.run.ends_by ?? null,
    beyond_MWh_el: path === undefined ? 0 : beyondZero(path),
    refused: given.refused,
  };
}

/** What a discharge still gives below rated power once its state of charge is 0 [MWh_el]. */
function beyondZero({ run }: Path): number {
  if (run.direction === 'charge' || !(run.first_h < run.hours)) return 0;
  return energyBetween(run.delivered, run.first_h * 3600, run.hours * 3600) / J_PER_MWH;
}

/** Energies of a charge and the discharge that follows it, and of the stores in each. */
function figures(
  { model, capacity }: PathMarch,
  up: LimitRun,
  [before, down]: readonly [Path, Path],
  marched: Pick<CycleFigures, 'cycles' | 'settled'>,
): CycleFigures {
  const charge_MWh_el = up.energy_J / J_PER_MWH;
  const discharge_MWh_el = down.run.energy_J / J_PER_MWH;
  const full = contentOf(model, up.end, capacity);
  const per = (energy: number, empty: BedsAhead) =>
    byStore(
      model,
      contentOf(model, empty, capacity).map((value, s) => energy / ((full[s] as number) - value)),
    );
  return {
    ...marched,
    full_state_of_charge: down.samples.at(-1)?.soc ?? 0,
    charge_MWh_el,
    discharge_MWh_el,
    round_trip: discharge_MWh_el / charge_MWh_el,
    charge_MWh_el_per_MWh_th: per(charge_MWh_el, before.run.end),
    discharge_MWh_el_per_MWh_th: per(discharge_MWh_el, down.run.end),
  };
}
