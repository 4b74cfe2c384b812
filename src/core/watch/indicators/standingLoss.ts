import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import { type BaselineState, baseline, learnBaseline, startBaseline } from '../baseline.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorReason,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import { lookAtRest, type RestScores, scoresOf } from './restTest.js';
import { type Followed, remembered, shownAs, stampOf, startFollowed, withSigma } from './shown.js';
import { beginAnew, SAFE } from './sides.js';
import { fitRest } from './standingFit.js';
import { MEAN_S, type Rest, startRest, stepRest } from './standingRest.js';
import { leakThrough } from './valveLeak.js';

/** Junctions and gas settle first [s]. */
const SETTLE_S = 1800;
/** A rest is looked at anew this often, from this length on: before, no heat has come to a string [s]. */
const LOOK_S = 2 * 3600;
const LEAST_S = 5 * 3600;
/** Without a scan for this long nobody knows what happened meanwhile [s]. */
const GAP_S = 3600;
/** Heat comes this far within a day or two: 2 sqrt(alpha t) [m]. */
const REACH_M = 0.8;
/** White noise of the change of an hour's mean, with what the model makes wrong of even rock [K]. */
const NOISE_K = 0.15;
/** Losses as built over those configured, ln, one sigma: judgement, as for tuning. */
const PRIOR_SIGMA = 0.35;
/**
 * What the model makes wrong anew in each rest, in configured losses, one sigma: rests of the finer
 * plant came out 0.03 to 0.14 too low, those of one plant alike within 0.08.
 */
const MODEL_LOSS = 0.06;
/** A value less certain than this, in configured losses, tells nothing yet. */
const USELESS = 0.4;
const RULE = { floor: 0.05, enough: 0.16, least: 1 };
/** A rest in which more than this share of the greatest flow leaks tells nothing of losses; see valveLeak. */
const LEAKS = 0.001;
/** Readings that move otherwise than any cause allows, by mean square over noise, tell nothing [-]. */
const MISFIT_MOST = 9;

/** A loss with its sigma against other rests of this store, and against the configuration. */
interface Told {
  readonly value: number;
  readonly sigma: number;
  readonly whole: number;
}

interface Standing {
  stood_s: number;
  look_s: number;
  rest: Rest | null;
  /** A rest was looked at, and told too little. */
  vain: boolean;
  /** What the newest such look, if cards and model alone were to blame, left open of the loss; else null. */
  vague: { readonly sigma: number; readonly hours: number } | null;
  /** What the present rest has told so far, in configured losses. */
  told: Told | null;
  /** Scores of the test as the present rest began; null before its first look. */
  from: RestScores | null;
  readonly followed: Followed;
  readonly healthy: BaselineState;
}

export interface StandingLossState {
  readonly stores: Standing[];
}

/**
 * Heat lost while standing over what the bed model loses with the configured coefficients. Half an
 * hour after the flow has stopped the estimate is copied and marched on by itself: as configured, with
 * losses of mantle and of ends doubled, and with another conductivity. Changes of readings since then,
 * in which constant offsets cancel, against those of the models give the loss (see fitRest). Every 2 h
 * what the rest tells by then takes the place of what it told before in the test (see lookAtRest); at
 * its end it counts to what is healthy, unless the test leans to degraded.
 */
export const STANDING_LOSS: Indicator<StandingLossState> = {
  kind: 'standing_loss',
  start: (model) => ({ stores: model.stores.map(startStanding) }),
  step(state, rule, watching, input) {
    return input.model.stores.map((store, s) => {
      const standing = state.stores[s] as Standing;
      const away_m = fromWall(store);
      if (away_m <= REACH_M) follow(standing, store, s, rule, watching, input);
      const { followed, healthy } = standing;
      const open = `${standing.vain}/${standing.vague?.hours}`;
      const stamp = `${stampOf(followed)} ${open} ${healthy.count} ${healthy.begun_ms} ${rule.limit}`;
      return remembered(standing, stamp, () => view(standing, store, away_m, rule));
    });
  },
};

function startStanding(): Standing {
  return {
    stood_s: 0,
    look_s: 0,
    rest: null,
    vain: false,
    vague: null,
    told: null,
    from: null,
    followed: startFollowed(),
    healthy: startBaseline(),
  };
}

/** Distance of the outermost string from the wall [m]. */
function fromWall({ store }: StoreModel): number {
  const outermost = Math.max(...store.strings.map(({ radius_m }) => radius_m));
  return store.bed.diameter_m / 2 - outermost;
}

function follow(
  standing: Standing,
  model: StoreModel,
  s: number,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
  { state, taken, time_ms, dt_s, unit }: IndicatorInput,
): void {
  const { conditions, scan } = taken;
  const store = state.stores[s] as StoreState;
  const { followed, healthy } = standing;
  if (beginAnew([healthy], [followed.test], watching.baseline_from_ms))
    Object.assign(standing, { followed: startFollowed(), from: null });
  const stands = conditions.mode === 'stand' && conditions.flow_kg_s === 0 && conditions.flowKnown;
  if (!stands || !store.started || dt_s > GAP_S || taken.stores[s]?.step === 'reacquired') {
    endRest(standing, watching, time_ms);
    return;
  }
  standing.stood_s += dt_s;
  if (standing.stood_s < SETTLE_S) return;
  standing.rest ??= startRest(model, store);
  standing.look_s += dt_s;
  const readings = stepRest(standing.rest, model, store, scan.values, conditions.ambient_K, dt_s);
  if (readings === null || standing.stood_s < LEAST_S || standing.look_s < LOOK_S) return;
  standing.look_s = 0;
  const group_K = Math.SQRT2 * unit.estimator.group_offset_sigma_K;
  const { excess, sigma, fresh, misfit } = fitRest(readings, { group_K, noise_K: NOISE_K });
  standing.vain = true;
  standing.vague = null;
  // Gas that leaks in carries heat to the ends that no standing model has.
  const { value: leak } = leakThrough(model, store, unit.limits.discharge.flow_max_kg_s);
  if (Math.abs(leak) > LEAKS) return;
  if (!Number.isFinite(sigma) || misfit > MISFIT_MOST) return;
  const worse = Math.sqrt(Math.max(1, misfit));
  const now = {
    value: 1 + excess,
    sigma: Math.hypot(fresh * worse, MODEL_LOSS),
    whole: Math.hypot(sigma * worse, MODEL_LOSS),
  };
  if (now.whole > USELESS) {
    standing.vague = { sigma: Math.min(99, now.whole), hours: standing.stood_s / 3600 };
    return;
  }
  standing.vain = false;
  test(standing, now, rule, watching, time_ms);
  standing.told = now;
}

interface Healthy {
  /** Loss, and its sigma, in configured losses; what one healthy loss is. */
  readonly value: number;
  readonly sigma: number;
  readonly one: number;
  readonly learned: boolean;
}

/**
 * What a healthy store loses. What the model makes wrong alike in all rests adds to it, so that an
 * excess is the difference, in losses of at least what the configuration allows.
 */
function healthyOf({ healthy }: Standing): Healthy {
  const learned = baseline(healthy, RULE);
  if (learned === null || learned.sigma > PRIOR_SIGMA)
    return { value: 1, sigma: Math.exp(PRIOR_SIGMA) - 1, one: 1, learned: false };
  const value = Math.min(learned.value, Math.exp(2 * PRIOR_SIGMA));
  return {
    value,
    sigma: learned.sigma,
    one: Math.max(value, Math.exp(-PRIOR_SIGMA)),
    learned: true,
  };
}

/** What this rest tells by now, against what is healthy. */
function test(
  standing: Standing,
  now: Told,
  rule: IndicatorRule,
  { in_control_d }: IndicatorsDefinition,
  time_ms: number,
): void {
  const { followed } = standing;
  const known = healthyOf(standing);
  const over = (loss: number): number => 1 + (loss - known.value) / known.one;
  // Against rests of its own, what the model makes wrong in all of them alike drops out.
  const sigma = known.learned ? now.sigma : now.whole;
  followed.value = over(now.value);
  followed.sigma = Math.hypot(sigma, known.sigma) / known.one;
  followed.time_ms = time_ms;
  followed.decision = decisionAt(in_control_d, LOOK_S);
  standing.from ??= scoresOf(followed.test);
  const healthy = 1 + (SAFE * known.sigma) / known.one;
  const limit = rule.limit - (followed.test.degraded ? rule.deadband : 0);
  const tested = { value: followed.value, sigma: sigma / known.one };
  const degraded = healthy + limit - 1;
  lookAtRest(followed.test, standing.from, { ...tested, healthy, degraded }, followed.decision);
}

function endRest(
  standing: Standing,
  { baseline_from_ms }: IndicatorsDefinition,
  time_ms: number,
): void {
  const { told, followed, healthy } = standing;
  const leans = followed.test.degraded || followed.test.up > 0.25 * followed.decision;
  if (told !== null && !leans) learnBaseline(healthy, told, time_ms, baseline_from_ms, RULE);
  standing.stood_s = 0;
  standing.look_s = 0;
  standing.rest = null;
  standing.told = null;
  standing.from = null;
}

function view(
  standing: Standing,
  { store }: StoreModel,
  away_m: number,
  rule: IndicatorRule,
): IndicatorView {
  const known = healthyOf(standing);
  const { followed } = standing;
  let reason: IndicatorReason | null = null;
  if (away_m > REACH_M) reason = 'not_instrumented';
  else if (followed.sigma === null ? standing.vain : followed.sigma > rule.limit - 1)
    reason = 'too_uncertain';
  return shownAs({
    kind: 'standing_loss',
    subject: store.id,
    unit: '-',
    rule,
    followed,
    healthy: reason === 'not_instrumented' ? null : 1,
    healthy_from: known.learned ? 'learned' : 'configured',
    reason,
    sentence: sentence(store.id, standing, away_m, known, reason, rule),
  });
}

function sentence(
  store: string,
  { followed: { value, sigma, test }, vague }: Standing,
  away_m: number,
  known: ReturnType<typeof healthyOf>,
  reason: IndicatorReason | null,
  rule: IndicatorRule,
): string {
  if (reason === 'not_instrumented')
    return (
      `Store ${store}: what is lost through the wall cannot be told: the outermost string hangs ` +
      `${away_m.toFixed(1)} m from it, and heat comes no further than ${REACH_M} m in a day or two. ` +
      'A string nearer to the wall would show it.'
    );
  if ((value === null || sigma === null) && reason === 'too_uncertain')
    return (
      `Store ${store}: what it loses while standing cannot be told from the rests so far: ` +
      (vague === null
        ? 'gas leaks through it, or its thermocouples move as by nothing that is modelled. '
        : `${vague.hours.toFixed(0)} h of rest tell it to +/- ${vague.sigma.toFixed(2)} of the configured loss only, ` +
          'as it moves the thermocouples near wall and ends by no more than cards swing and the model errs. ') +
      'A longer rest of a full, tight store tells more.'
    );
  if (value === null || sigma === null)
    return `Store ${store}: losses show after ${LEAST_S / MEAN_S} h of standing at a stretch or more.`;
  const against = known.learned ? 'what it lost when healthy' : 'the configured loss';
  const figure = `${withSigma(value, sigma, 2)} times ${against} (limit ${rule.limit})`;
  if (test.degraded)
    return `Store ${store}: while standing it loses ${figure}: its rock cools or warms too fast near wall and ends.`;
  if (reason === 'too_uncertain')
    return `Store ${store}: while standing it loses ${figure}; this rest does not tell it better.`;
  return `Store ${store}: while standing it loses ${figure}.`;
}
