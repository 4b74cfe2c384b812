import type { SequentialState, SequentialValue } from '../sequential.js';

/** Scores of a sequential test as a rest began. Plain. */
export interface RestScores {
  up: number;
  down: number;
}

/** @param test as it stands when the rest begins */
export const scoresOf = ({ up, down }: SequentialState): RestScores => ({ up, down });

/**
 * One look at a rest that goes on, in a test over rests (see sequential.ts). Each look tells anew what
 * the whole rest shows, by readings of that hour against those of the first: it does not hold the looks
 * before it, as cards have swung since, so that two of them are no news of each other. The rest as a
 * whole is one value of the test, that of its newest look:
 *
 *   S_up = max(0, S_up(as the rest began) + l(newest)),   l as in stepSequential
 *
 * A look that takes back what one before it has said takes its score back, too. The mean of exp(l) over
 * healthy values is 1 for every look, whatever looks have in common, so that of all looks together it
 * grows by 1 with each of them: gamma counts looks, not rests. A look moves the scores by half a
 * decision at most, so that one alone never decides.
 *
 * @param test changed in place
 * @param from changed in place where the decision changes: the test begins again at 0 then
 * @param decision threshold [-], > 0, as `decisionAt` gives it for the spacing of looks
 * @throws RangeError for a sigma or threshold that is not positive, or values that are not finite
 */
export function lookAtRest(
  test: SequentialState,
  from: RestScores,
  { value, sigma, healthy, degraded }: SequentialValue,
  decision: number,
): void {
  if (!(sigma > 0)) throw new RangeError(`sigma must be positive, got ${sigma}`);
  if (!(decision > 0)) throw new RangeError(`decision must be positive, got ${decision}`);
  const ratio = ((degraded - healthy) / sigma ** 2) * (value - (degraded + healthy) / 2);
  if (!Number.isFinite(ratio))
    throw new RangeError(`value ${value}, healthy ${healthy}, degraded ${degraded}: not finite`);
  const towards = (score: number, goal: number): number => {
    const most = decision / 2;
    const next = score + Math.max(-most, Math.min(most, Math.max(0, goal) - score));
    return Math.max(0, Math.min(decision, next));
  };
  test.up = towards(test.up, from.up + ratio);
  test.down = towards(test.down, from.down - ratio);
  test.count++;
  if (!test.degraded && test.up >= decision) {
    test.degraded = true;
    test.down = 0;
    from.down = 0;
  } else if (test.degraded && test.down >= decision) {
    test.degraded = false;
    test.up = 0;
    from.up = 0;
  }
}
