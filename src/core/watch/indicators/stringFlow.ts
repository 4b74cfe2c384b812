import type { StoreModel, StoreState } from '../../track/storeTracker.js';
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
import {
  type Known,
  NEWS_EVERY_S,
  type NewsState,
  newsOf,
  scanOf,
  startNews,
  tubeFigures,
} from './news.js';
import { bothSides, dayOf, healthyWords, percent, viewOf } from './view.js';

interface StringFollow {
  readonly news: NewsState;
  readonly follow: FollowState;
}

/** The filter's own walk of a tube's ln flow factor: see processNoise. */
const WALK_PER_SQRT_H = 0.01;
/**
 * Rings of a random packing differ by 1 to 2 %, and a string shows that of its own place; the looser
 * packing at the wall adds to it. One sigma of a healthy string before its own is learned.
 */
const UNEVEN_SIGMA = 0.025;
/** Learned to 1.2 %; 0.7 % of it is how far a factor moves with the direction of the flow (judgement). */
const BASELINE = { floor: 0.007, enough: 0.012, least: 6 };

/**
 * Flow of each string's part of the bed over the store's mean: ln f_k - ln(sum w f). The meter, the
 * heat capacity and an inlet's thermometer move all tubes alike and drop out; a channel raises one
 * and lowers the others. One value per hour of flow, of what the filter learned in it. Degraded where it
 * has grown or fallen against the healthy one by more than the limit. What the others of a store
 * lose follows from what one gains, so the sentence names that one.
 */
export const STRING_FLOW: Indicator<Record<string, StringFollow>> = {
  kind: 'string_flow',
  start: () => ({}),
  step(states, rule, watching, input) {
    const rules = followRule(rule, watching);
    const moving = input.taken.conditions.flow_kg_s !== 0;
    return input.model.stores.flatMap((model, s): IndicatorView[] => {
      const { id } = model.store;
      const store = input.state.stores[s] as StoreState;
      if (model.tubes.length < 2) return [alone(model, rule, rules)];
      const shares = sharesOf(model, store);
      const scan = { ...scanOf(input, s), dt_s: input.dt_s };
      const strings = model.tubes.map(({ string }, k) => {
        const state = heldOf(states, `${id}/${string.id}`, startHeld);
        const share = shares[k] as StringShare;
        const walk = moving ? share.walk * (input.dt_s / 3600) : 0;
        const news = newsOf(state.news, share.now, { ...scan, walk });
        if (news !== null) follow(state.follow, news, input.time_ms, rules);
        const result = followed(state.follow, rules);
        return { name: string.id, state: state.follow, now: share.now, result };
      });
      return strings.map((one) => view(id, one, strings, rule));
    });
  },
};

const startHeld = (): StringFollow => ({ news: startNews(), follow: startFollow(2) });

function followRule(rule: IndicatorRule, watching: IndicatorsDefinition): FollowRule {
  return {
    configured: { value: 0, sigma: UNEVEN_SIGMA },
    baseline: BASELINE,
    from_ms: watching.baseline_from_ms,
    limits: bothSides(rule),
    decision: decisionAt(watching.in_control_d, NEWS_EVERY_S),
  };
}

interface StringShare {
  readonly now: Known;
  /** Variance that the filter adds in an hour of flow. */
  readonly walk: number;
}

/**
 * ln of each tube's flow over the mean and its sigma, by what of the tubes' variances their common
 * inlets do not explain: d/dln f_j of tube k is (k = j) - w_j f_j/mean.
 */
function sharesOf(model: StoreModel, store: StoreState): StringShare[] {
  const tubes = model.tubes.map((tube, k) => {
    const { layout, at, covariance } = tubeFigures(model, store, k);
    const { flow, inlet } = layout;
    const explained = [inlet.charge_inlet, inlet.discharge_inlet].reduce((sum, i) => {
      const variance = covariance(i, i);
      return variance > 0 ? sum + covariance(flow, i) ** 2 / variance : sum;
    }, 0);
    const own = Math.max(0, covariance(flow, flow) - explained);
    return { w: tube.string.area_share, log: at(flow), own };
  });
  const mean = tubes.reduce((sum, { w, log }) => sum + w * Math.exp(log), 0);
  return tubes.map(({ log }, k) => {
    let variance = 0;
    let squares = 0;
    tubes.forEach((other, j) => {
      const slope = (j === k ? 1 : 0) - (other.w * Math.exp(other.log)) / mean;
      variance += slope * slope * other.own;
      squares += slope * slope;
    });
    return {
      now: { value: log - Math.log(mean), sigma: Math.sqrt(variance) },
      walk: squares * WALK_PER_SQRT_H ** 2,
    };
  });
}

interface StringView {
  readonly name: string;
  readonly state: FollowState;
  readonly now: Known;
  readonly result: Followed;
}

function view(
  store: string,
  one: StringView,
  all: readonly StringView[],
  rule: IndicatorRule,
): IndicatorView {
  const { state, now, result } = one;
  const healthy = Math.exp(result.healthy.value);
  const value = Math.exp(now.value);
  const off = (other: StringView) => other.now.value - other.result.healthy.value;
  const gained = all.reduce((best, other) => (off(other) > off(best) ? other : best));
  const side = result.degraded ?? off(one);
  const is = `Store ${store}, string ${one.name}: its part of the bed gets ${percent(now.value)} +/- ${(100 * now.sigma).toFixed(1)} % against the mean flow, ${percent(off(one))} against the healthy ${percent(result.healthy.value)}`;
  const bracket = `(${healthyWords(state, result.healthy)}; limit +/-${(100 * rule.limit).toFixed(0)} %)`;
  const cause =
    gained === one
      ? 'The gas has found an easier way there: its front runs ahead and reaches the outlet first.'
      : `What it lacks has gone to string ${gained.name} (${percent(off(gained))}): look there for a channel.`;
  const sentence = {
    degraded: `${is} ${bracket}. ${cause}`,
    normal: `${is} ${bracket}: as even as ever.`,
    undetermined:
      result.reason === 'learning'
        ? `${is} ${bracket}. What is healthy for it is still being learned, while fronts move.`
        : `Store ${store}, string ${one.name}: its share of the flow is not known yet; a front has to move through the bed for an hour.`,
  }[result.state];
  const known = state.value !== null;
  return viewOf('string_flow', `${store}/${one.name}`, rule, result, {
    value: known ? value : null,
    sigma: known ? value * now.sigma : null,
    unit: '-',
    healthy,
    limit: healthy * (side >= 0 ? 1 + rule.limit : 1 - rule.limit),
    deadband: rule.deadband * healthy,
    time: dayOf(state.time_ms),
    sentence,
  });
}

/** One string has nothing to be compared with. */
function alone(model: StoreModel, rule: IndicatorRule, rules: FollowRule): IndicatorView {
  const { id } = model.store;
  const string = model.tubes[0]?.string.id ?? '';
  const result: Followed = {
    ...followed(startFollow(2), rules),
    state: 'undetermined',
    reason: 'not_instrumented',
  };
  return viewOf('string_flow', `${id}/${string}`, rule, result, {
    value: null,
    sigma: null,
    unit: '-',
    healthy: null,
    healthy_from: null,
    limit: 1 + rule.limit,
    deadband: rule.deadband,
    time: null,
    sentence: `Store ${id} has one string of thermocouples: whether gas runs faster elsewhere in the bed cannot be told. A second string at another radius would tell it.`,
  });
}
