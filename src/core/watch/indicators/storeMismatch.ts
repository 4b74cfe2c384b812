import type { Mode } from '../../definitions.js';
import { type BaselineState, learnBaseline, startBaseline } from '../baseline.js';
import type { Indicator, IndicatorReason, IndicatorRule, IndicatorView } from '../indicator.js';
import { decisionAt } from '../sequential.js';
import { type Followed, remembered, shownAs, stampOf, startFollowed, withSigma } from './shown.js';
import { beginAnew, healthyBy, testSide } from './sides.js';

/** A run shorter than this ends no phase of a cycle [s]. */
const LEAST_RUN_S = 1800;
/**
 * One sigma of how far the stores of a sound plant differ from their usual difference at the end of a
 * run, of the charge: powers, ambient and the coolers' heat differ from cycle to cycle.
 */
const VALUE_SIGMA = 0.02;
const RULE = { floor: 0.015, enough: 0.02, least: 2 };
/** Stores that are charged together may stand apart by this as long as nothing usual is known [-]. */
const PRIOR_SIGMA = 0.1;
const HEALTHY = { configured: { value: 0, sigma: PRIOR_SIGMA }, baseline: RULE };
/** Values come at the ends of runs, some three hours apart [s]. */
const SPACING_S = 3 * 3600;

type Run = 'charge' | 'discharge';

export interface StoreMismatchState {
  mode: Mode;
  ran_s: number;
  /** Newest charge of the first hot and the cold store, and sigma of their difference. */
  difference: number;
  sigma: number;
  /** Usual difference at the end of either run. */
  readonly healthy: Record<Run, BaselineState>;
  /** At whose end the newest value was taken. */
  run: Run | null;
  readonly hot: Followed;
  readonly cold: Followed;
}

/**
 * What one store holds that the other cannot match, of the rated energy: the difference of their states
 * of charge at the end of a run against the usual one at the end of such runs, times the hours of a
 * full unit over the rated ones. It is lost to dispatch until trimmed.
 */
export const STORE_MISMATCH: Indicator<StoreMismatchState> = {
  kind: 'store_mismatch',
  start: () => ({
    mode: 'stand',
    ran_s: 0,
    difference: Number.NaN,
    sigma: Number.NaN,
    healthy: { charge: startBaseline(), discharge: startBaseline() },
    run: null,
    hot: startFollowed(),
    cold: startFollowed(),
  }),
  step(state, rule, watching, { model, taken, time_ms, dt_s }) {
    const { unit } = model;
    const hot = model.stores.findIndex(({ store }) => store.kind === 'hot');
    const cold = model.stores.findIndex(({ store }) => store.kind === 'cold');
    const alone = hot < 0 || cold < 0;
    const scale = model.fullHours() / unit.rated_hours;
    const { mode } = taken.conditions;
    const { charge, discharge } = state.healthy;
    const tests = [state.hot.test, state.cold.test];
    if (beginAnew([charge, discharge], tests, watching.baseline_from_ms))
      Object.assign(state, { hot: startFollowed(), cold: startFollowed(), run: null });
    if (mode !== state.mode) {
      if (state.mode !== 'stand' && state.ran_s >= LEAST_RUN_S && Number.isFinite(state.sigma))
        take(state, state.mode, scale);
      state.mode = mode;
      state.ran_s = 0;
    }
    state.ran_s += dt_s;
    if (!alone) {
      const [a, b] = [taken.stores[hot]?.energy, taken.stores[cold]?.energy];
      state.difference = (a?.soc ?? Number.NaN) - (b?.soc ?? Number.NaN);
      state.sigma = Math.hypot(a?.soc_sigma ?? Number.NaN, b?.soc_sigma ?? Number.NaN);
    }
    const stamp = `${stampOf(state.hot)} ${rule.limit}`;
    return [remembered(state, stamp, () => view(state, unit.id, alone, rule))];

    function take(now: StoreMismatchState, run: Run, factor: number): void {
      const known = healthyBy(now.healthy[run], HEALTHY);
      const value = factor * (now.difference - known.value);
      const sigma = factor * VALUE_SIGMA;
      // What the states of charge err by, heat capacities and the meter, stays from run to run: no value
      // is news of it, and it moves the bound of what is healthy, as what is not known of the usual does.
      const lasting = factor * Math.hypot(known.sigma, now.sigma);
      const healthy = { value: 0, sigma: lasting };
      const limit = { degraded: rule.limit, back: rule.limit - rule.deadband };
      for (const [one, sign] of [
        [now.hot, 1],
        [now.cold, -1],
      ] as const) {
        one.decision = decisionAt(watching.in_control_d, SPACING_S, tests.length);
        testSide(one.test, { value: sign * value, sigma }, healthy, limit, one.decision);
        Object.assign(one, {
          value: Math.abs(value),
          sigma: Math.hypot(sigma, lasting),
          time_ms,
        });
      }
      now.run = run;
      const leans = [now.hot, now.cold].some(
        ({ test, decision }) => test.degraded || test.up > 0.25 * decision,
      );
      if (leans) return;
      const own = { value: now.difference, sigma: Math.hypot(now.sigma, VALUE_SIGMA) };
      learnBaseline(now.healthy[run], own, time_ms, watching.baseline_from_ms, RULE);
    }
  },
};

function view(
  state: StoreMismatchState,
  unit: string,
  alone: boolean,
  rule: IndicatorRule,
): IndicatorView {
  const followed = worse(state);
  const kept = state.run !== null && state.healthy[state.run].kept;
  let reason: IndicatorReason | null = null;
  if (alone) reason = 'not_instrumented';
  else if (followed.test.count > 0 && !kept) reason = 'learning';
  return shownAs({
    kind: 'store_mismatch',
    subject: unit,
    unit: '-',
    rule,
    followed,
    healthy: alone ? null : 0,
    healthy_from: kept ? 'learned' : 'configured',
    reason,
    sentence: sentence(unit, followed, followed === state.hot, alone, rule.limit),
  });
}

function worse({ hot, cold }: StoreMismatchState): Followed {
  const ahead =
    Number(cold.test.degraded) - Number(hot.test.degraded) || cold.test.up - hot.test.up;
  return ahead > 0 ? cold : hot;
}

function sentence(
  unit: string,
  { value, sigma, test }: Followed,
  hotHoldsMore: boolean,
  alone: boolean,
  limit: number,
): string {
  if (alone) return `Unit ${unit}: it has one store, which nothing has to match.`;
  if (value === null || sigma === null)
    return `Unit ${unit}: how its stores match shows at the end of a run.`;
  const figure = `${withSigma(100 * value, 100 * sigma, 1)} % of the rated energy (limit ${(100 * limit).toFixed(0)} %)`;
  if (!test.degraded)
    return `Unit ${unit}: at the end of the last run its stores stood ${figure} from their usual difference.`;
  return (
    `Unit ${unit}: the ${hotHoldsMore ? 'hot' : 'cold'} store holds ${figure} more than the other can match, ` +
    'against the usual; it is lost to dispatch until a programme trims it.'
  );
}
