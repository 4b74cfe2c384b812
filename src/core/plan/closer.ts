import type { Direction } from '../definitions.js';
import { type Evaluation, holding } from './evaluation.js';
import type { Leg } from './leg.js';
import type { Planner } from './planner.js';
import { drawIn, energyOf, leastFactor, type Sought, scale } from './sought.js';
import { withoutUnmet } from './withoutUnmet.js';

const DIRECTIONS = ['charge', 'discharge'] as const satisfies readonly Direction[];
/** Of a factor's range, and at least a minute of a run. */
export const FINEST = 1000;
/** Share of the risk by which what is found may be surer than asked for. */
const SURER = 0.3;
/** Where marches find nothing that holds: factors less this are evaluated, then four times that less. */
const FIRST_STEP = 1 / FINEST;
const STEP_GROWS = 4;

/** What was sought, evaluated in full. */
export interface Judged extends Sought {
  readonly holds: boolean;
  readonly probability: number;
  /** That the runs of a direction hold. */
  readonly alone: Readonly<Record<Direction, number>>;
}

export function judge(
  found: Sought,
  { course, first_s, command }: Evaluation,
  asked: readonly Leg[],
  certainty: number,
): Judged {
  const alone = (direction?: Direction): number => holding(course.episodes, first_s, direction);
  const probability = alone();
  const some = energyOf(found.legs) > 0 || energyOf(asked) === 0;
  const holds = some && probability >= certainty && command.unmet.length === 0;
  const each = { charge: alone('charge'), discharge: alone('discharge') };
  return { ...found, holds, probability, alone: each };
}

export const isChanged = ({ factor }: Sought): boolean => factor.discharge < 1 || factor.charge < 1;

/** Whether it is no surer than it must be. */
export const isClose = ({ probability }: Judged, certainty: number): boolean =>
  probability - certainty <= SURER * (1 - certainty);

/**
 * Between factors that hold and such that do not, by full evaluations: bisection until both are within
 * the `FINEST` part of each other, or what holds is hardly surer than asked for. Where nothing holds
 * yet, factors of the directions at risk are taken down first, in growing steps.
 *
 * @param known what holds, if anything does, and the least found that does not; how often to look
 */
export function closer(
  planner: Planner,
  legs: readonly Leg[],
  certainty: number,
  known: { readonly best: Judged | null; readonly failed: Judged; readonly more: number },
): Judged | null {
  const { unit } = planner.outlook.model;
  const { drawn_in } = known.best ?? known.failed;
  let { best, failed } = known;
  const at = (of: (direction: Direction) => number): Judged => {
    const factor = { charge: of('charge'), discharge: of('discharge') };
    const own = withoutUnmet(planner, drawIn(scale(legs, factor), drawn_in));
    const sought = { legs: own, factor, drawn_in };
    return judge(sought, planner.evaluate(planner.command(own)), legs, certainty);
  };
  const atRisk = (direction: Direction): boolean => known.failed.alone[direction] < 1;
  let step = FIRST_STEP;
  for (let n = 0; n < known.more; n++) {
    const holding_: Judged | null = best;
    const failing = failed;
    if (holding_ === null) {
      const next = (direction: Direction): number => {
        const was = failing.factor[direction];
        if (!atRisk(direction)) return was;
        return Math.max(leastFactor(unit, legs, direction), was * (1 - step));
      };
      if (DIRECTIONS.every((one) => next(one) >= failing.factor[one])) return null;
      const found = at(next);
      if (found.holds) best = found;
      else failed = found;
      step *= STEP_GROWS;
      continue;
    }
    const apart = DIRECTIONS.map((one) => failing.factor[one] - holding_.factor[one]);
    if (isClose(holding_, certainty) || !apart.some((part) => part > 1 / FINEST)) break;
    const found = at((one) => (failing.factor[one] + holding_.factor[one]) / 2);
    if (found.holds) best = found;
    else failed = found;
  }
  return best;
}
