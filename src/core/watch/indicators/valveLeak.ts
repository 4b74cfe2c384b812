import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import { leakSigma } from '../../track/tube.js';
import type { Indicator, IndicatorRule, IndicatorView } from '../indicator.js';
import { decisionAt, newInformation } from '../sequential.js';
import { type Followed, remembered, shownAs, stampOf, startFollowed, withSigma } from './shown.js';
import { testSide } from './sides.js';

/** Values are taken this often while the unit stands [s]: by then the fronts have moved by more than noise. */
const EVERY_S = 2 * 3600;
/** After the flow has stopped, steel at the ends and junctions settle first [s]. */
const SETTLE_S = 1800;
/**
 * What the bed model may take for a leak where there is none, one sigma, of the greatest flow: heat
 * conducted along an uneven front and between strings moves it by millimetres an hour. From healthy
 * rests of the finer plant: 10 to 15 g/s of 36 kg/s.
 */
const MODEL_SHARE = 0.0004;
/** Tests of each store: gas may pass either way. */
const WAYS = 2;
/** Walk of the tubes' leak within a day, as a share of its prior; see processNoise. */
const WALK_PER_SQRT_DAY = 0.3;

interface Valve {
  /** Time of the present rest, and of it since a value was last taken [s]. */
  stood_s: number;
  since_s: number;
  /** What the tubes had learned when a value was last taken [share of the greatest flow]. */
  known: number | null;
  knownSigma: number;
  /** Evidence of a flow as while charging, and as while discharging. */
  readonly charging: Followed;
  readonly discharging: Followed;
}

export interface ValveLeakState {
  readonly stores: Valve[];
}

/**
 * Gas that passes a store while the unit stands, unmetered: the state `leak` of the tubes, which they
 * learn from the fronts that move although nothing is metered. Tubes learn it each for itself; the
 * outermost, whose rock also cools through the wall, is left out where there are others, so that
 * insulation that fails is not taken for a valve. What is new in it every 2 h of rest is one value of
 * the test, for either direction.
 */
export const VALVE_LEAK: Indicator<ValveLeakState> = {
  kind: 'valve_leak',
  start: (model) => ({ stores: model.stores.map(startValve) }),
  step(state, rule, { in_control_d }, { model, state: unit, taken, time_ms, dt_s }) {
    const most = model.unit.limits.discharge.flow_max_kg_s;
    const standing = taken.conditions.mode === 'stand' && taken.conditions.flow_kg_s === 0;
    return model.stores.map((store, s) => {
      const valve = state.stores[s] as Valve;
      follow(valve, standing, dt_s);
      if (valve.since_s >= EVERY_S) {
        const now = leakThrough(store, unit.stores[s] as StoreState, most);
        take(valve, now, store, most, rule, in_control_d, time_ms);
      }
      const stamp = `${stampOf(valve.charging)} ${rule.limit}`;
      return remembered(valve, stamp, () => view(valve, store, rule, most));
    });
  },
};

function startValve(): Valve {
  return {
    stood_s: 0,
    since_s: 0,
    known: null,
    knownSigma: 0,
    charging: startFollowed(),
    discharging: startFollowed(),
  };
}

function follow(valve: Valve, standing: boolean, dt_s: number): void {
  if (!standing) {
    valve.stood_s = 0;
    valve.since_s = 0;
    return;
  }
  valve.stood_s += dt_s;
  if (valve.stood_s > SETTLE_S) valve.since_s += dt_s;
}

/** Mean over the inner tubes, errors taken as shared [share of the greatest discharge flow]. */
export function leakThrough(
  model: StoreModel,
  state: StoreState,
  most_kg_s: number,
): { value: number; sigma: number } {
  const outermost = Math.max(...model.tubes.map(({ string }) => string.radius_m));
  const inner = model.tubes.some(({ string }) => string.radius_m < outermost);
  let weight = 0;
  let sum = 0;
  let variance = 0;
  model.tubes.forEach(({ layout, string }, k) => {
    if (inner && string.radius_m === outermost) return;
    const tube = state.tubes[k];
    if (tube === undefined) throw new RangeError(`tube ${k} of ${model.store.id}: no state`);
    const w = string.area_share;
    weight += w;
    sum += w * (tube.further[layout.leak - layout.cells] as number);
    variance += w * (tube.covariance[layout.leak * (layout.size + 1)] as number);
  });
  const scale = model.store.bed.area_m2 / most_kg_s;
  return { value: (scale * sum) / weight, sigma: scale * Math.sqrt(variance / weight) };
}

function take(
  valve: Valve,
  now: { value: number; sigma: number },
  store: StoreModel,
  most: number,
  rule: IndicatorRule,
  in_control_d: number,
  time_ms: number,
): void {
  const prior =
    (leakSigma(store.tubes[0] as StoreModel['tubes'][number]) * store.store.bed.area_m2) / most;
  if (!(prior > 0)) return;
  const before = {
    value: valve.known ?? 0,
    sigma: valve.known === null ? prior : valve.knownSigma,
  };
  const walk = (WALK_PER_SQRT_DAY * prior) ** 2 * (valve.since_s / 86_400);
  valve.since_s = 0;
  const news = newInformation(before, now, walk);
  for (const followed of [valve.charging, valve.discharging]) {
    // What has passed of late: the filter itself still remembers the valve as it was in earlier rests.
    const { value, sigma } = news ?? now;
    followed.value = Math.abs(value);
    followed.sigma = Math.hypot(sigma, MODEL_SHARE);
    followed.time_ms = time_ms;
    followed.decision = decisionAt(in_control_d, EVERY_S, WAYS);
  }
  if (news === null) return;
  valve.known = now.value;
  valve.knownSigma = now.sigma;
  const limit = limitOf(rule);
  // Back, too, must be told from what the model may take for a leak.
  const back = Math.max(limit - rule.deadband, 3 * MODEL_SHARE);
  for (const [followed, sign] of [
    [valve.charging, 1],
    [valve.discharging, -1],
  ] as const) {
    const healthy = { value: 0, sigma: MODEL_SHARE };
    // From nothing, so that two sigmas of the model are part of the limit.
    const sides = { degraded: limit - 2 * MODEL_SHARE, back: back - 2 * MODEL_SHARE };
    const own = { value: sign * news.value, sigma: news.sigma };
    testSide(followed.test, own, healthy, sides, followed.decision);
  }
}

/** What the model may take for a leak sets the least that is one. */
const limitOf = ({ limit }: IndicatorRule): number => Math.max(limit, 4 * MODEL_SHARE);

function view(
  valve: Valve,
  { store, tubes }: StoreModel,
  rule: IndicatorRule,
  most: number,
): IndicatorView {
  const { charging, discharging } = valve;
  const followed =
    charging.test.degraded !== discharging.test.degraded
      ? charging.test.degraded
        ? charging
        : discharging
      : charging.test.up >= discharging.test.up
        ? charging
        : discharging;
  const followsNone = leakSigma(tubes[0] as StoreModel['tubes'][number]) === 0;
  const { sigma } = followed;
  const reason = followsNone
    ? ('not_instrumented' as const)
    : sigma !== null && sigma > rule.limit / 2
      ? ('too_uncertain' as const)
      : null;
  return shownAs({
    kind: 'valve_leak',
    subject: store.id,
    unit: '-',
    rule,
    followed,
    healthy: 0,
    healthy_from: 'law',
    reason,
    limit: limitOf(rule),
    sentence: sentence(store.id, followed, followed === charging, followsNone, most, rule),
  });
}

function sentence(
  store: string,
  { value, sigma, test }: Followed,
  asCharging: boolean,
  followsNone: boolean,
  most: number,
  rule: IndicatorRule,
): string {
  if (followsNone)
    return `Store ${store}: what leaks while standing is not followed, since leak_sigma is 0 in the configuration.`;
  if (value === null || sigma === null)
    return `Store ${store}: whether a valve leaks shows after 2.5 h of standing at a stretch.`;
  const flow = `${withSigma(100 * value, 100 * sigma, 2)} % of the greatest discharge flow (${(value * most).toFixed(2)} kg/s, limit ${(100 * rule.limit).toFixed(2)} %)`;
  if (test.degraded)
    return (
      `Store ${store}: while the unit stands its fronts move as if ${flow} passed, ` +
      `${asCharging ? 'as while charging' : 'as while discharging'}; no meter sees it. Charge is lost or mixed.`
    );
  if (sigma > rule.limit / 2)
    return `Store ${store}: while standing ${flow} may pass; no front lies where it would show better.`;
  return `Store ${store}: while standing at most little gas passes: ${flow}.`;
}
