import type { Mode } from '../../definitions.js';
import { meanTemperatures } from '../../track/storeEstimate.js';
import type { StoreState } from '../../track/storeTracker.js';
import type { UnitModel } from '../../unitModel.js';
import { learnBaseline } from '../baseline.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorReason,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import {
  baselinesOf,
  byMode,
  type GasLaws,
  healthyOf,
  LAWS,
  type Law,
  lawOf,
  RULE,
} from './gasLaws.js';
import { channelOf } from './pressureDrop.js';
import { type Followed, remembered, shownAs, stampOf, startFollowed, withSigma } from './shown.js';
import { beginAnew, testSide } from './sides.js';

/** An hour in one mode makes one value, after the pressures have settled [s]. */
const HOUR_S = 3600;
const SETTLE_S = 900;
/** Of fewer scans no hour is made. */
const LEAST_SCANS = 3;
/**
 * One sigma of an hour's mean in ln: a pressure transmitter's drift and what ambient does to the pipes;
 * the scatter that the plant itself shows is taken where it is more.
 */
const VALUE_SIGMA = 0.003;
/**
 * ln of the pressures of a sound plant against those configured, one sigma, as long as nothing is
 * learned: those are the working ones. While it stands a loop may be let down, and in a closed one they
 * move with the temperatures of the beds.
 */
const PRIOR_SIGMA = 0.05;
const WIDE_SIGMA = 0.2;

export interface GasInventoryState {
  mode: Mode | null;
  mode_s: number;
  hour_s: number;
  scans: number;
  /** Sum of the mean ln pressure [-]. */
  sum: number;
  readonly laws: GasLaws;
  followed: Followed;
  /** Mode, and ln of pressures against those configured, of the newest value. */
  newest: { readonly mode: Mode; readonly lnPressure: number } | null;
  /** Scans, after pressures had settled, in which not all of them were read. */
  unread: number;
}

/**
 * Share of the gas that is lost, by the pressures of the stores against their healthy values in the
 * same mode. Two laws are learned side by side: that pressures are held (a buffer takes what the beds
 * displace; then the pressures themselves stay), and that the loop is closed (then sum p V/T stays,
 * with the mean temperatures of the gas in the beds). The one that has scattered less decides.
 */
export const GAS_INVENTORY: Indicator<GasInventoryState> = {
  kind: 'gas_inventory',
  start: () => ({
    mode: null,
    mode_s: 0,
    hour_s: 0,
    scans: 0,
    sum: 0,
    laws: { held: byMode(), closed: byMode() },
    followed: startFollowed(),
    newest: null,
    unread: 0,
  }),
  step(state, rule, watching, input) {
    const channels = pressuresOf(input.model);
    const from_ms = watching.baseline_from_ms;
    if (beginAnew(baselinesOf(state.laws), [state.followed.test], from_ms))
      Object.assign(state, {
        laws: { held: byMode(from_ms), closed: byMode(from_ms) },
        followed: startFollowed(),
        newest: null,
      });
    if (channels.length > 0) follow(state, channels, rule, watching, input);
    const stamp = `${stampOf(state.followed)} ${state.unread} ${rule.limit}`;
    return [
      remembered(state, stamp, () => view(state, input.model.unit.id, channels.length, rule)),
    ];
  },
};

function view(
  state: GasInventoryState,
  unit: string,
  channels: number,
  rule: IndicatorRule,
): IndicatorView {
  const { followed, newest } = state;
  const law = lawOf(state.laws);
  const learned = newest !== null && state.laws[law][newest.mode].healthy.kept;
  let reason: IndicatorReason | null = null;
  if (channels === 0) reason = 'not_instrumented';
  else if (newest !== null && isBeyond(newest.lnPressure)) reason = 'too_uncertain';
  else if (newest !== null && !learned) reason = 'learning';
  return shownAs({
    kind: 'gas_inventory',
    subject: unit,
    unit: '-',
    rule,
    followed,
    healthy: channels === 0 ? null : 0,
    healthy_from: learned ? 'learned' : 'configured',
    reason,
    sentence: sentence(unit, state, law, channels, rule),
  });
}

/** Pressures that no sound plant has: of a transmitter or a configuration that is wrong, never learned. */
const isBeyond = (lnPressure: number): boolean => lnPressure > 2 * WIDE_SIGMA;

interface Pressure {
  readonly channel: number;
  readonly store: number;
}

const known = new WeakMap<UnitModel, Pressure[]>();

function pressuresOf(model: UnitModel): Pressure[] {
  const found = known.get(model) ?? pressures(model);
  known.set(model, found);
  return found;
}

function pressures(model: UnitModel): Pressure[] {
  return model.stores.flatMap(({ store }, s) => {
    const channel = channelOf(model, 'pressure', store.id);
    return channel < 0 ? [] : [{ channel, store: s }];
  });
}

function follow(
  state: GasInventoryState,
  channels: readonly Pressure[],
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
  input: IndicatorInput,
): void {
  const { taken, dt_s, model } = input;
  const { mode } = taken.conditions;
  if (mode !== state.mode) {
    Object.assign(state, { mode, mode_s: 0, hour_s: 0, scans: 0, sum: 0 });
  }
  state.mode_s += dt_s;
  if (state.mode_s < SETTLE_S) return;
  state.hour_s += dt_s;
  // Relative to what is configured, so that both levels count alike.
  const ln = channels.map(({ channel, store }) => {
    const read = taken.scan.values[channel] as number;
    const { pressure_Pa } = (model.stores[store] as UnitModel['stores'][number]).store.bed;
    return read > 0 ? Math.log(read / pressure_Pa) : Number.NaN;
  });
  const mean = ln.reduce((sum, one) => sum + one, 0) / ln.length;
  if (Number.isFinite(mean)) {
    state.scans++;
    state.sum += mean;
  } else state.unread++;
  if (state.hour_s < HOUR_S) return;
  // A mean of a few scans would be told with the sigma of an hour.
  if (state.scans >= LEAST_SCANS)
    take(state, state.sum / state.scans, channels, rule, watching, input);
  state.hour_s = 0;
  state.scans = 0;
  state.sum = 0;
}

/** ln of sum V/T of the beds' gas at the configured pressures. */
function lnContents({ model, state }: IndicatorInput, channels: readonly Pressure[]): number {
  let sum = 0;
  for (const { store } of channels) {
    const one = model.stores[store] as UnitModel['stores'][number];
    const { area_m2, length_m, void_fraction, pressure_Pa } = one.store.bed;
    const profile = meanTemperatures(one, state.stores[store] as StoreState);
    const perKelvin = profile.reduce((total, t) => total + 1 / t, 0) / profile.length;
    sum += area_m2 * length_m * void_fraction * pressure_Pa * perKelvin;
  }
  return Math.log(sum);
}

function take(
  state: GasInventoryState,
  lnPressure: number,
  channels: readonly Pressure[],
  rule: IndicatorRule,
  { in_control_d, baseline_from_ms }: IndicatorsDefinition,
  input: IndicatorInput,
): void {
  const mode = state.mode as Mode;
  const ln = lnContents(input, channels);
  const values = { held: lnPressure, closed: lnPressure + ln };
  // With less than two values it is not known which law it is, and only pressures are configured.
  const law = state.laws.held[mode].healthy.count < 2 ? 'held' : lawOf(state.laws);
  const learned = state.laws[law][mode];
  const { healthy, sum, squares } = learned;
  const { followed } = state;
  followed.decision = decisionAt(in_control_d, HOUR_S);
  const known = healthyOf(learned, {
    value: law === 'held' ? 0 : ln,
    sigma: law === 'held' && mode !== 'stand' ? PRIOR_SIGMA : WIDE_SIGMA,
    from: 'configured',
  });
  const own =
    healthy.count < 2
      ? 0
      : Math.sqrt(Math.max(0, squares - (sum * sum) / healthy.count) / healthy.count);
  const sigma = Math.max(VALUE_SIGMA, own);
  const lost = 1 - Math.exp(values[law] - known.value);
  const limit = { degraded: rule.limit, back: rule.limit - rule.deadband };
  const side = { value: 0, sigma: known.sigma };
  testSide(followed.test, { value: lost, sigma }, side, limit, followed.decision);
  Object.assign(followed, {
    value: lost,
    sigma: Math.hypot(sigma, known.sigma),
    time_ms: input.time_ms,
  });
  state.newest = { mode, lnPressure };
  if (followed.test.degraded || followed.test.up > 0.25 * followed.decision) return;
  if (isBeyond(lnPressure)) return;
  for (const one of LAWS) {
    const into = state.laws[one][mode];
    if (into.healthy.kept) continue;
    const before = into.healthy.count;
    const v = { value: values[one], sigma: VALUE_SIGMA };
    learnBaseline(into.healthy, v, input.time_ms, baseline_from_ms, RULE);
    if (into.healthy.count === before) continue;
    if (before === 0) into.first = values[one];
    const d = values[one] - into.first;
    into.sum += d;
    into.squares += d * d;
  }
}

function sentence(
  unit: string,
  { followed: { value, sigma, test }, newest, unread }: GasInventoryState,
  law: Law,
  channels: number,
  rule: IndicatorRule,
): string {
  if (channels === 0)
    return `Unit ${unit}: no pressure is measured, so lost gas does not show here.`;
  const rests =
    (law === 'held'
      ? 'It rests on pressures that the plant keeps: as long as a buffer makes up for it, gas is lost unseen.'
      : 'It rests on pressures and the mean temperatures of the gas in the beds, as in a closed loop.') +
    (unread > 0 ? ` ${unread} scans were left out so far, as not every pressure was read.` : '');
  if (value === null || sigma === null)
    return `Unit ${unit}: pressures are followed hour by hour. ${rests}`;
  if (newest !== null && isBeyond(newest.lnPressure) && !test.degraded)
    return `Unit ${unit}: pressures read ${Math.exp(newest.lnPressure).toFixed(2)} times the configured ones, more than a sound plant has: look at transmitters, their unit, and the configuration. ${rests}`;
  const figure = `${withSigma(100 * value, 100 * sigma, 1)} % (limit ${(100 * rule.limit).toFixed(0)} %)`;
  return test.degraded
    ? `Unit ${unit}: by its pressures it has lost ${figure} of its gas. ${rests}`
    : `Unit ${unit}: gas lost by its pressures ${figure}. ${rests}`;
}
