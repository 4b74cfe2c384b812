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

interface Memo {
  readonly rule: IndicatorRule;
  readonly view: IndicatorView;
}

const memos = new WeakMap<object, Memo>();

/**
 * The view of a state that changes seldom: a sentence costs more than all that is followed in a scan. It
 * follows from the state alone, so that a restored one gives the same.
 *
 * @param changed whether the state has changed since the last call in what the view shows
 */
export function viewed(
  state: object,
  rule: IndicatorRule,
  changed: boolean,
  make: () => IndicatorView,
): IndicatorView {
  const known = memos.get(state);
  if (known !== undefined && known.rule === rule && !changed) return known.view;
  const view = make();
  memos.set(state, { rule, view });
  return view;
}

/** Figures that change with every scan are shown anew this often, by source time [ms]. */
const SHOW_EVERY_MS = 600_000;

/** True where a figure last shown at a time is to be shown anew. */
export function isDue(shown_ms: number | null, time_ms: number): boolean {
  if (shown_ms === null) return true;
  return Math.floor(time_ms / SHOW_EVERY_MS) !== Math.floor(shown_ms / SHOW_EVERY_MS);
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
    return 'as far as its configuration allows; what was seen while it was learned lay beyond';
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

/** One decimal, zero without a sign. */
export function rounded(value: number): string {
  const text = value.toFixed(1);
  return Number(text) === 0 ? '0.0' : text;
}

/** A deviation in ln as a person reads it. */
export function percent(log: number): string {
  const value = rounded(100 * Math.expm1(log));
  return `${Number(value) > 0 ? '+' : ''}${value} %`;
}
