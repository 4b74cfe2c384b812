import type { Followed, FollowLimit, FollowState, Healthy } from '../follow.js';
import type { HealthyFrom, IndicatorKind, IndicatorRule, IndicatorView } from '../indicator.js';

/** What a view adds to the decision: figures in its own unit, and its sentence. */
export type ViewParts = Pick<
  IndicatorView,
  'value' | 'sigma' | 'unit' | 'healthy' | 'limit' | 'deadband' | 'time' | 'sentence'
> & { readonly healthy_from?: HealthyFrom | null };

/** A view of a figure that is followed. */
export function viewOf(
  kind: IndicatorKind,
  subject: string,
  rule: Pick<IndicatorRule, 'on_delay_s' | 'off_delay_s'>,
  result: Followed,
  parts: ViewParts,
): IndicatorView {
  const { score, state, reason } = result;
  return {
    kind,
    subject,
    healthy_from: result.healthy.from,
    on_delay_s: rule.on_delay_s,
    off_delay_s: rule.off_delay_s,
    score,
    state,
    reason,
    ...parts,
  };
}

/** ISO 8601 UTC of a source time, null where there is none. */
export function dayOf(time_ms: number | null): string | null {
  return time_ms === null ? null : new Date(time_ms).toISOString();
}

/** Where the healthy value comes from, for the bracket of a sentence. */
export function healthyWords(state: FollowState, healthy: Healthy): string {
  const { from_ms, to_ms, kept } = state.baseline;
  if (healthy.from === 'learned' && from_ms !== null && to_ms !== null) {
    const [from, to] = [from_ms, to_ms].map((t) => new Date(t).toISOString().slice(0, 10));
    const span = from === to ? `on ${from}` : `from ${from} to ${to}`;
    return kept ? `as learned ${span}` : `as learned so far, ${span}`;
  }
  if (from_ms !== null)
    return 'the least that its configuration allows; what was learned is beyond it';
  return 'as configured';
}

/** Limits in ln of a share that may be too large or too small. */
export function bothSides({
  limit,
  deadband,
}: Pick<IndicatorRule, 'limit' | 'deadband'>): FollowLimit[] {
  return [1, -1].map((way) => ({
    degraded: Math.log1p(way * limit),
    back: Math.log1p(way * (limit - deadband)),
  }));
}

/** A deviation in ln as a person reads it. */
export function percent(log: number): string {
  const value = 100 * Math.expm1(log);
  return `${value >= 0 ? '+' : ''}${value.toFixed(1)} %`;
}
