import type { LimitsDefinition, StoreKind } from '../definitions.js';
import type { EndCause } from '../estimate.js';
import { mismatchOf, WITHOUT } from './alone.js';
import type { AheadModel, BedsAhead } from './bedsAhead.js';
import { longest_s } from './capabilityPaths.js';
import { byStore, contentOf } from './content.js';
import { type Moment, standFor, watchToLimit, withoutRules } from './limitToLimit.js';
import { toEmpty, type Usual, usualCharge } from './usual.js';

export const TRIM_WAYS = ['longer_charge', 'run_on', 'stand'] as const;
export type TrimWay = (typeof TRIM_WAYS)[number];

/** A way to bring the two stores together again, and what it costs. */
export interface Trim {
  readonly way: TrimWay;
  /** Why it is not to be had; null: it is, and the rest is what it does. */
  readonly reason: string | null;
  readonly hours: number;
  /** At the same point of the cycle, without it and with it. */
  readonly mismatch_before_h: number;
  readonly mismatch_after_h: number;
  /** More electricity taken for it, and more (below 0: less) given through it. */
  readonly takes_MWh_el: number;
  readonly gives_MWh_el: number;
  readonly cost_MWh_el: number;
  /** Heat and cold that leave the stores unused, by store. */
  readonly lost_MWh_th: Record<string, number>;
  /** The stop rule that is run past, and the outlet's temperature in the end. */
  readonly past_rule: EndCause | null;
  readonly outlet_degC: number | null;
}

const J_PER_MWH = 3.6e9;
const ZERO_DEGC_K = 273.15;
const DAY_S = 86_400;
/** Longest stand that is of any use [s]. */
const MOST_STAND_S = 7 * DAY_S;
/** Stand from which the rate of change is taken [s]. */
const PROBE_S = DAY_S / 4;
/** A mismatch is met within this share of it. */
const CLOSE = 0.1;
const HALVINGS = 6;
/** A stand that changes the mismatch by less in a day does nothing [h]. */
const LEAST_CHANGE_H = 1e-3;

const CHARGE_RULES: Readonly<Record<'hot_outlet' | 'cold_outlet', Partial<LimitsDefinition>>> = {
  hot_outlet: { charge_hot_outlet_max_K: null },
  cold_outlet: { charge_cold_outlet_min_K: null },
};
const KIND: Readonly<Record<'hot_outlet' | 'cold_outlet', StoreKind>> = {
  hot_outlet: 'hot',
  cold_outlet: 'cold',
};

type OutletRule = keyof typeof KIND;
const isOutlet = (cause: EndCause | null): cause is OutletRule =>
  cause === 'hot_outlet' || cause === 'cold_outlet';

/**
 * Ways to trim the mismatch of two stores, each marched: a charge that goes on past the rule of the
 * store that is full first to that of the other; a discharge that runs on past the rule of the store
 * that is empty first; a stand, if the store that holds more loses more. The first two leave a stop
 * rule out, which is the plant's to allow.
 */
export function trimsOf(usual: Usual, mismatch_h: number): Trim[] {
  return [longerCharge(usual), runOn(usual), stand(usual, mismatch_h)];
}

function longerCharge(usual: Usual): Trim {
  const { model, toFull, charging_W, options } = usual;
  const before = mismatchOf(usual, toFull.end);
  const cause = toFull.ends_by;
  if (!isOutlet(cause)) {
    return none(
      'longer_charge',
      before,
      `a full charge ends by ${cause ?? 'nothing'}, not by a store`,
    );
  }
  const further = withoutRules(model, CHARGE_RULES[cause]);
  const enough = { time_s: longest_s(model, charging_W) };
  const more = watchToLimit(further, toFull.end, 'charge', charging_W, enough, options);
  if (more.hours === 0) return none('longer_charge', before, `${more.ends_by} ends it as well`);
  const s = indexOf(model, KIND[cause]);
  const gives = (toEmpty(usual, more.end).energy_J - usual.toEmpty.energy_J) / J_PER_MWH;
  const takes = more.energy_J / J_PER_MWH;
  const lost = model.stores.map(() => 0);
  lost[s] = blownThrough(usual, s, more.moments);
  return {
    way: 'longer_charge',
    reason: null,
    hours: more.hours,
    mismatch_before_h: before,
    mismatch_after_h: mismatchOf(usual, more.end),
    takes_MWh_el: takes,
    gives_MWh_el: gives,
    cost_MWh_el: usual.round_trip * takes - gives,
    lost_MWh_th: byStore(model, lost),
    past_rule: cause,
    outlet_degC: outletOf(more.end, s, 'discharge_inlet'),
  };
}

function runOn(usual: Usual): Trim {
  const { model, capacity, nowEmpty: empty } = usual;
  const before = mismatchOf(usual, usualCharge(usual, empty.end).end);
  const cause = empty.ends_by;
  if (!isOutlet(cause)) {
    return none('run_on', before, `a discharge ends by ${cause ?? 'nothing'}, not by a store`);
  }
  const kind = KIND[cause];
  const more = toEmpty(usual, empty.end, withoutRules(model, WITHOUT[kind]));
  if (more.hours === 0) return none('run_on', before, `${more.ends_by} ends it as well`);
  const held = contentOf(model, empty.end, capacity);
  const left = contentOf(model, more.end, capacity);
  const other = indexOf(model, kind === 'hot' ? 'cold' : 'hot');
  const drawn = (held[other] as number) - (left[other] as number);
  const gives = more.energy_J / J_PER_MWH;
  // Of the heat drawn, what did not become the electricity that matched stores make of it.
  const worth = drawn * (usual.perStore[other] as number);
  const lost = model.stores.map(() => 0);
  lost[other] = Math.max(0, drawn * (1 - gives / worth));
  return {
    way: 'run_on',
    reason: null,
    hours: more.hours,
    mismatch_before_h: before,
    mismatch_after_h: mismatchOf(usual, usualCharge(usual, more.end).end),
    takes_MWh_el: 0,
    gives_MWh_el: gives,
    cost_MWh_el: worth - gives,
    lost_MWh_th: byStore(model, lost),
    past_rule: cause,
    outlet_degC: outletOf(more.end, indexOf(model, kind), 'charge_inlet'),
  };
}

function stand(usual: Usual, before: number): Trim {
  const { model, now, options, capacity } = usual;
  const standing = (time_s: number) => {
    const beds = standFor(model, now, time_s, options);
    return { time_s, beds, mismatch_h: mismatchOf(usual, beds) };
  };
  const rate = (standing(PROBE_S).mismatch_h - before) * (DAY_S / PROBE_S);
  if (Math.abs(rate) < LEAST_CHANGE_H || rate * before >= 0) {
    const does = rate * before > 0 ? 'widens' : 'does not change';
    return none('stand', before, `standing ${does} the mismatch (${rate.toFixed(3)} h a day)`);
  }
  const needed_s = (Math.abs(before) / Math.abs(rate)) * DAY_S;
  if (needed_s > MOST_STAND_S) {
    const days = (needed_s / DAY_S).toFixed(1);
    return none('stand', before, `it would take ${days} days (${rate.toFixed(3)} h a day)`);
  }
  let after = standing(needed_s);
  // Where the mismatch turns on the way, the turn is found by halving.
  let early_s = 0;
  let late_s = needed_s;
  for (let n = 0; n < HALVINGS && Math.abs(after.mismatch_h) > CLOSE * Math.abs(before); n++) {
    if (after.mismatch_h * before > 0 && n === 0) break;
    if (after.mismatch_h * before > 0) early_s = after.time_s;
    else late_s = after.time_s;
    after = standing((early_s + late_s) / 2);
  }
  const { time_s, beds, mismatch_h } = after;
  if (Math.abs(mismatch_h) > Math.abs(before) / 2) {
    const [h, to] = [(time_s / 3600).toFixed(1), mismatch_h.toFixed(2)];
    return none('stand', before, `no stand meets it: after ${h} h it is ${to} h`);
  }
  const held = contentOf(model, now, capacity);
  const left = contentOf(model, beds, capacity);
  const takes = (model.machine.auxiliary_standing_W * time_s) / J_PER_MWH;
  const gives = (toEmpty(usual, beds).energy_J - usual.nowEmpty.energy_J) / J_PER_MWH;
  return {
    way: 'stand',
    reason: null,
    hours: time_s / 3600,
    mismatch_before_h: before,
    mismatch_after_h: mismatch_h,
    takes_MWh_el: takes,
    gives_MWh_el: gives,
    cost_MWh_el: takes - gives,
    lost_MWh_th: byStore(
      model,
      held.map((value, s) => value - (left[s] as number)),
    ),
    past_rule: null,
    outlet_degC: null,
  };
}

/**
 * Heat (or cold) that gas carries out of a full store past its discharged reference [MWh_th]: the sum
 * of m dt (h(T_out) - h(T_d)), m the metered flow times the store's travel factor and the rock's heat
 * capacity as it was found, so that it is on the same scale as what the store holds.
 */
export function blownThrough(usual: Usual, s: number, moments: readonly Moment[]): number {
  const { model, capacity } = usual;
  const own = model.stores[s] as AheadModel['stores'][number];
  const { kind, reference_cold_K, reference_hot_K, bed } = own.store;
  const discharged = bed.fluid.enthalpy(kind === 'hot' ? reference_cold_K : reference_hot_K);
  const travel = own.tubes.reduce((sum, tube) => sum + tube.area_share * tube.flowFactor, 0);
  const factor = travel * Math.exp(capacity[s]?.log ?? 0) * (kind === 'hot' ? 1 : -1);
  let heat = 0;
  moments.forEach(({ t_s, flow_kg_s, beds }, n) => {
    if (n === 0) return;
    const dt = t_s - (moments[n - 1] as Moment).t_s;
    heat += flow_kg_s * dt * (bed.fluid.enthalpy(beds.left_K[s] as number) - discharged);
  });
  return (factor * heat) / J_PER_MWH;
}

function indexOf(model: AheadModel, kind: StoreKind): number {
  return model.stores.findIndex((own) => own.store.kind === kind);
}

function outletOf(beds: BedsAhead, s: number, end: 'charge_inlet' | 'discharge_inlet'): number {
  return (beds.ends_K[s] as BedsAhead['ends_K'][number])[end] - ZERO_DEGC_K;
}

function none(way: TrimWay, mismatch_h: number, reason: string): Trim {
  return {
    way,
    reason,
    hours: 0,
    mismatch_before_h: mismatch_h,
    mismatch_after_h: mismatch_h,
    takes_MWh_el: 0,
    gives_MWh_el: 0,
    cost_MWh_el: 0,
    lost_MWh_th: {},
    past_rule: null,
    outlet_degC: null,
  };
}
