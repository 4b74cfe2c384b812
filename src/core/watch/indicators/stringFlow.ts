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
import { bothSides, dayOf, healthyWords, isDue, percent, viewed, viewOf } from './view.js';

interface StringFollow {
  readonly news: NewsState;
  readonly follow: FollowState;
  /** ln of its flow over the mean as shown, and since when. */
  now: Known | null;
  shown_ms: number | null;
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
    return input.model.stores.flatMap((model, s): IndicatorView[] => {
      const { id } = model.store;
      const store = input.state.stores[s] as StoreState;
      if (model.tubes.length < 2) {
        const only = heldOf(states, `${id}/${model.tubes[0]?.string.id}`, startHeld);
        return [viewed(only, rule, false, () => alone(model, rule, followRule(rule, watching)))];
      }
      const strings = model.tubes.map(({ string }) => ({
        name: string.id,
        state: heldOf(states, `${id}/${string.id}`, startHeld),
      }));
      // A saved state may know some strings and not others: all are shown anew together.
      let changed = strings.some(({ state }) => isDue(state.shown_ms, input.time_ms));
      const scan = { ...scanOf(input, s), dt_s: input.dt_s };
      const hours = input.taken.conditions.flow_kg_s === 0 ? 0 : input.dt_s / 3600;
      strings.forEach(({ state }, k) => {
        const now = () => shareOf(model, store, k);
        const news = newsOf(state.news, now, { ...scan, walk: hours * walkOf(model, k) });
        if (news === null) return;
        follow(state.follow, news, input.time_ms, followRule(rule, watching));
        changed = true;
      });
      if (changed) {
        strings.forEach(({ state }, k) => {
          state.now = shareOf(model, store, k);
          state.shown_ms = input.time_ms;
        });
      }
      const whole = once(() => describe(strings, followRule(rule, watching)));
      return strings.map(({ state }, k) =>
        viewed(state, rule, changed, () => view(id, whole()[k] as StringView, whole(), rule)),
      );
    });
  },
};

const startHeld = (): StringFollow => ({
  news: startNews(),
  follow: startFollow(2),
  now: null,
  shown_ms: null,
});

/** A value that is made where it is first asked for. */
function once<T>(make: () => T): () => T {
  let made: { value: T } | null = null;
  return () => {
    made ??= { value: make() };
    return made.value;
  };
}

function describe(
  strings: readonly { readonly name: string; readonly state: StringFollow }[],
  rules: FollowRule,
): StringView[] {
  return strings.map(({ name, state }) => ({
    name,
    state: state.follow,
    now: state.now ?? rules.configured,
    result: followed(state.follow, rules),
  }));
}

function followRule(rule: IndicatorRule, watching: IndicatorsDefinition): FollowRule {
  const limits = bothSides(rule);
  return {
    configured: { value: 0, sigma: UNEVEN_SIGMA },
    baseline: BASELINE,
    from_ms: watching.baseline_from_ms,
    limits,
    decision: decisionAt(watching.in_control_d, NEWS_EVERY_S, limits.length),
  };
}

/** Variance that the filter adds to a string's figure in an hour of flow: its tubes walk apart. */
function walkOf(model: StoreModel, k: number): number {
  let squares = 0;
  model.tubes.forEach(({ string }, j) => {
    squares += ((j === k ? 1 : 0) - string.area_share) ** 2;
  });
  return squares * WALK_PER_SQRT_H ** 2;
}

/**
 * ln of a tube's flow over the mean and its sigma, by what of the tubes' variances their common inlets
 * do not explain: d/dln f_j of tube k is (k = j) - w_j f_j/mean.
 */
function shareOf(model: StoreModel, store: StoreState, k: number): Known {
  const tubes = model.tubes.map((tube, j) => {
    const { layout, at, covariance } = tubeFigures(model, store, j);
    const { flow, inlet } = layout;
    const explained = [inlet.charge_inlet, inlet.discharge_inlet].reduce((sum, i) => {
      const variance = covariance(i, i);
      return variance > 0 ? sum + covariance(flow, i) ** 2 / variance : sum;
    }, 0);
    const own = Math.max(0, covariance(flow, flow) - explained);
    return { part: tube.string.area_share * Math.exp(at(flow)), log: at(flow), own };
  });
  const mean = tubes.reduce((sum, { part }) => sum + part, 0);
  const variance = tubes.reduce(
    (sum, { part, own }, j) => sum + ((j === k ? 1 : 0) - part / mean) ** 2 * own,
    0,
  );
  return { value: (tubes[k]?.log ?? 0) - Math.log(mean), sigma: Math.sqrt(variance) };
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
  const limit = healthy * (side >= 0 ? 1 + rule.limit : 1 - rule.limit);
  const placed = { value, healthy, limit, score: result.score };
  const sentence = {
    degraded: `${is} ${bracket}. ${cause}`,
    normal: `${is} ${bracket}: ${normalWords(placed, 'as even as ever')}.`,
    undetermined:
      result.reason === 'learning'
        ? `${is} ${bracket}. What is healthy for it is still being learned, while fronts move.${learningWords(placed)}`
        : `Store ${store}, string ${one.name}: its share of the flow is not known yet; a front has to move through the bed for an hour.`,
  }[result.state];
  const known = state.value !== null;
  return viewOf('string_flow', `${store}/${one.name}`, rule, result, {
    value: known ? value : null,
    sigma: known ? value * now.sigma : null,
    unit: '-',
    healthy,
    limit,
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
