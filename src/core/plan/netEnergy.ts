import { energyBetween } from './course.js';
import type { Evaluation } from './evaluation.js';
import { NORMAL_COUNT } from './latinNormals.js';
import { type Leg, signedPower } from './leg.js';
import type { RunEnergy } from './runEnergy.js';

const J_PER_MWH = 3.6e9;

/**
 * Net energy of a whole schedule at the connection point, from the present to the end of its last
 * block or ramp. Along the most likely course: the sum of the blocks' `net_MWh_el`, less
 * `between_MWh_el`, plus `ramps_between_MWh_el` = `net_MWh_el`, the integral of net power.
 */
export interface NetEnergy {
  /** As asked for in the blocks, + = given. */
  readonly planned_net_MWh_el: number;
  /**
   * Mean over all that is uncertain, + = given. What is drawn while the unit stands after a stop is
   * that of the most likely course.
   */
  readonly expected_net_MWh_el: number;
  /** Along the most likely course, + = given. */
  readonly net_MWh_el: number;
  /** Drawn outside the blocks by start-ups, change-overs and standing, at least 0. */
  readonly between_MWh_el: number;
  /** Of ramps outside the blocks, + = given: down after a block, or from what ran before. */
  readonly ramps_between_MWh_el: number;
}

/**
 * @param legs that the command was made of, in order
 * @param energies of every run of the evaluation
 */
export function netEnergy(
  legs: readonly Leg[],
  evaluation: Evaluation,
  energies: readonly RunEnergy[],
): NetEnergy {
  const { command, course } = evaluation;
  const { delivered, episodes } = course;
  const powered = command.pieces.filter(({ mode }) => mode !== 'stand');
  const end_s = Math.max(...legs.map(({ to_s }) => to_s), ...powered.map(({ to_s }) => to_s));
  const net_J = energyBetween(delivered, 0, end_s);
  // While a run lasts its power is its own; before, after and past a stop the unit draws.
  const lasts = episodes.map(({ direction, from_s, to_s, stopped_s }) => {
    return { direction, from_s, to_s: Math.min(to_s, stopped_s ?? to_s) };
  });
  let outside_J = 0;
  let ramps_J = 0;
  let at = 0;
  for (const { from_s, to_s } of [...legs, { from_s: end_s, to_s: end_s }]) {
    outside_J += energyBetween(delivered, at, from_s);
    for (const run of lasts) {
      const [begin, end] = [Math.max(at, run.from_s), Math.min(from_s, run.to_s)];
      ramps_J += energyBetween(delivered, begin, end);
    }
    at = Math.max(at, to_s);
  }
  let unsure_J = 0;
  lasts.forEach(({ direction, from_s, to_s }, e) => {
    const energy = energies[e] as RunEnergy;
    const until_s = (episodes[e] as (typeof episodes)[number]).to_s;
    let sum = 0;
    for (let k = 0; k < NORMAL_COUNT; k++) sum += energy.delivered(k, from_s, until_s);
    const likely_J = energyBetween(delivered, from_s, to_s);
    unsure_J += signedPower(direction, sum / NORMAL_COUNT) - likely_J;
  });
  const planned_J = legs.reduce(
    (sum, { mode, power_W, from_s, to_s }) => sum + signedPower(mode, power_W) * (to_s - from_s),
    0,
  );
  return {
    planned_net_MWh_el: planned_J / J_PER_MWH,
    expected_net_MWh_el: (net_J + unsure_J) / J_PER_MWH,
    net_MWh_el: net_J / J_PER_MWH,
    between_MWh_el: (ramps_J - outside_J) / J_PER_MWH,
    ramps_between_MWh_el: ramps_J / J_PER_MWH,
  };
}
