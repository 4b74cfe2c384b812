import { type BaselineState, startBaseline } from '../baseline.js';
import {
  type FollowLimit,
  type FollowRule,
  type Healthy,
  healthyOf,
  startFollow,
} from '../follow.js';
import { type SequentialState, startSequential, stepSequential } from '../sequential.js';

/** The healthy value is taken this many of its sigmas nearer to the limit, as `follow` does. */
export const SAFE = 2;

/** A unit's healthy value by `healthyOf`, for an indicator that keeps its baselines apart from its tests. */
export function healthyBy(
  baseline: BaselineState,
  rule: Pick<FollowRule, 'configured' | 'baseline'>,
): Healthy {
  const whole = { ...rule, from_ms: baseline.begun_ms, limits: [], decision: 1 };
  return healthyOf({ ...startFollow(0), baseline }, whole);
}

/**
 * One value of one side's test, as `follow` takes it: against the healthy value moved by two of its
 * sigmas towards the limit, and, once degraded, against the limit less the deadband.
 *
 * @param test changed in place
 * @param limit signed distances from healthy
 */
export function testSide(
  test: SequentialState,
  news: { readonly value: number; readonly sigma: number },
  healthy: { readonly value: number; readonly sigma: number },
  limit: FollowLimit,
  decision: number,
): void {
  const safe = healthy.value + Math.sign(limit.degraded) * SAFE * healthy.sigma;
  const degraded = safe + (test.degraded ? limit.back : limit.degraded);
  stepSequential(test, { ...news, healthy: safe, degraded }, decision);
}

/**
 * Begins anew where another beginning is configured (`baseline_from`): nothing of before an overhaul
 * counts, neither what was learned nor what was decided, or a decision would keep it from being learned.
 *
 * @param baselines,tests changed in place
 * @returns true where it has begun anew
 */
export function beginAnew(
  baselines: readonly BaselineState[],
  tests: readonly SequentialState[],
  from_ms: number | null,
): boolean {
  if (baselines.every(({ begun_ms }) => begun_ms === from_ms)) return false;
  for (const one of baselines) Object.assign(one, startBaseline(), { begun_ms: from_ms });
  for (const test of tests) Object.assign(test, startSequential());
  return true;
}
