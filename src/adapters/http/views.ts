import type { StoreDefinition, UnitDefinition } from '../../core/definitions.js';
import type { Estimate, ProfileView } from '../../core/estimate.js';
import { limitedAnswers } from '../../core/plan/limitedBy.js';
import { limitsView } from '../../core/plan/limitsView.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import type { UnitWorth } from '../../core/worth/unitWorth.js';
import { HttpFault } from './faults.js';
import type { StreamStateView, UnitDefinitionView, UnitStateView } from './schema/answers.js';
import type { PlayedProfileView, UnitProfileView } from './schema/playback.js';
import type { UnitWorthView } from './schema/worth.js';
import type { StoredMoment, UnitNow } from './service.js';

/** Where a unit has nothing to show yet. */
export function noEstimate(unit: string): HttpFault {
  return new HttpFault(
    503,
    'no_estimate_yet',
    `unit ${unit} has no estimate yet: no scan of it has been taken in since it was set up`,
    { field: 'unit', value: unit },
  );
}

/** From SI and kelvin to the units of the edge; the only place of this adapter that converts. */

const WATT_PER_MW = 1e6;

/**
 * [K] -> [degC], rounded to 0.001 K: finer digits are only the float error of subtracting 273.15
 * and would double the size of a profile.
 */
export function toCelsius(temperature_K: number): number {
  return Math.round((temperature_K - ZERO_CELSIUS_K) * 1000) / 1000;
}

const celsiusOrNull = (value: number | null) => (value === null ? null : toCelsius(value));

function storeDefinition(store: StoreDefinition, unit: UnitDefinition) {
  const { limits } = unit;
  const outlet = store.kind === 'hot' ? limits.hot_outlet_min_K : limits.cold_outlet_max_K;
  return {
    id: store.id,
    kind: store.kind,
    charge_inlet_at: store.charge_inlet_at,
    length_m: store.bed.length_m,
    diameter_m: store.bed.diameter_m,
    reference_hot_degC: toCelsius(store.reference_hot_K),
    reference_cold_degC: toCelsius(store.reference_cold_K),
    outlet_limit_degC: celsiusOrNull(outlet),
    strings: store.strings.map((string) => ({
      id: string.id,
      radius_m: string.radius_m,
      area_share: string.area_share,
      thermocouples: string.thermocouples.map(({ id, position_m }) => ({ id, position_m })),
    })),
  };
}

/** @param now_ms time that the limits are told for */
export function definitionView(unit: UnitDefinition, now_ms: number): UnitDefinitionView {
  return {
    unit: unit.id,
    name: unit.name,
    rated_power_MW_el: unit.rated_power_W / WATT_PER_MW,
    rated_hours: unit.rated_hours,
    scan_period_s: unit.scan_period_s,
    hours_at_MW_el: unit.hours_at_W.map((power) => power / WATT_PER_MW),
    stores: unit.stores.map((store) => storeDefinition(store, unit)),
    limits: limitsView(unit, now_ms),
  };
}

function estimateView(estimate: Estimate): NonNullable<UnitStateView['estimate']> {
  const { dispatch: _apart, stores, ...rest } = estimate;
  return {
    ...rest,
    stores: Object.fromEntries(
      Object.entries(stores).map(([id, { outlet_K, ...store }]) => [
        id,
        { ...store, outlet_degC: celsiusOrNull(outlet_K) },
      ]),
    ),
  };
}

/**
 * Age [s] of something computed from the estimate of `time`: the age of the newest reading plus
 * what lies between that estimate and the latest one, both in source time, so that it also holds
 * where a recording runs faster than the clock. null before the first reading.
 */
export function ageOf(now: UnitNow, time: string): number | null {
  if (now.age_s === null) return null;
  const latest = now.estimate?.time ?? time;
  return now.age_s + Math.max(0, (Date.parse(latest) - Date.parse(time)) / 1000);
}

function countsView({ counts }: UnitNow): UnitStateView['counts'] {
  return counts
    ? { ...counts, stores: { ...counts.stores }, implausible: [...counts.implausible] }
    : null;
}

export function stateView(now: UnitNow): UnitStateView {
  const { estimate, dispatch } = now;
  return {
    unit: now.unit.id,
    estimate: estimate === null ? null : estimateView(estimate),
    dispatch:
      dispatch === null
        ? null
        : {
            time: dispatch.time,
            age_s: ageOf(now, dispatch.time),
            answers: limitedAnswers(now.unit, dispatch.time, dispatch.answers),
          },
    age_s: now.age_s,
    stale: now.stale,
    counts: countsView(now),
    flow_kg_s: now.flow_kg_s,
    power_MW_el: now.power_MW_el,
  };
}

function storeProfile(store: ProfileView['stores'][string]) {
  return {
    x_m: store.x_m,
    mean_degC: store.mean_K.map(toCelsius),
    tubes: store.tubes.map((tube) => ({
      id: tube.id,
      temperature_degC: tube.temperature_K.map(toCelsius),
      sigma_K: tube.sigma_K.map((sigma) => Math.round(sigma * 1000) / 1000),
    })),
    readings: store.readings.map(({ value_K, ...reading }) => ({
      ...reading,
      value_degC: celsiusOrNull(value_K),
    })),
  };
}

/** A moment of the past as a page draws it. */
export function momentView(moment: StoredMoment): Omit<UnitProfileView, 'age_s'> {
  const { profile, estimate, flow_kg_s, power_MW_el } = moment;
  return {
    ...profileView(profile),
    estimate: estimate && estimateView(estimate),
    ...{ flow_kg_s, power_MW_el },
  };
}

/** The same without sigma along the tubes, a fifth of it. */
export function withoutSigma(moment: PlayedProfileView): PlayedProfileView {
  const stores = Object.entries(moment.stores).map(([id, store]) => [
    id,
    { ...store, tubes: store.tubes.map(({ sigma_K: _, ...tube }) => tube) },
  ]);
  return { ...moment, stores: Object.fromEntries(stores) };
}

export function profileView(
  profile: ProfileView,
): Pick<UnitProfileView, 'time' | 'unit' | 'stores'> {
  return {
    time: profile.time,
    unit: profile.unit,
    stores: Object.fromEntries(
      Object.entries(profile.stores).map(([id, store]) => [id, storeProfile(store)]),
    ),
  };
}

/** What one `state` message of the stream carries. */
export function streamStateView(now: UnitNow, withProfile: boolean): StreamStateView {
  const profile = withProfile && now.profile !== null ? profileView(now.profile) : null;
  return { ...stateView(now), profile };
}

/** @param time of the state that hours ahead begin with; null over a day */
export function worthView(worth: UnitWorth, time: string | null): UnitWorthView {
  return {
    ...worth,
    time,
    rejected: [...worth.rejected],
    stores: worth.stores.map(({ sensors, groups, strings, ...store }) => ({
      ...store,
      sensors: [...sensors],
      groups: groups.map((group) => ({ ...group, strings: [...group.strings] })),
      strings: strings.map((string) => ({ ...string, one_more: [...string.one_more] })),
    })),
  };
}
