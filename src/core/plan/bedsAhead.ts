import { type BedWork, createBedWork } from '../bed/kernel.js';
import type { Direction, StoreEnd, UnitDefinition } from '../definitions.js';
import { throughPlenum } from '../dispatch/plenum.js';
import type { RolloutStore } from '../dispatch/rollout.js';
import { endOfBed, greatestDrop, stepStore } from '../dispatch/stepStore.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';

/** What never changes while beds are marched ahead. */
export interface AheadModel {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  readonly stores: readonly RolloutStore[];
  /** Factor on the machine's work per metered kilogram at rated flow, per direction. */
  readonly workFactor: Readonly<Record<Direction, number>>;
  /** That work at a flow [kg/s] over that at rated flow. */
  readonly partLoad: (direction: Direction, flow_kg_s: number) => number;
  readonly ambient_K: number;
}

/** Beds, wall steel and plena as they are at one time of a march; changed in place by `stepAhead`. */
export interface BedsAhead {
  /** Enthalpy [J/m3] of each store's streams. */
  readonly beds: readonly (readonly Float64Array[])[];
  readonly steels: readonly (readonly (Float64Array | null)[])[];
  /** Gas and steel at both ends of each store [K]. */
  readonly ends_K: readonly Record<StoreEnd, number>[];
  /** Mean of what left each store's bed in the last step [K]; of the bed's end before the first. */
  readonly left_K: number[];
}

/** End where the gas leaves. */
export const OUTLET: Readonly<Record<Direction, StoreEnd>> = {
  charge: 'discharge_inlet',
  discharge: 'charge_inlet',
};
const INLET: Readonly<Record<Direction, StoreEnd>> = {
  charge: 'charge_inlet',
  discharge: 'discharge_inlet',
};
/** Steel under a lid against the gas of the bed's end while standing [W/m2K]: common practice, no source. */
const STANDING_CONTACT_W_M2K = 10;

/** Arrays that marches of one model share. */
export function aheadWorks(model: AheadModel): BedWork[][] {
  return model.stores.map((s) => s.tubes.map((t) => createBedWork(t.enthalpy.length)));
}

/** Beds at the start of a march. */
export function startAhead(model: AheadModel): BedsAhead {
  const beds = model.stores.map((s) => s.tubes.map((t) => Float64Array.from(t.enthalpy)));
  const steels = model.stores.map((s) =>
    s.tubes.map((t) => (t.wall === undefined ? null : Float64Array.from(t.wall.steel_K))),
  );
  const ends_K = model.stores.map((s, i) => {
    const bed = beds[i] as Float64Array[];
    return {
      charge_inlet: Number.isFinite(s.plenum_K) ? s.plenum_K : endOfBed(s, bed, 'charge_inlet'),
      discharge_inlet: endOfBed(s, bed, 'discharge_inlet'),
    };
  });
  const left_K = model.stores.map((s, i) => endOfBed(s, beds[i] as Float64Array[], 'charge_inlet'));
  return { beds, steels, ends_K, left_K };
}

export function copyAhead(from: BedsAhead): BedsAhead {
  return {
    beds: from.beds.map((store) => store.map((bed) => bed.slice())),
    steels: from.steels.map((store) => store.map((steel) => steel?.slice() ?? null)),
    ends_K: from.ends_K.map((ends) => ({ ...ends })),
    left_K: [...from.left_K],
  };
}

/** Gas temperatures that the machine is given at the stores' outlets [K]. */
export function outletsOf(model: AheadModel, temperatures: readonly number[]): StoreTemperatures {
  const hot = model.stores.findIndex((s) => s.store.kind === 'hot');
  const cold = model.stores.findIndex((s) => s.store.kind === 'cold');
  return {
    hot_K: temperatures[hot] ?? Number.NaN,
    cold_K: cold < 0 ? null : (temperatures[cold] as number),
  };
}

/**
 * Metered flow [kg/s] that gives (or takes) a net power at the machine model's work per kilogram at
 * rated flow; Infinity where none does. Part load changes the work by a few per cent, so that each
 * turn of the loop gains two digits.
 */
export function flowFor(
  model: AheadModel,
  direction: Direction,
  power_W: number,
  work_J_kg: number,
  guess_kg_s: number,
): number {
  const work = work_J_kg * model.workFactor[direction];
  if (!(work > 0)) return Number.POSITIVE_INFINITY;
  const auxiliary = model.machine.auxiliary_running_W;
  const gross = direction === 'charge' ? power_W - auxiliary : power_W + auxiliary;
  if (!(gross > 0)) return 0;
  let flow = guess_kg_s > 0 ? guess_kg_s : gross / work;
  for (let i = 0; i < 4; i++) flow = gross / work / model.partLoad(direction, flow);
  return flow;
}

/** Net power [W] at the connection point that a flow gives or takes. */
export function powerOf(
  model: AheadModel,
  direction: Direction,
  flow_kg_s: number,
  work_J_kg: number,
): number {
  const work = work_J_kg * model.workFactor[direction] * model.partLoad(direction, flow_kg_s);
  const auxiliary = model.machine.auxiliary_running_W;
  return flow_kg_s * work + (direction === 'charge' ? auxiliary : -auxiliary);
}

/**
 * Moves all beds by a step, in place.
 *
 * @param flow_kg_s metered flow, at least 0; 0 = standing, `direction` then only names the outlet
 * @param inlets gas that the machine gives the stores [K]; not read while standing
 * @param works see `aheadWorks`
 */
export function stepAhead(
  model: AheadModel,
  ahead: BedsAhead,
  direction: Direction,
  flow_kg_s: number,
  inlets: StoreTemperatures,
  dt_s: number,
  works: readonly (readonly BedWork[])[],
): void {
  const sign = direction === 'charge' ? 1 : -1;
  model.stores.forEach((store, i) => {
    const beds = ahead.beds[i] as Float64Array[];
    const ends = ahead.ends_K[i] as Record<StoreEnd, number>;
    const inlet_K = store.store.kind === 'hot' ? inlets.hot_K : (inlets.cold_K as number);
    const left = stepStore(
      store,
      beds,
      ahead.steels[i] as (Float64Array | null)[],
      {
        flux: (sign * flow_kg_s) / store.store.bed.area_m2,
        inlet_K,
        ambient_K: model.ambient_K,
        dt_s,
      },
      works[i] as BedWork[],
    );
    if (flow_kg_s > 0) {
      ahead.left_K[i] = left;
      const out = OUTLET[direction];
      ends[out] = throughPlenum(store, ends[out], left, flow_kg_s, dt_s, out);
      const into = INLET[direction];
      ends[into] = throughPlenum(store, ends[into], inlet_K, flow_kg_s, dt_s, into);
      return;
    }
    for (const end of ['charge_inlet', 'discharge_inlet'] as const) {
      const { area_m2, end_capacity_J_K, end_loss_W_m2K, loss_factor } = store.store.bed;
      // The lid's steel stands between the bed and the weather.
      const loss = end_loss_W_m2K[end] * loss_factor;
      const both = STANDING_CONTACT_W_M2K + loss;
      const rate = (both * area_m2) / Math.max(1, end_capacity_J_K[end]);
      const bed = endOfBed(store, beds, end);
      const rest = (STANDING_CONTACT_W_M2K * bed + loss * model.ambient_K) / both;
      ends[end] = rest + (ends[end] - rest) * Math.exp(-rate * dt_s);
    }
    ahead.left_K[i] = endOfBed(store, beds, OUTLET[direction]);
  });
}

/** The greater pressure drop of the stores at a flow [Pa]; 0 where no limit is set. */
export function worstDrop(model: AheadModel, ahead: BedsAhead, flow_kg_s: number): number {
  if (model.unit.limits.pressure_drop_max_Pa === null) return 0;
  return greatestDrop(model.stores, ahead.beds, flow_kg_s);
}
