import type { UnitDefinition } from '../definitions.js';
import { energyBetween } from './course.js';
import type { Episode } from './episode.js';
import { type Evaluation, exceeded } from './evaluation.js';
import { NORMAL_COUNT } from './latinNormals.js';
import { directionOf, type Leg } from './leg.js';
import { type RunEnergy, runEnergy } from './runEnergy.js';

const J_PER_MWH = 3.6e9;
/** Ends of pieces are sums of floats [s]. */
const SAME_S = 1e-6;

/**
 * What becomes of one block. Energies are in the block's own direction, given while discharging and
 * taken while charging, except `net_MWh_el`. Always: planned = unmet + ramp + expected + what the
 * stores leave short, `expected_shortfall_MWh_el` being the first and the last of these.
 */
export interface BlockFigures {
  readonly planned_MWh_el: number;
  readonly expected_MWh_el: number;
  /** At least this with the certainty asked for. */
  readonly certain_MWh_el: number;
  readonly expected_shortfall_MWh_el: number;
  /** What the machine's limits, the connection or an outage leave undone, whatever the beds hold. */
  readonly unmet_MWh_el: number;
  /** What ramps take from the block, less what they add to it: no shortfall. */
  readonly ramp_MWh_el: number;
  /** Along the most likely course, + = given: ramps, start-ups and standing included. */
  readonly net_MWh_el: number;
  /** That everything asked for in the block is done, ramps aside. */
  readonly met_probability: number;
}

/** Energies of every run of an evaluated command. */
export function runEnergies(unit: UnitDefinition, evaluation: Evaluation): RunEnergy[] {
  return evaluation.course.episodes.map(({ direction }, e) =>
    runEnergy(evaluation, e, unit.limits[direction].power_min_W),
  );
}

/**
 * Figures of every leg of a command.
 *
 * @param legs that the command was made of
 * @param certainty of `certain_MWh_el`, 0.5 to 0.99
 */
export function blockFigures(
  unit: UnitDefinition,
  legs: readonly Leg[],
  evaluation: Evaluation,
  certainty: number,
): BlockFigures[] {
  const energies = runEnergies(unit, evaluation);
  return legs.map((leg, index) => figuresOf(leg, index, evaluation, energies, certainty));
}

function figuresOf(
  leg: Leg,
  index: number,
  evaluation: Evaluation,
  energies: readonly RunEnergy[],
  certainty: number,
): BlockFigures {
  const { command, course, breaks_s, first_s, start_W, stop_s, derate_s } = evaluation;
  const { from_s, to_s } = leg;
  const direction = directionOf(leg);
  const net_J = energyBetween(course.delivered, from_s, to_s);
  const planned_J = direction === null ? 0 : leg.power_W * (to_s - from_s);
  let unmet_J = 0;
  for (const part of command.unmet) {
    if (part.leg === index) unmet_J += part.missing_W * (part.to_s - part.from_s);
  }
  const within = course.episodes.flatMap((episode, e) => {
    const begin = Math.max(from_s, episode.from_s);
    const end = Math.min(to_s, episode.to_s);
    if (episode.direction !== direction || !(end > begin)) return [];
    const energy = energies[e] as RunEnergy;
    return [{ e, begin, end, energy, all: energy.commanded(begin, end), held: episode.held_s }];
  });
  const commanded_J = within.reduce((sum, part) => sum + part.all, 0);
  const values = new Float64Array(NORMAL_COUNT);
  let met = 0;
  for (let k = 0; k < NORMAL_COUNT; k++) {
    let holds = true;
    for (const { e, begin, end, energy, all, held } of within) {
      const breaks = breaks_s[e]?.[k] as number;
      if (breaks < Math.min(end, held) - SAME_S) holds = false;
      // What is missing in a run's first minutes is of the block that they are in.
      const { from_s: begins, start } = course.episodes[e] as Episode;
      const early = start_W[e] && begin < begins + (start[start.length - 1]?.t_s ?? 0);
      if (early && (first_s[e]?.[k] as number) < begin + SAME_S) holds = false;
      const whole =
        !early && (stop_s[e]?.[k] as number) >= end && (derate_s[e]?.[k] as number) >= end;
      values[k]! += whole ? all : energy.delivered(k, begin, end);
    }
    if (holds) met++;
  }
  const expected_J = values.reduce((sum, value) => sum + value, 0) / NORMAL_COUNT;
  return {
    planned_MWh_el: planned_J / J_PER_MWH,
    expected_MWh_el: expected_J / J_PER_MWH,
    certain_MWh_el: exceeded(values, certainty) / J_PER_MWH,
    expected_shortfall_MWh_el: (unmet_J + Math.max(0, commanded_J - expected_J)) / J_PER_MWH,
    unmet_MWh_el: unmet_J / J_PER_MWH,
    ramp_MWh_el: (planned_J - unmet_J - commanded_J) / J_PER_MWH,
    net_MWh_el: net_J / J_PER_MWH,
    met_probability: unmet_J > 0 ? 0 : met / NORMAL_COUNT,
  };
}
