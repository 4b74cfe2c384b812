import type { Direction } from '../../definitions.js';
import { METER_SIGMA, METER_SLOPE_SIGMA } from '../../dispatch/calibration.js';
import { type HeatBalance, sharedSigma } from '../../dispatch/heatBalance.js';
import type { StoreModel } from '../../track/storeTracker.js';
import {
  type Followed,
  type FollowRule,
  type FollowState,
  follow,
  followed,
  heldOf,
  startFollow,
} from '../follow.js';
import type {
  Indicator,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import { learningWords, normalWords } from '../side.js';
import { bothSides, dayOf, healthyWords, percent, viewed, viewOf } from './view.js';

interface RunSoFar {
  readonly direction: Direction;
  readonly log: number;
  readonly variance: number;
  readonly time_ms: number;
}

interface StoreFollow {
  readonly follow: FollowState;
  /** What the present run's heat balance says so far. */
  run: RunSoFar | null;
}

/**
 * Healthy runs differ by more than their balance's sigma: the meter's error changes with load, by
 * half its slope between the runs of a day, and rings that no string sees lead and lag.
 */
const RUN_SIGMA = METER_SLOPE_SIGMA / 2;
const BASELINE = { floor: 0.005, enough: 0.01, least: 2 };
/** A charge or discharge in each of two cycles a day. */
const RUN_EVERY_S = 6 * 3600;

/**
 * Travel of a store's front per metered kilogram over that of the model, from the heat balance of each
 * run (heatBalance.ts): true over metered flow over heat capacity, ln. One value per run, at its end;
 * runs share only what is constant (the strings' places, thermometers), which the healthy value has
 * too. A meter that steps shows in all stores alike, rock that was exchanged or thermocouples that
 * are off in one: the sentence says which. Degraded to either side by the limit.
 */
export const FRONT_TRAVEL: Indicator<Record<string, StoreFollow>> = {
  kind: 'front_travel',
  start: () => ({}),
  step(states, rule, watching, input) {
    let changed = false;
    const stores = input.model.stores.map((model, s) => {
      const state = heldOf(states, model.store.id, startHeld);
      const ended = followRun(state, input.state.balances[s] as HeatBalance, input.time_ms);
      if (ended !== null) {
        const sigma = Math.hypot(Math.sqrt(ended.variance), RUN_SIGMA);
        const news = { value: ended.log, sigma };
        follow(state.follow, news, ended.time_ms, followRule(model, rule, watching));
        changed = true;
      }
      return { model, state };
    });
    const whole = () =>
      stores.map(({ model, state }) => ({
        model,
        state: state.follow,
        result: followed(state.follow, followRule(model, rule, watching)),
      }));
    return stores.map(({ state }, s) =>
      viewed(state, rule, changed, () => {
        const all = whole();
        return view(all[s] as StoreView, all, rule);
      }),
    );
  },
};

const startHeld = (): StoreFollow => ({ follow: startFollow(2), run: null });

/** The run that has just ended, if it told anything; one whose balance was dropped tells nothing. */
function followRun(state: StoreFollow, balance: HeatBalance, time_ms: number): RunSoFar | null {
  const { direction } = balance;
  const run = state.run;
  const told = direction === null ? null : balance.last[direction];
  // A balance is told anew with each scan of its run: `age_s` is 0 then.
  const fresh = told !== null && told.age_s === 0;
  if (run !== null && direction === run.direction && fresh) {
    state.run = { direction, log: told.log, variance: told.variance, time_ms };
    return null;
  }
  if (run !== null && direction === run.direction && told !== null) return null;
  state.run =
    fresh && direction !== null
      ? { direction, log: told.log, variance: told.variance, time_ms }
      : null;
  return run !== null && balance.last[run.direction] !== null ? run : null;
}

function followRule(
  model: StoreModel,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
): FollowRule {
  const estimator = (model.tubes[0] as StoreModel['tubes'][number]).estimator;
  const sigma = Math.hypot(
    METER_SIGMA,
    METER_SLOPE_SIGMA,
    estimator.heat_capacity_sigma,
    sharedSigma(model),
  );
  const limits = bothSides(rule);
  return {
    configured: { value: 0, sigma },
    baseline: BASELINE,
    from_ms: watching.baseline_from_ms,
    limits,
    decision: decisionAt(watching.in_control_d, RUN_EVERY_S, limits.length),
  };
}

interface StoreView {
  readonly model: StoreModel;
  readonly state: FollowState;
  readonly result: Followed;
}

const offOf = ({ state, result }: StoreView): number => (state.value ?? 0) - result.healthy.value;

function view(one: StoreView, all: readonly StoreView[], rule: IndicatorRule): IndicatorView {
  const { state, result } = one;
  const { id } = one.model.store;
  const healthy = Math.exp(result.healthy.value);
  const known = state.value !== null;
  const side = result.degraded ?? offOf(one);
  const is = `Store ${id}: per metered kilogram its front went ${percent(state.value ?? 0)} +/- ${(100 * (state.sigma ?? 0)).toFixed(1)} % against the model in the last run, ${percent(offOf(one))} against the healthy ${percent(result.healthy.value)}`;
  const bracket = `(${healthyWords(state, result.healthy)}; limit +/-${(100 * rule.limit).toFixed(0)} %)`;
  const value = Math.exp(state.value ?? 0);
  const limit = healthy * (side >= 0 ? 1 + rule.limit : 1 - rule.limit);
  const placed = { value, healthy, limit, score: result.score };
  const sentence = {
    degraded: `${is} ${bracket}. ${alike(one, all)}`,
    normal: `${is} ${bracket}: ${normalWords(placed, 'meter and heat capacity are as they were')}.`,
    undetermined:
      result.reason === 'learning'
        ? `${is} ${bracket}. What is healthy for it is still being learned, run by run.${learningWords(placed)}`
        : `Store ${id}: travel of its front per metered kilogram is not known yet; it takes a run that changes the state of charge by 15 % and ends.`,
  }[result.state];
  return viewOf('front_travel', id, rule, result, {
    value: known ? value : null,
    sigma: known ? value * (state.sigma ?? 0) : null,
    unit: '-',
    healthy,
    limit,
    deadband: rule.deadband * healthy,
    time: dayOf(state.time_ms),
    sentence,
  });
}

/** Whether the other stores moved alike: within two sigmas of the difference. */
function alike(one: StoreView, all: readonly StoreView[]): string {
  const others = all.filter((other) => other !== one && other.state.value !== null);
  if (others.length === 0)
    return 'With no other store to compare, a meter that is off cannot be told from a changed bed.';
  const told = others.map((other) => `${other.model.store.id} ${percent(offOf(other))}`).join(', ');
  const same = others.every((other) => {
    const sigma = Math.hypot(
      one.state.sigma ?? 0,
      other.state.sigma ?? 0,
      one.result.healthy.sigma,
      other.result.healthy.sigma,
    );
    return Math.abs(offOf(one) - offOf(other)) <= 2 * sigma;
  });
  return same
    ? `The other store moved alike (${told}): the flow meter reads ${offOf(one) > 0 ? 'too little' : 'too much'}. Hours allow for it.`
    : `The other store did not move alike (${told}): not the meter alone, but rock, thermocouples or gas thermometers of this store.`;
}
