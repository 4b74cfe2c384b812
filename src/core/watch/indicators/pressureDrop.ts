import { pressureDrop } from '../../bed/pressureDrop.js';
import { meanTemperatures } from '../../track/storeEstimate.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { UnitModel } from '../../unitModel.js';
import { type BaselineState, baseline, learnBaseline, startBaseline } from '../baseline.js';
import type { Healthy } from '../follow.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import { dropSentence } from './pressureDropWords.js';
import { type Followed, remembered, shownAs, stampOf, startFollowed } from './shown.js';
import { beginAnew, healthyBy, testSide } from './sides.js';

/** Readings are averaged over this time of even flow, and so many of these make one value [s]. */
const BLOCK_S = 600;
const BLOCKS = 6;
/** Flow counts from this share of the greatest one on; below, transmitters tell little. */
const LEAST_FLOW = 0.25;
/** Within a block it changes by at most this share of its mean. */
const EVEN = 0.1;
/**
 * One sigma of a value, in ln: the drop goes with the flow to the power 1.7, the meter's error changes by a
 * per cent over its range, and its noise over ten minutes is of that order, too.
 */
const VALUE_SIGMA = 0.02;
const RULE = { floor: 0.015, enough: 0.018, least: 6 };
/**
 * ln of the drop of a sound bed against the configured law, as long as nothing is learned: a void
 * fraction off by 0.012 is 12 %, rough rock up to 1.45 times smooth (Macdonald et al. 1979).
 */
const PRIOR_SIGMA = 0.2;
const HEALTHY = { configured: { value: 0, sigma: PRIOR_SIGMA }, baseline: RULE };
/** No bed's drop is so many times the law, nor its inverse [-]. */
const MOST_RATIO = 1e3;
/** Rock below freezing by less than this is neither cold nor warm [K]. */
const FREEZING_K = 273.15;
const EITHER_WAY_K = 3;
/** Sums by condition fade with this time of flow [s]. */
const FADE_S = 12 * 3600;

/** Weighted mean ratio under one condition. */
interface Mean {
  weight: number;
  sum: number;
}

const noMean = (): Mean => ({ weight: 0, sum: 0 });

interface Drop {
  /** Tests while rock is below freezing, and while none is: warm hours do not undo what frost has shown. */
  readonly freezing: Followed;
  readonly thawed: Followed;
  /** Of ln of the ratio. */
  readonly healthy: BaselineState;
  /** Blocks left out: flow that was uneven or hardly read, and ratios that no bed has. */
  uneven: number;
  absurd: number;
  /** Of the block that runs: time, scans, sums of drop, flow and pressure; least and greatest flow. */
  block_s: number;
  scans: number;
  drop_Pa: number;
  flow_kg_s: number;
  pressure: number;
  least_kg_s: number;
  most_kg_s: number;
  /** Of the value that is made up. */
  blocks: number;
  coldBlocks: number;
  ratios: number;
  /** While rock is below freezing, and while none is. */
  cold: Mean;
  warm: Mean;
  /** Whether the excess was there only below freezing, as of the newest value. */
  only: boolean | null;
}

export interface PressureDropState {
  readonly stores: Drop[];
}

/**
 * Measured pressure drop over that of Ergun's equation along the present profile at the present flow
 * and pressure, against this bed's own healthy ratio. An hour of even flow makes one value. Sums kept
 * apart for a bed with and without rock below freezing tell frost, which melts, from dust.
 */
export const PRESSURE_DROP: Indicator<PressureDropState> = {
  kind: 'pressure_drop',
  start: (model) => ({ stores: model.stores.map(startDrop) }),
  step(state, rule, watching, input) {
    return input.model.stores.map((store, s) => {
      const drop = state.stores[s] as Drop;
      const channel = channelOf(input.model, 'pressure_drop', store.store.id);
      const tests = [drop.freezing.test, drop.thawed.test];
      if (beginAnew([drop.healthy], tests, watching.baseline_from_ms))
        Object.assign(drop, startDrop(), { healthy: drop.healthy });
      if (channel >= 0) follow(drop, store, s, channel, rule, watching, input);
      const left = `${drop.uneven} ${drop.absurd}`;
      const stamp = `${stampOf(drop.freezing)} ${stampOf(drop.thawed)} ${left} ${rule.limit}`;
      return remembered(drop, stamp, () => view(drop, store, channel, rule));
    });
  },
};

function startDrop(): Drop {
  return {
    freezing: startFollowed(),
    thawed: startFollowed(),
    healthy: startBaseline(),
    uneven: 0,
    absurd: 0,
    ...EMPTY_BLOCK,
    blocks: 0,
    coldBlocks: 0,
    ratios: 0,
    cold: noMean(),
    warm: noMean(),
    only: null,
  };
}

const EMPTY_BLOCK = {
  block_s: 0,
  scans: 0,
  drop_Pa: 0,
  flow_kg_s: 0,
  pressure: 0,
  least_kg_s: Number.POSITIVE_INFINITY,
  most_kg_s: 0,
};

/** Index of a store's channel of a kind; -1 = none. */
export function channelOf(
  { unit }: UnitModel,
  kind: 'pressure' | 'pressure_drop',
  store: string,
): number {
  return unit.channels.findIndex(({ role }) => role.kind === kind && role.store === store);
}

function follow(
  drop: Drop,
  store: StoreModel,
  s: number,
  channel: number,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
  { model, state, taken, time_ms, dt_s }: IndicatorInput,
): void {
  const { conditions, scan } = taken;
  const flow = Math.abs(conditions.flow_kg_s);
  const read = Math.abs(scan.values[channel] as number);
  const known = conditions.flowKnown && !conditions.flowStandIn;
  if (flow < LEAST_FLOW * model.unit.limits.discharge.flow_max_kg_s || !known) {
    Object.assign(drop, EMPTY_BLOCK);
    return;
  }
  drop.block_s += dt_s;
  if (Number.isFinite(read)) {
    const at = channelOf(model, 'pressure', store.store.id);
    const pressure = at >= 0 ? (scan.values[at] as number) : Number.NaN;
    drop.scans++;
    drop.drop_Pa += read;
    drop.flow_kg_s += flow;
    drop.pressure += Number.isFinite(pressure) ? pressure : store.store.bed.pressure_Pa;
    drop.least_kg_s = Math.min(drop.least_kg_s, flow);
    drop.most_kg_s = Math.max(drop.most_kg_s, flow);
  }
  if (drop.block_s < BLOCK_S) return;
  const { scans, least_kg_s, most_kg_s } = drop;
  const mean = drop.flow_kg_s / scans;
  const measured = drop.drop_Pa / scans;
  const pressure = drop.pressure / scans;
  Object.assign(drop, EMPTY_BLOCK);
  if (scans < 3 || most_kg_s - least_kg_s > EVEN * mean) {
    drop.uneven++;
    return;
  }
  const profile = meanTemperatures(store, state.stores[s] as StoreState);
  const { bed } = store.store;
  // Density goes with the pressure, and the drop with its inverse.
  const law = pressureDrop(bed, mean / bed.area_m2, profile) * (bed.pressure_Pa / pressure);
  const ratio = measured / law;
  if (!(ratio > 1 / MOST_RATIO && ratio < MOST_RATIO)) {
    drop.absurd++;
    return;
  }
  note(drop, ratio, profile);
  drop.ratios += ratio;
  drop.blocks++;
  if (drop.blocks < BLOCKS) return;
  take(drop, drop.ratios / drop.blocks, rule, watching, time_ms);
  drop.blocks = 0;
  drop.coldBlocks = 0;
  drop.ratios = 0;
}

function note(drop: Drop, ratio: number, profile: Float64Array): void {
  const coldest = profile.reduce((least, t) => Math.min(least, t), Number.POSITIVE_INFINITY);
  if (coldest < FREEZING_K) drop.coldBlocks++;
  if (Math.abs(coldest - FREEZING_K) < EITHER_WAY_K) return;
  const mean = coldest < FREEZING_K ? drop.cold : drop.warm;
  const keep = Math.exp(-BLOCK_S / FADE_S);
  mean.weight = mean.weight * keep + 1;
  mean.sum = mean.sum * keep + ratio;
}

/**
 * ln of the healthy ratio: learned, but no more than a sound bed can have. Less than that is believed:
 * only an excess is looked for, and the lower norm finds it the sooner.
 */
function healthyOf({ healthy }: Drop): Healthy {
  const known = healthyBy(healthy, HEALTHY);
  const learned = baseline(healthy, RULE);
  if (learned === null || learned.value >= known.value) return known;
  return { ...learned, from: 'learned' };
}

function take(
  drop: Drop,
  ratio: number,
  rule: IndicatorRule,
  { in_control_d, baseline_from_ms }: IndicatorsDefinition,
  time_ms: number,
): void {
  const followed = 2 * drop.coldBlocks > drop.blocks ? drop.freezing : drop.thawed;
  const known = healthyOf(drop);
  const own = { value: Math.log(ratio), sigma: VALUE_SIGMA };
  const limit = { degraded: Math.log(rule.limit), back: Math.log(rule.limit - rule.deadband) };
  // A value goes into one of the two tests only: together they decide no oftener than one.
  followed.decision = decisionAt(in_control_d, BLOCK_S * BLOCKS);
  testSide(followed.test, own, known, limit, followed.decision);
  // Nothing speaks for an excess: what comes from now on may be one (Page's estimate of the change).
  const both = [drop.freezing.test, drop.thawed.test];
  if (both.every(({ up, degraded }) => up === 0 && !degraded))
    Object.assign(drop, { cold: noMean(), warm: noMean() });
  followed.value = ratio / Math.exp(known.value);
  followed.sigma = Math.hypot(VALUE_SIGMA, known.sigma) * followed.value;
  followed.time_ms = time_ms;
  const found = both.some(({ degraded }) => degraded);
  drop.only = found ? onlyWhileCold(drop, Math.exp(known.value), rule) : null;
  if (found || followed.test.up > 0.25 * followed.decision) return;
  learnBaseline(drop.healthy, own, time_ms, baseline_from_ms, RULE);
}

function view(
  drop: Drop,
  { store }: StoreModel,
  channel: number,
  rule: IndicatorRule,
): IndicatorView {
  const followed = worse(drop);
  const known = healthyOf(drop);
  const { only } = drop;
  const shown = shownAs({
    kind: 'pressure_drop',
    subject: store.id,
    unit: '-',
    rule,
    followed,
    healthy: channel < 0 ? null : 1,
    healthy_from: known.from,
    reason: channel < 0 ? 'not_instrumented' : drop.healthy.kept ? null : 'learning',
    sentence: dropSentence(store.id, followed, drop, channel, known.from === 'learned', only, rule),
  });
  return { ...shown, only_while_cold: only };
}

/** The test that is further on; of two alike the one with the newer value. */
function worse({ freezing, thawed }: Drop): Followed {
  const a = freezing.test;
  const b = thawed.test;
  const ahead =
    Number(a.degraded) - Number(b.degraded) ||
    a.up - b.up ||
    (freezing.time_ms ?? 0) - (thawed.time_ms ?? 0);
  return ahead > 0 ? freezing : thawed;
}

/**
 * Whether the excess is there below freezing and gone above; null where it was not seen both ways.
 * Half of the excess parts the two.
 */
function onlyWhileCold({ cold, warm }: Drop, healthy: number, rule: IndicatorRule): boolean | null {
  if (warm.weight < 1) return null;
  const half = 1 + (rule.limit - 1) / 2;
  if (warm.sum / warm.weight / healthy > half) return false;
  return cold.weight >= 1 && cold.sum / cold.weight / healthy > half ? true : null;
}
