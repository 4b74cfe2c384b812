import type { UnitDefinition } from '../../definitions.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import { type FollowRule, type FollowState, follow, followed, startFollow } from '../follow.js';
import { drawnOut, healthyHours, meanEnthalpy, movedTo } from '../healthyRollout.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import { learningWords, normalWords } from '../side.js';
import { dayOf, healthyWords, rounded, viewed, viewOf } from './view.js';

interface Lost {
  /** Share of the rated energy [-]. */
  readonly share: number;
  readonly sigma: number;
  readonly time_ms: number;
}

interface UnitFollow {
  readonly follow: FollowState;
  /** Newest value, and the one that the present charge has come to so far. */
  last: Lost | null;
  charge: Lost | null;
}

/** One value per charge, two cycles a day. */
const CHARGE_EVERY_S = 12 * 3600;
/** Fronts are drawn out by this share to see what their width costs. */
const PROBE = 0.1;
/** Where a store has no spread ratio now, its width may be off by so much. */
const WIDTH_SIGMA = 0.1;
/** Each rollout is off by 0.2 % of its hours (hours.ts), and the healthy one has neither rings nor steel. */
const ROLLOUT_SIGMA = 0.003;
/**
 * A healthy unit is off from its configuration: phi_h by a factor of 1.5 makes fronts of the finer plant
 * by a fifth wider or narrower, which costs or gains some 3 % of the rated energy.
 */
const CONFIGURED_SIGMA = 0.03;
const BASELINE = { floor: 0.01, enough: 0.013, least: 2 };

/**
 * Dispatchable energy lost to degradation: what the unit would deliver at rated power from its present
 * heat with the healthy twins' fronts, less what it delivers from the estimate, over the rated energy.
 * Both from the same stored heat, meter and machine, so that what is uncertain there drops out; sigma
 * is what the widths leave open, and the rollouts. Looked at once an hour, where the state of charge is
 * rolled out anyway, while there is something to discharge, and at the end of a charge, when the stores
 * are fullest: that value is tested.
 */
export const ENERGY_LOST: Indicator<UnitFollow> = {
  kind: 'energy_lost',
  start: () => ({ follow: startFollow(1), last: null, charge: null }),
  step(state, rule, watching, input) {
    const { mode } = input.taken.conditions;
    const ends = mode !== 'charge' && state.charge !== null;
    const lost = ends || isOld(state.last, input.time_ms) ? lostNow(input) : null;
    let changed = lost !== null;
    if (lost !== null) state.last = lost;
    if (mode === 'charge') {
      if (lost !== null) state.charge = lost;
    } else if (state.charge !== null) {
      // The change of mode itself is rolled out: the fullest there is.
      const { share, sigma, time_ms } = lost ?? state.charge;
      follow(state.follow, { value: share, sigma }, time_ms, followRule(rule, watching));
      state.charge = null;
      changed = true;
    }
    return [
      viewed(state, rule, changed, () => view(state, rule, followRule(rule, watching), input.unit)),
    ];
  },
};

/** True where a value is of another hour: often enough for what changes over days. */
function isOld(last: Lost | null, time_ms: number): boolean {
  return last === null || Math.floor(time_ms / 3.6e6) !== Math.floor(last.time_ms / 3.6e6);
}

function followRule(rule: IndicatorRule, watching: IndicatorsDefinition): FollowRule {
  return {
    configured: { value: 0, sigma: CONFIGURED_SIGMA },
    baseline: BASELINE,
    from_ms: watching.baseline_from_ms,
    limits: [{ degraded: rule.limit, back: rule.limit - rule.deadband }],
    decision: decisionAt(watching.in_control_d, CHARGE_EVERY_S),
  };
}

/** null where this scan has no rollout, a twin has no history, or nothing is left to discharge. */
function lostNow({ model, state, spread, time_ms }: IndicatorInput): Lost | null {
  const { charge } = state;
  if (charge === null || charge.time_ms !== time_ms || !(charge.value > 0)) return null;
  const profiles: Float64Array[] = [];
  for (let s = 0; s < model.stores.length; s++) {
    const twin = state.views[s]?.twin;
    if (!twin?.enthalpy || twin.lost || !state.stores[s]?.started) return null;
    const mean = meanEnthalpy(model.stores[s] as StoreModel, state.stores[s] as StoreState);
    const moved = movedTo(twin.enthalpy, mean);
    if (moved === null) return null;
    profiles.push(moved);
  }
  const { rated_hours } = model.unit;
  const healthy = healthyHours(model, state, profiles) / rated_hours;
  if (!(healthy > 0)) return null;
  let variance = 2 * (ROLLOUT_SIGMA * healthy) ** 2;
  model.stores.forEach(({ store }, s) => {
    const own = spread[store.id] ?? null;
    const width = own === null ? WIDTH_SIGMA : own.sigma / own.ratio;
    const wider = profiles.map((profile, i) => (i === s ? widened(profile) : profile));
    const slope = (healthyHours(model, state, wider) / rated_hours - healthy) / PROBE;
    variance += (slope * width) ** 2;
  });
  return { share: healthy - charge.value, sigma: Math.sqrt(variance), time_ms };
}

/** The same heat with the front drawn out about the middle of its span. */
function widened(profile: Float64Array): Float64Array {
  const mean = profile.reduce((sum, h) => sum + h, 0) / profile.length;
  const half = ((profile[0] as number) + (profile[profile.length - 1] as number)) / 2;
  const falls = (profile[0] as number) > half;
  const middle = profile.findIndex((h) => (falls ? h < half : h > half));
  const wider = drawnOut(profile, 1 + PROBE, middle < 0 ? profile.length / 2 : middle);
  return movedTo(wider, mean) ?? wider;
}

function view(
  state: UnitFollow,
  rule: IndicatorRule,
  rules: FollowRule,
  unit: UnitDefinition,
): IndicatorView {
  const result = followed(state.follow, rules);
  const { last } = state;
  const energy = (share: number) => (share * unit.rated_hours * unit.rated_power_W) / 1e6;
  const healthy = result.healthy.value;
  // The bound is the worst that counts as healthy, for the test: what is lost counts from healthy itself.
  const bound = result.healthy.sigma === 0 && healthy > rules.configured.value;
  const from = bound ? rules.configured : result.healthy;
  const off = (last?.share ?? 0) - from.value;
  const sigma = Math.hypot(last?.sigma ?? 0, from.sigma);
  const limit = rule.limit + healthy - from.value;
  const is = `Unit ${unit.id}: degraded beds cost ${energy(off).toFixed(2)} +/- ${energy(sigma).toFixed(2)} MWh_el at rated power from the present heat, ${rounded(100 * off)} % of the rated energy`;
  const against = bound
    ? 'against a unit as configured, as more was lost while healthy was being learned than it may be off'
    : healthyWords(state.follow, result.healthy);
  const bracket = `(${against}; limit ${(100 * limit).toFixed(0)} %)`;
  const value = last?.share ?? null;
  const placed = { value, healthy, limit: healthy + rule.limit, score: result.score };
  const sentence = {
    degraded: `${is} ${bracket}. Offers and hours already allow for it; see the other indicators for where it comes from.`,
    normal: `${is} ${bracket}: ${normalWords(placed, 'as little as when it was healthy')}.`,
    undetermined:
      result.reason === 'learning'
        ? `${is} ${bracket}. What is healthy for it is still being learned, charge by charge.${learningWords(placed)}`
        : `Unit ${unit.id}: what degraded beds cost is not known before the first charge is over.`,
  }[result.state];
  return viewOf('energy_lost', unit.id, rule, result, {
    value,
    sigma: last?.sigma ?? null,
    unit: '-',
    healthy,
    limit: placed.limit,
    deadband: rule.deadband,
    time: dayOf(last?.time_ms ?? null),
    sentence,
  });
}
