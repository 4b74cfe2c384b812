import { type BedWork, bedSubstep, planSubsteps } from '../bed/kernel.js';
import { pressureDrop } from '../bed/pressureDrop.js';
import { temperatureAt } from '../bed/tables.js';
import type { StoreEnd } from '../definitions.js';
import { exchangeAtWall } from '../track/wallExchange.js';
import { shareAround } from '../track/wallZone.js';
import type { RolloutStore } from './rollout.js';

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

/** What a store is stepped by. */
export interface StoreStep {
  /** Metered mass flux, + = charge [kg/m2s]. */
  readonly flux: number;
  readonly inlet_K: number;
  readonly ambient_K: number;
  readonly dt_s: number;
}

/**
 * Steps all streams of a store, in place.
 *
 * @param works arrays of each stream, see createBedWork
 * @returns the outlet mixed by flow [K], NaN while standing
 */
export function stepStore(
  store: RolloutStore,
  beds: readonly Float64Array[],
  steels: readonly (Float64Array | null)[],
  { flux, inlet_K, ambient_K, dt_s }: StoreStep,
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
      ambient_K,
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
      exchangeAtWall(wall, store.tables, layers, steel, beside, step, work.slopeFlow);
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

/** The greater pressure drop of the stores at a flow [Pa]; 0 for a flow that is not finite. */
export function greatestDrop(
  stores: readonly RolloutStore[],
  beds: readonly (readonly Float64Array[])[],
  flow_kg_s: number,
): number {
  if (!Number.isFinite(flow_kg_s)) return 0;
  let worst = 0;
  stores.forEach((store, i) => {
    const bed = beds[i]?.[0] as Float64Array;
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

/**
 * Flow at which the worse store drops the pressure allowed, at most `most_kg_s` [kg/s]. The drop is
 * a m + b m2 (Ergun), so the secant from the greatest flow settles within a few turns.
 *
 * @param limit_Pa null = none
 */
export function flowWithin(
  stores: readonly RolloutStore[],
  beds: readonly (readonly Float64Array[])[],
  limit_Pa: number | null,
  most_kg_s: number,
): number {
  if (limit_Pa === null || greatestDrop(stores, beds, most_kg_s) <= limit_Pa) return most_kg_s;
  let flow = most_kg_s;
  for (let i = 0; i < 30; i++) {
    const ratio = limit_Pa / greatestDrop(stores, beds, flow);
    if (Math.abs(ratio - 1) < 1e-6) break;
    // Between the root of a purely inertial and the ratio of a purely viscous drop.
    flow *= ratio ** 0.6;
  }
  return flow;
}
