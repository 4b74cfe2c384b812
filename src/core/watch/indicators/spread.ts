import type { StoreModel } from '../../track/storeTracker.js';
import {
  type FollowRule,
  type FollowState,
  follow,
  followed,
  heldOf,
  startFollow,
} from '../follow.js';
import type { TwinState } from '../healthyTwin.js';
import type {
  Indicator,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import { learningWords, normalWords } from '../side.js';
import { dayOf, healthyWords, viewed, viewOf } from './view.js';
import { pitchOf, type WayState, wayOf } from './way.js';

interface StoreFollow {
  readonly follow: FollowState;
  readonly way: WayState;
  /** Starts of the twin that are known to hide nothing. */
  restarts: number;
}

/** A front passes a thermocouple's pitch in about an hour: mean spacing of values [s]. */
const VALUE_EVERY_S = 3600;
/**
 * The ratio of a healthy bed is not one number: where phi_h is not quite as configured the twin's front
 * grows otherwise, and c_s(T) sharpens both. It went from 1.08 to 1.29 and back within a day in the
 * finer plant (phi_h at 0.7 of the configured), about its mean by 0.05 in ln, rms. No average takes
 * that off.
 */
const MODEL_SIGMA = 0.05;
/** The twin starts with the bed's own front, so that the first half cycle tells little: a cycle's values at least. */
const BASELINE = { floor: 0.05, enough: 0.06, least: 12 };
/** d ln width / d ln phi_h at most, where the lag between gas and rock makes all of the width. */
const WIDTH_PER_TRANSFER = 0.5;

/**
 * Width of a store's front over that of the healthy twin at the same place (spreadRatio.ts), in ln. A
 * front that widens because the rock's heat capacity changes with temperature widens in the twin alike.
 * One value each time the front has gone the pitch of the thermocouples: on less way it is fitted to the
 * same readings. Degraded where the ratio has grown by the limit over what is healthy for this store.
 */
export const SPREAD: Indicator<Record<string, StoreFollow>> = {
  kind: 'spread_ratio',
  start: () => ({}),
  step(states, rule, watching, input) {
    return input.model.stores.map((model, s): IndicatorView => {
      const { id } = model.store;
      const state = heldOf(states, id, startHeld);
      const twin = input.state.views[s]?.twin;
      const way_m = wayOf(state.way, twin?.travelled_m ?? 0);
      const hides = startHides(state, twin);
      const spread = input.spread[id] ?? null;
      const due = spread !== null && spread.ratio > 0 && !hides && way_m >= pitchOf(model);
      if (due) {
        state.way.way_m = 0;
        const sigma = Math.hypot(spread.sigma / spread.ratio, MODEL_SIGMA);
        const news = { value: Math.log(spread.ratio), sigma };
        follow(state.follow, news, input.time_ms, followRule(model, rule, watching));
      }
      return viewed(state, rule, due, () =>
        view(id, state.follow, rule, followRule(model, rule, watching)),
      );
    });
  },
};

const startHeld = (): StoreFollow => ({
  follow: startFollow(1),
  way: { travelled_m: 0, way_m: 0 },
  restarts: 0,
});

/**
 * A twin that was started anew from a bed that counts as degraded has its front: until that has left the
 * twin, a ratio of 1 is no news.
 *
 * @param state changed in place
 */
function startHides(state: StoreFollow, twin: TwinState | undefined): boolean {
  if (twin === undefined || twin.restarts === state.restarts) return false;
  const degraded = state.follow.tests.some((test) => test.degraded);
  if (degraded && twin.startWidth_m2 > 0) return true;
  state.restarts = twin.restarts;
  return false;
}

function followRule(
  model: StoreModel,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
): FollowRule {
  const { heat_transfer_factor_sigma } = (model.tubes[0] as StoreModel['tubes'][number]).estimator;
  const sigma = Math.hypot(MODEL_SIGMA, WIDTH_PER_TRANSFER * heat_transfer_factor_sigma);
  return {
    configured: { value: 0, sigma },
    baseline: BASELINE,
    from_ms: watching.baseline_from_ms,
    limits: [{ degraded: Math.log(rule.limit), back: Math.log(rule.limit - rule.deadband) }],
    decision: decisionAt(watching.in_control_d, VALUE_EVERY_S),
  };
}

function view(
  store: string,
  state: FollowState,
  rule: IndicatorRule,
  rules: FollowRule,
): IndicatorView {
  const result = followed(state, rules);
  const known = state.value !== null;
  const healthy = Math.exp(result.healthy.value);
  const value = Math.exp(state.value ?? 0);
  const sigma = value * (state.sigma ?? 0);
  const from = state.baseline.count > 0 ? healthyWords(state, result.healthy) : 'by the twin';
  const is = `Store ${store}: its front is ${value.toFixed(2)} +/- ${sigma.toFixed(2)} times as wide as the healthy twin's, healthy is ${healthy.toFixed(2)}`;
  const bracket = `(${from}; limit ${(rule.limit * healthy).toFixed(2)})`;
  const placed = { value, healthy, limit: rule.limit * healthy, score: result.score };
  const sentence = {
    degraded: `${is} ${bracket}. A wide front gives fewer hours than the stored heat suggests. Look at the heat-transfer factor (low: dust or fines) and at the flow factors of the strings (unlike: gas finds a channel).`,
    normal: `${is} ${bracket}: ${normalWords(placed, 'as steep as after the same history in a healthy bed')}.`,
    undetermined:
      result.reason === 'learning'
        ? `${is} ${bracket}. What is healthy for this store is still being learned, while fronts move.${learningWords(placed)}`
        : `Store ${store}: no front has moved far enough yet to compare its width with the healthy twin's.`,
  }[result.state];
  return viewOf('spread_ratio', store, rule, result, {
    value: known ? value : null,
    sigma: known ? sigma : null,
    unit: '-',
    healthy,
    healthy_from: result.healthy.from === 'learned' ? 'learned' : 'twin',
    limit: placed.limit,
    deadband: rule.deadband * healthy,
    time: dayOf(state.time_ms),
    sentence,
  });
}
