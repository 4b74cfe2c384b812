import type { Direction, UnitDefinition } from '../definitions.js';
import type { DispatchAnswer } from '../estimate.js';
import { ceilingsBetween } from './ceilings.js';
import { commandOf, type RunningBefore } from './command.js';
import { type CommandCause, signedPower } from './leg.js';

/** Hours at a power, and what keeps the unit from giving that power all the while. */
export interface LimitedAnswer extends DispatchAnswer {
  /**
   * First in time of what binds before the p10 of the hours: null = nothing does. The hours
   * themselves are those of the stores: a start-up and a ramp come before the first of them.
   */
  readonly limited_by: CommandCause | null;
}

/** Where no hours are left, this much of the time ahead is looked at [s]. */
const LEAST_S = 60;

/**
 * What the limits of the machine, the connection and planned outages leave undone of a constant
 * power from now on, by the machine's own command.
 *
 * @param power_W net, above 0
 * @param hours_s how long it is wanted [s]
 * @throws RangeError for a power or a time that no leg can have
 */
export function limitedBy(
  unit: UnitDefinition,
  direction: Direction,
  power_W: number,
  now_ms: number,
  hours_s: number,
): CommandCause | null {
  const to_s = Math.max(LEAST_S, hours_s);
  // As if it ran at that power already: hours begin with it.
  const signed_W = signedPower(direction, power_W);
  const before: RunningBefore = {
    ...{ mode: direction, power_W: signed_W },
    ...{ stood_s: 0, last: direction },
  };
  const leg = { mode: direction, power_W, from_s: 0, to_s };
  const ceilings = ceilingsBetween(unit.limits, now_ms, now_ms + to_s * 1000);
  const { unmet } = commandOf(unit, [leg], ceilings, before, to_s);
  return unmet[0]?.cause ?? null;
}

/**
 * Answers of hours with what limits each.
 *
 * @param time ISO 8601, of the estimate that they stand on
 */
export function limitedAnswers(
  unit: UnitDefinition,
  time: string,
  answers: readonly DispatchAnswer[],
): LimitedAnswer[] {
  const now_ms = Date.parse(time);
  return answers.map((answer) => {
    const hours_s = answer.hours.p10 * 3600;
    return {
      ...answer,
      limited_by: limitedBy(unit, 'discharge', answer.power_MW * 1e6, now_ms, hours_s),
    };
  });
}
