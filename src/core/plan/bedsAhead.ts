import { type BedWork, bedSubstep, createBedWork, planSubsteps } from '../bed/kernel.js';
import { pressureDrop } from '../bed/pressureDrop.js';
import { temperatureAt } from '../bed/tables.js';
import type { Direction, StoreEnd, UnitDefinition } from '../definitions.js';
import { throughPlenum } from '../dispatch/plenum.js';
import type { RolloutStore } from '../dispatch/rollout.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';
import { exchangeAtWall, shareAround } from '../track/wallZone.js';

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

/** Area-mean temperature of a bed's end [K]. */
export function endOfBed(
  store: RolloutStore,
  beds: readonly Float64Array[],
  end: StoreEnd,
): number {
  let sum = 0;
  store.tubes.forEach((tube, k) => {
    const bed = beds[k] as Float64Array;
    const cell = bed[end === 'charge_inlet' ? 0 : bed.length - 1] as number;
    sum += tube.area_share * temperatureAt(store.tables, cell);
  });
  return sum;
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
      model,
      store,
      beds,
      ahead.steels[i] as (Float64Array | null)[],
      { flux: (sign * flow_kg_s) / store.store.bed.area_m2, inlet_K, dt_s },
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
      const { area_m2, end_capacity_J_K } = store.store.bed;
      const rate = (STANDING_CONTACT_W_M2K * area_m2) / Math.max(1, end_capacity_J_K[end]);
      const bed = endOfBed(store, beds, end);
      ends[end] = bed + (ends[end] - bed) * Math.exp(-rate * dt_s);
    }
    ahead.left_K[i] = endOfBed(store, beds, OUTLET[direction]);
  });
}

interface StoreStep {
  /** Metered mass flux, + = charge [kg/m2s]. */
  readonly flux: number;
  readonly inlet_K: number;
  readonly dt_s: number;
}

/** Steps all streams of a store; returns the mixed outlet [K], NaN while standing. */
function stepStore(
  model: AheadModel,
  store: RolloutStore,
  beds: readonly Float64Array[],
  steels: readonly (Float64Array | null)[],
  { flux, inlet_K, dt_s }: StoreStep,
  works: readonly BedWork[],
): number {
  let heat = 0;
  let mass = 0;
  store.tubes.forEach((tube, k) => {
    const own = flux * tube.flowFactor;
    const work = works[k] as BedWork;
    const step = {
      massFlux_kg_m2s: own,
      inlet_K,
      ambient_K: model.ambient_K,
      dt_s,
      heatTransferFactor: tube.heatTransferFactor,
      wallLoss_W_m3K: tube.wallLoss_W_m3K,
    };
    const substeps = planSubsteps(store.tables, work.cells, step);
    const part = { ...step, dt_s: dt_s / substeps };
    let out = 0;
    for (let n = 0; n < substeps; n++) {
      bedSubstep(store.tables, beds[k] as Float64Array, part, work);
      out += work.outlet_K;
    }
    const steel = steels[k] ?? null;
    if (tube.wall !== undefined && steel !== null) {
      const wall = tube.wall.model;
      const beside = beds[wall.tube] as Float64Array;
      // The layers are the last streams, and this is the last of them.
      const layers = beds.slice(k + 1 - wall.layers.length, k + 1);
      const before = wall.ring.length > 1 ? beside.slice() : null;
      exchangeAtWall(wall, store.tables, layers, steel, beside, step);
      if (before !== null) {
        const all = beds.map((enthalpy) => ({ enthalpy }));
        shareAround(wall, all, before);
      }
    }
    const weight = tube.area_share * Math.abs(own);
    heat += weight * (out / substeps);
    mass += weight;
  });
  return mass > 0 ? heat / mass : Number.NaN;
}

/** The greater pressure drop of the stores at a flow [Pa]; 0 where no limit is set. */
export function worstDrop(model: AheadModel, ahead: BedsAhead, flow_kg_s: number): number {
  if (model.unit.limits.pressure_drop_max_Pa === null || !Number.isFinite(flow_kg_s)) return 0;
  let worst = 0;
  model.stores.forEach((store, i) => {
    const bed = ahead.beds[i]?.[0] as Float64Array;
    const profile = new Float64Array(16);
    for (let n = 0; n < 16; n++) {
      const cell = Math.floor(((n + 0.5) / 16) * bed.length);
      profile[n] = temperatureAt(store.tables, bed[cell] as number);
    }
    const drop = pressureDrop(store.store.bed, flow_kg_s / store.store.bed.area_m2, profile);
    worst = Math.max(worst, drop);
  });
  return worst;
}
