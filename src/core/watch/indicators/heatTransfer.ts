import { transferTime_h } from '../../track/processNoise.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import {
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
import {
  type Known,
  NEWS_EVERY_S,
  type NewsState,
  newsOf,
  scanOf,
  startNews,
  tubeFigures,
} from './news.js';
import { dayOf, healthyWords, isDue, viewed, viewOf } from './view.js';

interface StoreFollow {
  readonly news: NewsState;
  readonly follow: FollowState;
  /** How much faster the filter lets its factor walk than usual, of the last scan. */
  adapt: number;
  /** Offsets of the gas thermometers at either end when the present value was begun [K]. */
  inlets: readonly number[];
  /** ln phi_h as shown, and since when. */
  now: Known | null;
  shown_ms: number | null;
}

/** How the filter's own walk of ln phi_h grows with its surprise: see processNoise. */
const ADAPT_FROM = 2;
const ADAPT_MOST = 30;
/**
 * Healthy factors are learned to 6 %. Of that 4 % no number of values takes off: flow and temperature
 * change hv not quite as the correlation has it (Re^0.6 with an exponent known to 0.05: 3.5 % of hv
 * for twice the flow; the rest is judgement).
 */
const BASELINE = { floor: 0.04, enough: 0.06, least: 4 };

/**
 * Heat transfer between gas and rock of each store: ln phi_h as the tubes have it, area mean, on top of
 * the configured factor. Dust and fines that fill the voids, or a film on the rock, lower it, and every
 * front widens with its inverse root. One value per hour of flow, made of what the filter learned in it;
 * the tubes' errors are taken as one and the same, since a wrong gas share or inlet bends all alike.
 * Degraded: ln phi_h - ln(healthy) <= ln(limit).
 */
export const HEAT_TRANSFER: Indicator<Record<string, StoreFollow>> = {
  kind: 'heat_transfer',
  start: () => ({}),
  step(states, rule, watching, input) {
    return input.model.stores.map((model, s): IndicatorView => {
      const { id } = model.store;
      const state = heldOf(states, id, startHeld);
      const store = input.state.stores[s] as StoreState;
      const moving = input.taken.conditions.flow_kg_s !== 0;
      const own = moving ? ownMotion(model, state.adapt, input.dt_s) : { walk: 0 };
      const scan = { ...scanOf(input, s), ...own, dt_s: input.dt_s };
      const news = ofTheBed(
        model,
        store,
        state,
        newsOf(state.news, () => meanTransfer(model, store), scan),
      );
      state.adapt = adaptOf(model, store);
      const changed = news !== null || isDue(state.shown_ms, input.time_ms);
      if (news !== null) {
        follow(state.follow, news, input.time_ms, followRule(model, rule, watching));
      }
      if (changed) {
        state.now = meanTransfer(model, store);
        state.shown_ms = input.time_ms;
      }
      return viewed(state, rule, changed, () =>
        view(model, state, rule, followRule(model, rule, watching)),
      );
    });
  },
};

const startHeld = (): StoreFollow => ({
  news: startNews(),
  follow: startFollow(1),
  adapt: 1,
  inlets: [],
  now: null,
  shown_ms: null,
});

/**
 * What was learned while the filter moved the offset of a gas thermometer by more than its sigma tells of
 * that thermometer: gas that reads 15 K too hot looked like a third of the heat transfer until the
 * offset had come to it, while real falls to 16 % move it by 0.6 K (tuning seed 1).
 *
 * @param state changed in place
 */
function ofTheBed(
  model: StoreModel,
  store: StoreState,
  state: StoreFollow,
  news: Known | null,
): Known | null {
  if (state.news.flow_s > 0) return news;
  const before = state.inlets;
  state.inlets = inletOffsets(model, store);
  if (news === null) return null;
  const { inlet_sigma_K } = (model.tubes[0] as StoreModel['tubes'][number]).estimator;
  return state.inlets.some((now, i) => Math.abs(now - (before[i] ?? now)) > inlet_sigma_K)
    ? null
    : news;
}

/** Area mean of the tubes' offsets of the gas temperature at either end [K]. */
function inletOffsets(model: StoreModel, store: StoreState): number[] {
  return (['charge_inlet', 'discharge_inlet'] as const).map((end) =>
    model.tubes.reduce((sum, tube, k) => {
      const { layout, at } = tubeFigures(model, store, k);
      return sum + tube.string.area_share * at(layout.inlet[end]);
    }, 0),
  );
}

function followRule(
  model: StoreModel,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
): FollowRule {
  const sigma = (model.tubes[0] as StoreModel['tubes'][number]).estimator
    .heat_transfer_factor_sigma;
  return {
    configured: { value: 0, sigma: Math.max(sigma, BASELINE.floor) },
    baseline: BASELINE,
    from_ms: watching.baseline_from_ms,
    limits: [{ degraded: Math.log(rule.limit), back: Math.log(rule.limit + rule.deadband) }],
    decision: decisionAt(watching.in_control_d, NEWS_EVERY_S),
  };
}

/** How ln phi_h goes back and spreads by itself in a scan of flow, as the filter has it: see processNoise. */
function ownMotion(
  model: StoreModel,
  adapt: number,
  dt_s: number,
): { walk: number; decay: number } {
  const { estimator } = model.tubes[0] as StoreModel['tubes'][number];
  const sigma = estimator.heat_transfer_factor_sigma;
  if (sigma === 0) return { walk: 0, decay: 1 };
  const times = dt_s / 3600 / transferTime_h(sigma);
  const decay = Math.exp(-times);
  const more = 2 * (adapt * adapt - 1) * times;
  return { walk: (1 - decay * decay + more) * sigma * sigma, decay };
}

/** ln phi_h, area mean, with the tubes' errors as one and the same. */
function meanTransfer(model: StoreModel, store: StoreState): Known {
  let value = 0;
  let sigma = 0;
  model.tubes.forEach((tube, k) => {
    const { layout, at, covariance } = tubeFigures(model, store, k);
    value += tube.string.area_share * at(layout.transfer);
    sigma += tube.string.area_share * Math.sqrt(covariance(layout.transfer, layout.transfer));
  });
  return { value, sigma };
}

function adaptOf(model: StoreModel, store: StoreState): number {
  return model.tubes.reduce((sum, tube, k) => {
    const surprise = store.tubes[k]?.surprise ?? 1;
    const adapt = Math.min(ADAPT_MOST, Math.max(1, surprise / ADAPT_FROM));
    return sum + tube.string.area_share * adapt;
  }, 0);
}

function view(
  model: StoreModel,
  { follow: state, now: shown }: StoreFollow,
  rule: IndicatorRule,
  rules: FollowRule,
): IndicatorView {
  const { store } = model;
  const now = shown ?? rules.configured;
  const scale = store.bed.heat_transfer_factor;
  const result = followed(state, rules);
  const healthy = scale * Math.exp(result.healthy.value);
  const value = scale * Math.exp(now.value);
  const ratio = (value / healthy).toFixed(2);
  const open = Math.hypot(now.sigma, result.healthy.sigma);
  const sigma = ((value / healthy) * open).toFixed(2);
  const is = `Store ${store.id}: gas and rock exchange ${ratio} +/- ${sigma} times the heat of a healthy bed`;
  const against = `(${healthyWords(state, result.healthy)}; limit ${rule.limit.toFixed(2)})`;
  const placed = { value, healthy, limit: rule.limit * healthy, score: result.score };
  // Two sigmas of what is open are less than what the limit is away: a fall far beyond it stands out.
  const seen = 2 * open < -Math.log(rule.limit) ? '; a gross fall would be seen by now' : '';
  const sentence = {
    degraded: `${is} ${against}. Its fronts widen and the outlet reaches its limit early: fewer hours than the stored heat suggests.`,
    normal: `${is} ${against}: ${normalWords(placed, 'nothing clogs it')}.`,
    undetermined:
      result.reason === 'learning'
        ? `${is} ${against}. What is healthy for it is still being learned, while fronts move${seen}.${learningWords(placed)}`
        : `Store ${store.id}: heat transfer between gas and rock is not known yet; a front has to move through the bed for an hour.`,
  }[result.state];
  return viewOf('heat_transfer', store.id, rule, result, {
    value: state.value === null ? null : value,
    sigma: state.value === null ? null : value * now.sigma,
    unit: '-',
    healthy,
    limit: placed.limit,
    deadband: rule.deadband * healthy,
    time: dayOf(state.time_ms),
    sentence,
  });
}
