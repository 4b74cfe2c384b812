import {
  type BaselineRule,
  type BaselineState,
  baseline,
  learnBaseline,
  startBaseline,
} from './baseline.js';
import type { IndicatorReason } from './indicator.js';
import {
  type SequentialState,
  sequentialScore,
  startSequential,
  stepSequential,
} from './sequential.js';

/**
 * One figure of the plant that is followed over weeks: what is healthy for it is learned from its own
 * first values, and each side on which it may leave has its sequential test. Plain and bounded.
 */
export interface FollowState {
  baseline: BaselineState;
  /** One test for each limit, in their order. */
  readonly tests: SequentialState[];
  /** Newest independent value; null before the first. */
  value: number | null;
  sigma: number | null;
  time_ms: number | null;
}

/** Signed distances from healthy: at which the plant counts as degraded, and as healthy again, of the same sign. */
export interface FollowLimit {
  readonly degraded: number;
  readonly back: number;
}

export interface FollowRule {
  /** Healthy as configured, and how far a healthy plant may be from that (one sigma). */
  readonly configured: { readonly value: number; readonly sigma: number };
  readonly baseline: BaselineRule;
  readonly from_ms: number | null;
  /** One or two, for the sides on which it may leave. */
  readonly limits: readonly FollowLimit[];
  /** Of the test, see decisionAt. */
  readonly decision: number;
}

export interface Healthy {
  readonly value: number;
  /** 0 where the bound itself is meant: see healthyOf. */
  readonly sigma: number;
  readonly from: 'configured' | 'learned';
}

export interface Followed {
  readonly healthy: Healthy;
  /** Limit that the plant is beyond; null: none. */
  readonly degraded: number | null;
  /** Of the test that is furthest; null before the first value. */
  readonly score: number | null;
  readonly state: 'normal' | 'degraded' | 'undetermined';
  readonly reason: IndicatorReason | null;
}

/** What a plant may be off from its configuration counts as healthy up to this many sigmas. */
const CREDIBLE = 2;
/** From half a decision on a value is rather one of a plant that degrades: it is not learned from. */
const LEANS = 0.5;
/** The healthy value is taken this many of its sigmas nearer to the limit: to err on the safe side. */
const SAFE = 2;

/** @param sides number of limits that will be watched */
export function startFollow(sides: number): FollowState {
  const tests = Array.from({ length: sides }, startSequential);
  return { baseline: startBaseline(), tests, value: null, sigma: null, time_ms: null };
}

/**
 * What is healthy: configuration and the plant's own first values, weighed by their variances. A plant
 * that was faulty from the start must not make that its norm: beyond two sigmas of the configuration a
 * healthy value is not believed, and that bound, itself the safe side, stands for it.
 */
export function healthyOf(state: FollowState, rule: FollowRule): Healthy {
  const { configured } = rule;
  const learned = baseline(state.baseline, rule.baseline);
  if (learned === null) return { ...configured, from: 'configured' };
  const [a, b] = [1 / configured.sigma ** 2, 1 / learned.sigma ** 2];
  const value = (a * configured.value + b * learned.value) / (a + b);
  const most = CREDIBLE * configured.sigma;
  if (Math.abs(value - configured.value) > most) {
    const bound = configured.value + Math.sign(value - configured.value) * most;
    return { value: bound, sigma: 0, from: 'configured' };
  }
  return { value, sigma: Math.sqrt(1 / (a + b)), from: 'learned' };
}

/**
 * Takes one independent value in. It is tested against what was healthy before it; nothing is learned
 * from while the plant counts as degraded, nor while a test is halfway there: a fault that came between
 * the first values would pass for what is healthy.
 *
 * @param state changed in place
 * @throws RangeError for a sigma that is not positive, a value that is not finite, or limits whose
 *   number is not that of the tests
 */
export function follow(
  state: FollowState,
  news: { readonly value: number; readonly sigma: number },
  time_ms: number,
  rule: FollowRule,
): void {
  if (rule.limits.length !== state.tests.length)
    throw new RangeError(`${rule.limits.length} limits for ${state.tests.length} tests`);
  if (state.baseline.begun_ms !== rule.from_ms) {
    // After an overhaul nothing of before counts, or what was decided would keep it from being learned.
    state.baseline = { ...startBaseline(), begun_ms: rule.from_ms };
    for (const test of state.tests) Object.assign(test, startSequential());
  }
  const healthy = healthyOf(state, rule);
  rule.limits.forEach((limit, i) => {
    const test = state.tests[i] as SequentialState;
    const safe = healthy.value + Math.sign(limit.degraded) * SAFE * healthy.sigma;
    const degraded = safe + (test.degraded ? limit.back : limit.degraded);
    stepSequential(test, { ...news, healthy: safe, degraded }, rule.decision);
  });
  state.value = news.value;
  state.sigma = news.sigma;
  state.time_ms = time_ms;
  if (state.tests.every((test) => sequentialScore(test, rule.decision) < LEANS))
    learnBaseline(state.baseline, news, time_ms, rule.from_ms, rule.baseline);
}

/**
 * Healthy is known once enough values are in it and the safe side takes no more than half a limit: what
 * goes on is learned further until it is kept.
 */
function isKnown({ baseline: learned }: FollowState, rule: FollowRule, healthy: Healthy): boolean {
  if (learned.kept) return true;
  const least = Math.min(...rule.limits.map(({ degraded }) => Math.abs(degraded)));
  return learned.count >= rule.baseline.least && SAFE * healthy.sigma <= least / 2;
}

/** What has been decided so far. */
export function followed(state: FollowState, rule: FollowRule): Followed {
  const healthy = healthyOf(state, rule);
  const scores = state.tests.map((test) => sequentialScore(test, rule.decision));
  const at = state.tests.findIndex((test) => test.degraded);
  const known = state.value !== null;
  const learning = !isKnown(state, rule, healthy);
  return {
    healthy,
    degraded: at < 0 ? null : (rule.limits[at] as FollowLimit).degraded,
    score: known ? Math.max(...scores) : null,
    state: at >= 0 ? 'degraded' : !known || learning ? 'undetermined' : 'normal',
    reason: at >= 0 ? null : !known ? 'not_exercised' : learning ? 'learning' : null,
  };
}

/**
 * State of one subject, made where there is none: ids may change with the configuration, so a saved
 * state need not know them.
 */
export function heldOf<S>(states: Record<string, S>, subject: string, fresh: () => S): S {
  if (Object.hasOwn(states, subject)) return states[subject] as S;
  const made = fresh();
  states[subject] = made;
  return made;
}
