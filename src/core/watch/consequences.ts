import type { StoreDefinition } from '../definitions.js';
import type { SensorVerdict } from '../estimate.js';
import type { CauseView } from './causes.js';
import { CAUSES } from './causeTable.js';
import type { EventKind } from './event.js';
import { type IndicatorKind, type IndicatorView, UNIT_INDICATORS } from './indicator.js';
import { INDICATOR_EVENTS } from './kinds.js';

/** From this probability on a cause explains what follows from it. */
const EXPLAINS = 0.6;
/** An indicator in which a cause shows at least so often tells of it by its own alert. */
const TELLS = 0.5;

/** Kinds that follow from some cause: looked at after the others, whose alerts they may wait for. */
export const MAY_FOLLOW: ReadonlySet<IndicatorKind> = new Set(
  Object.values(CAUSES).flatMap(({ follows = [] }) => follows),
);

/** Whether an indicator may speak of a cause: of the same store, or either of the unit. */
function concerns({ kind, subject }: IndicatorView, { cause, subject: of }: CauseView): boolean {
  return CAUSES[cause].of === 'unit' || UNIT_INDICATORS.has(kind) || subject.split('/')[0] === of;
}

/** Whether a degraded indicator is what tells of a cause, no mere consequence of it. */
function tells(view: IndicatorView, one: CauseView): boolean {
  const { shows, follows = [] } = CAUSES[one.cause];
  const { kind } = view;
  const chance = shows[kind] ?? 0;
  return (
    chance >= TELLS && !follows.includes(kind) && kind in INDICATOR_EVENTS && concerns(view, one)
  );
}

/**
 * Whether an indicator that is degraded only follows from a cause that has an alert already: one
 * trouble is one alert to look after, not three. A second fault is still told: it has alerts that
 * follow from no cause, and what follows is raised once that alert is gone.
 *
 * @param stands whether an indicator is degraded, or its alert stands
 */
export function isConsequence(
  view: IndicatorView,
  views: readonly IndicatorView[],
  causes: readonly CauseView[],
  stands: (other: IndicatorView) => boolean,
): boolean {
  return causes.some(
    (one) =>
      one.probability >= EXPLAINS &&
      (CAUSES[one.cause].follows ?? []).includes(view.kind) &&
      (one.cause !== 'flow_meter' || view.kind !== 'pressure_drop' || isByMeter(views)) &&
      concerns(view, one) &&
      views.some((other) => tells(other, one) && stands(other)),
  );
}

/** Alerts that wait while that of an indicator stands; none where its cause is not sure enough. */
export function waitingFor(view: IndicatorView, causes: readonly CauseView[]): EventKind[] {
  const one = causes.find((c) => c.probability >= EXPLAINS && tells(view, c));
  if (one === undefined) return [];
  return (CAUSES[one.cause].follows ?? []).flatMap((kind) => INDICATOR_EVENTS[kind] ?? []);
}

/** The pressure drop of a bed goes with the flow to this power, between Ergun's 1 and 2 [-]. */
const DROP_POWER = 1.7;
/** One sigma of that, in ln of the drop, where the meter is off by some per cent. */
const POWER_SIGMA = 0.02;
/** What is alike is so within so many sigmas. */
const ALIKE_SIGMAS = 2;

interface Logged {
  readonly value: number;
  readonly sigma: number;
}

/** ln of an indicator's value over the healthy one. */
function logOf({ value, sigma, healthy }: IndicatorView): Logged | null {
  if (value === null || sigma === null || healthy === null) return null;
  if (!(value > 0 && healthy > 0)) return null;
  return { value: Math.log(value / healthy), sigma: sigma / value };
}

const isMeasured = ({ kind, reason }: IndicatorView): boolean =>
  kind === 'pressure_drop' && reason !== 'not_instrumented';

/**
 * Whether the pressure drop of every store is off by what the travel of its front says of the flow meter:
 * a meter that reads too little by 1/f has the front go f times as far per metered kilogram, and the drop
 * be f^1.7 times the one at the metered flow. Dust in one store alone is not that.
 */
function isByMeter(views: readonly IndicatorView[]): boolean {
  return views.filter(isMeasured).every((view) => {
    const travel = views.find((v) => v.kind === 'front_travel' && v.subject === view.subject);
    const [drop, way] = [logOf(view), travel === undefined ? null : logOf(travel)];
    if (drop === null || way === null) return false;
    const sigma = Math.hypot(drop.sigma, DROP_POWER * way.sigma, POWER_SIGMA);
    return Math.abs(drop.value - DROP_POWER * way.value) <= ALIKE_SIGMAS * sigma;
  });
}

/**
 * Whether the pressure drops of all stores, two at least, are high by the same factor while the travel of
 * the fronts, which tells a meter from dust, has not been decided: it takes a charge and a discharge.
 */
export function mayBeMeter(view: IndicatorView, views: readonly IndicatorView[]): boolean {
  if (view.kind !== 'pressure_drop') return false;
  const measured = views.filter(isMeasured);
  const travels = views.filter(({ kind }) => kind === 'front_travel');
  if (measured.length < 2 || travels.every(({ reason }) => reason === 'not_instrumented'))
    return false;
  if (travels.some(({ state }) => state === 'degraded')) return false;
  const own = logOf(view);
  return measured.every((other) => {
    const log = logOf(other);
    if (own === null || log === null || log.value < Math.log(other.limit) / 2) return false;
    return Math.abs(log.value - own.value) <= ALIKE_SIGMAS * Math.hypot(log.sigma, own.sigma);
  });
}

/** What a thermocouple that hangs in gas may be judged to be; an open circuit is not among it. */
const OF_GAS: ReadonlySet<SensorVerdict> = new Set([
  ...(['uncovered', 'offset', 'drifting', 'outlier', 'swapped'] as const),
]);
const SAME_PLACE_M = 1e-6;

/**
 * Whether a bed that has settled is why a thermocouple of it is not believed: it is no deeper than the
 * deepest one that hangs in gas, by the indicator, and judged as gas would have it.
 */
export function hangsInGas(
  store: StoreDefinition,
  id: string,
  verdict: SensorVerdict,
  views: readonly IndicatorView[],
): boolean {
  const settling = views.find((v) => v.kind === 'settling' && v.subject === store.id);
  if (settling?.state !== 'degraded' || !OF_GAS.has(verdict)) return false;
  const place = store.strings
    .flatMap(({ thermocouples }) => thermocouples)
    .find((one) => one.id === id)?.position_m;
  if (place === undefined || settling.value === null) return false;
  const depth_m = store.charge_inlet_at === 'top' ? place : store.bed.length_m - place;
  return depth_m <= settling.value + SAME_PLACE_M;
}
