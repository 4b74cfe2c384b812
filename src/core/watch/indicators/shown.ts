import type { HealthyFrom, IndicatorReason, IndicatorRule, IndicatorView } from '../indicator.js';
import { type SequentialState, sequentialScore, startSequential } from '../sequential.js';

/** A sequential decision with the newest value that went into it, of one subject. Plain. */
export interface Followed {
  readonly test: SequentialState;
  /** In the unit of the indicator; null before the first. */
  value: number | null;
  sigma: number | null;
  /** Source time of it [ms]. */
  time_ms: number | null;
  /** Threshold at which it was last tested [-]. */
  decision: number;
}

export function startFollowed(): Followed {
  return { test: startSequential(), value: null, sigma: null, time_ms: null, decision: 1 };
}

export interface Shown {
  readonly kind: IndicatorView['kind'];
  readonly subject: string;
  readonly unit: string;
  readonly rule: IndicatorRule;
  readonly followed: Followed;
  readonly healthy: number | null;
  readonly healthy_from: HealthyFrom | null;
  /** Why nothing is decided although there may be values; null: the test decides. */
  readonly reason: IndicatorReason | null;
  readonly sentence: string;
  /** Value at which it counts as degraded, where that is not the rule's limit itself. */
  readonly limit?: number;
}

/**
 * The view of one subject. What the test has decided `degraded` stands whatever the reason; else a
 * reason makes it `undetermined`, and so does a test without a value (`not_exercised`).
 */
export function shownAs(shown: Shown): IndicatorView {
  const { kind, subject, unit, rule, followed, sentence } = shown;
  const { test, decision } = followed;
  const reason = shown.reason ?? (test.count === 0 ? 'not_exercised' : null);
  const state = test.degraded ? 'degraded' : reason === null ? 'normal' : 'undetermined';
  return {
    kind,
    subject,
    value: finite(followed.value),
    sigma: finite(followed.sigma),
    unit,
    healthy: finite(shown.healthy),
    healthy_from: shown.healthy === null ? null : shown.healthy_from,
    limit: shown.limit ?? rule.limit,
    deadband: rule.deadband,
    on_delay_s: rule.on_delay_s,
    off_delay_s: rule.off_delay_s,
    score: test.count === 0 ? null : sequentialScore(test, decision),
    state,
    reason: state === 'undetermined' ? reason : null,
    time: followed.time_ms === null ? null : new Date(followed.time_ms).toISOString(),
    sentence,
  };
}

const made = new WeakMap<object, { readonly stamp: string; readonly view: IndicatorView }>();

/**
 * The view that was made of a state last, or, where its stamp has changed, a new one: sentences are
 * dear, and values come once in an hour.
 *
 * @param owner state of the subject
 * @param stamp of all that the view follows from
 */
export function remembered(owner: object, stamp: string, make: () => IndicatorView): IndicatorView {
  const known = made.get(owner);
  if (known?.stamp === stamp) return known.view;
  const view = make();
  made.set(owner, { stamp, view });
  return view;
}

/** What has gone into a test, in a stamp. */
export const stampOf = ({ test, time_ms }: Followed): string => `${test.count}/${time_ms}`;

function finite(value: number | null): number | null {
  return value !== null && Number.isFinite(value) ? value : null;
}

/** `toFixed` without a sign on what rounds to nothing: `0.0`, never `-0.0`. */
export function fixed(value: number, digits: number): string {
  const text = value.toFixed(digits);
  return Number(text) === 0 ? (0).toFixed(digits) : text;
}

/** `1.23 +/- 0.04` with the digits that sigma bears. */
export function withSigma(value: number, sigma: number, digits: number): string {
  const least = 10 ** -digits;
  return `${fixed(value, digits)} +/- ${Math.max(sigma, least).toFixed(digits)}`;
}
