/**
 * What is healthy for this plant: the weighted mean of its own first values, kept once it is known
 * well enough, so that a slow decay does not become the norm. Nothing of a unit is ever quite as
 * configured: heat transfer by published correlations differs 2.8-fold, strings by some per cent.
 */
export interface BaselineState {
  /** Sums of w, w v with w = 1/s^2. */
  weight: number;
  sum: number;
  count: number;
  /** Source time of the first and last value in it [ms]; null before the first. */
  from_ms: number | null;
  to_ms: number | null;
  /** Kept: takes no more values. */
  kept: boolean;
  /** What was configured as the beginning [ms]; another one begins anew. */
  begun_ms: number | null;
}

export interface BaselineRule {
  /** Sigma that no number of values takes off: how far healthy values themselves differ. */
  readonly floor: number;
  /** Kept from this sigma on ... */
  readonly enough: number;
  /** ... and this many values. */
  readonly least: number;
}

export function startBaseline(): BaselineState {
  return { weight: 0, sum: 0, count: 0, from_ms: null, to_ms: null, kept: false, begun_ms: null };
}

/**
 * Takes one independent value in, unless the baseline is kept or the value is older than `from_ms`.
 *
 * @param state changed in place
 * @param from_ms beginning as configured; where it changes, what was learned is dropped
 */
export function learnBaseline(
  state: BaselineState,
  value: { readonly value: number; readonly sigma: number },
  time_ms: number,
  from_ms: number | null,
  rule: BaselineRule,
): void {
  if (state.begun_ms !== from_ms) Object.assign(state, startBaseline(), { begun_ms: from_ms });
  if (state.kept || (from_ms !== null && time_ms < from_ms)) return;
  if (!(value.sigma > 0) || !Number.isFinite(value.value))
    throw new RangeError(`value ${value.value} with sigma ${value.sigma}: cannot be learned from`);
  state.weight += 1 / value.sigma ** 2;
  state.sum += value.value / value.sigma ** 2;
  state.count++;
  state.from_ms ??= time_ms;
  state.to_ms = time_ms;
  const { sigma } = baseline(state, rule) as { sigma: number };
  state.kept = state.count >= rule.least && sigma <= Math.max(rule.enough, 1.001 * rule.floor);
}

/** Healthy value and its sigma; null before the first value. */
export function baseline(
  state: BaselineState,
  rule: BaselineRule,
): { value: number; sigma: number } | null {
  if (state.weight === 0) return null;
  return {
    value: state.sum / state.weight,
    sigma: Math.hypot(1 / Math.sqrt(state.weight), rule.floor),
  };
}
