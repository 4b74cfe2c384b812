/**
 * Sequential decision between healthy and degraded on independent values with known sigma: Page's
 * cumulative sum of log-likelihood ratios (Page 1954), one for each way:
 *
 *   l = (D - H)/s^2 (v - (D + H)/2)      healthy: v ~ N(H, s^2), degraded: v ~ N(D, s^2)
 *   S_up   = max(0, S_up + l)   decides 'degraded' at S_up   >= ln(gamma)
 *   S_down = max(0, S_down - l) decides 'healthy'  at S_down >= ln(gamma)
 *
 * For independent values the mean number of them until a false decision is at least gamma (Lorden
 * 1971), whatever the sigmas; gamma = in-control time over the mean spacing of values. Values of a
 * filter are not independent: hand over what is new in them (`newInformation`), or values from
 * stretches that share no readings. A single value counts for at most half a decision, so that one
 * wild value does not decide.
 */
export interface SequentialState {
  up: number;
  down: number;
  degraded: boolean;
  /** Values taken in. */
  count: number;
}

export interface SequentialValue {
  readonly value: number;
  /** > 0. */
  readonly sigma: number;
  readonly healthy: number;
  readonly degraded: number;
}

export function startSequential(): SequentialState {
  return { up: 0, down: 0, degraded: false, count: 0 };
}

/**
 * ln(gamma) for a mean time between false decisions and a spacing of values; at least ln 20. Of an
 * indicator with several tests (either side, ends, directions) any one may decide, so gamma grows by
 * their number: exp(S) of each is at most its Shiryaev-Roberts sum, whose mean grows by 1 with each
 * value; the sum over m of them is m n after n values, and at least gamma at the first decision.
 *
 * @param tests of the one indicator, >= 1
 */
export function decisionAt(inControl_d: number, spacing_s: number, tests = 1): number {
  if (!(inControl_d > 0)) throw new RangeError(`inControl_d must be positive, got ${inControl_d}`);
  if (!(spacing_s > 0)) throw new RangeError(`spacing_s must be positive, got ${spacing_s}`);
  if (!(tests >= 1)) throw new RangeError(`tests must be at least 1, got ${tests}`);
  return Math.log(Math.max(20, (tests * inControl_d * 86_400) / spacing_s));
}

/**
 * One value; see above.
 *
 * @param state changed in place
 * @param decision threshold [-], > 0, as `decisionAt` gives it
 * @returns the score of the present question: 0 nothing speaks for degraded, 1 decided so
 * @throws RangeError for a sigma or threshold that is not positive, or values that are not finite
 */
export function stepSequential(
  state: SequentialState,
  { value, sigma, healthy, degraded }: SequentialValue,
  decision: number,
): number {
  if (!(sigma > 0)) throw new RangeError(`sigma must be positive, got ${sigma}`);
  if (!(decision > 0)) throw new RangeError(`decision must be positive, got ${decision}`);
  const ratio = ((degraded - healthy) / sigma ** 2) * (value - (degraded + healthy) / 2);
  if (!Number.isFinite(ratio))
    throw new RangeError(`value ${value}, healthy ${healthy}, degraded ${degraded}: not finite`);
  const most = decision / 2;
  const step = Math.max(-most, Math.min(most, ratio));
  state.up = Math.min(decision, Math.max(0, state.up + step));
  state.down = Math.min(decision, Math.max(0, state.down - step));
  state.count++;
  if (!state.degraded && state.up >= decision) {
    state.degraded = true;
    state.down = 0;
  } else if (state.degraded && state.down >= decision) {
    state.degraded = false;
    state.up = 0;
  }
  return sequentialScore(state, decision);
}

/** 0..1: how far the test is towards 'degraded', or, once decided, how far it still stands. */
export function sequentialScore(state: SequentialState, decision: number): number {
  return state.degraded ? 1 - state.down / (2 * decision) : Math.min(1, state.up / decision);
}

/**
 * What a filter has learned between two of its values, as one independent value with its sigma: with
 * variance P0 = s0^2 + q before (q: its own walk since) and P1 after, 1/r = 1/P1 - 1/P0 and
 * z = r (v1/P1 - v0/P0).
 *
 * @returns null where nothing was learned (P1 >= 0.98 P0)
 */
export function newInformation(
  before: { readonly value: number; readonly sigma: number },
  after: { readonly value: number; readonly sigma: number },
  walkVariance: number,
): { value: number; sigma: number } | null {
  const p0 = before.sigma ** 2 + walkVariance;
  const p1 = after.sigma ** 2;
  if (!(p1 > 0) || !(p1 < 0.98 * p0)) return null;
  const r = 1 / (1 / p1 - 1 / p0);
  return { value: r * (after.value / p1 - before.value / p0), sigma: Math.sqrt(r) };
}
