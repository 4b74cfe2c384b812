import { type BedWork, createBedWork, stepBed, wallLossPerVolume } from '../../core/bed/kernel.js';
import { pressureDrop } from '../../core/bed/pressureDrop.js';
import {
  type BedTables,
  buildBedTables,
  enthalpyAt,
  temperatureAt,
} from '../../core/bed/tables.js';
import type { Direction, StoreDefinition, UnitDefinition } from '../../core/definitions.js';
import type { Machine, StoreTemperatures } from '../../core/machine/machine.js';

const CELLS = 80;
const STEP_S = 60;
const HOUR_S = 3600;
/** A healthy plant settles into its cycle within a few; the change is then below a percent. */
const CYCLES = 5;
/** Nothing that is sold by the hour runs for a fortnight. */
const MOST_H = 336;

export const HALF_ENDS = [
  'hot_outlet',
  'cold_outlet',
  'flow',
  'pressure_drop',
  'empty',
  'time',
] as const;
export type HalfEnd = (typeof HALF_ENDS)[number];

/** One charge or discharge at constant power. */
export interface HalfCycle {
  readonly hours: number;
  readonly energy_MWh_el: number;
  readonly ends_by: HalfEnd;
}

export interface SettledCycle {
  readonly charge: HalfCycle;
  readonly discharge: HalfCycle;
}

/** Power of a direction in the facts: a charge takes what it may, a discharge gives what is sold. */
export function cyclePower_W(unit: UnitDefinition, direction: Direction): number {
  return direction === 'charge' ? unit.limits.charge.power_max_W : unit.rated_power_W;
}

interface Bed {
  readonly store: StoreDefinition;
  readonly tables: BedTables;
  readonly work: BedWork;
  readonly enthalpy: Float64Array;
}

/**
 * Charges at the greatest power and discharges at rated power, with the models of the beds and the
 * machine, from limit to limit until the cycle repeats itself; gives the last one. One tube per store,
 * with losses, no standing between, steel and plenums left out. A charge without a rule of its
 * own ends where the outlet has gone half the way to the other reference.
 */
export function settledCycle(unit: UnitDefinition, machine: Machine): SettledCycle {
  const beds = unit.stores.map(startBed);
  let last: SettledCycle | null = null;
  for (let i = 0; i < CYCLES; i++) {
    last = {
      charge: run(unit, machine, beds, 'charge'),
      discharge: run(unit, machine, beds, 'discharge'),
    };
  }
  return last!;
}

function startBed(store: StoreDefinition): Bed {
  const tables = buildBedTables(store.bed, store.reference_cold_K, store.reference_hot_K);
  const discharged = store.kind === 'hot' ? store.reference_cold_K : store.reference_hot_K;
  return {
    store,
    tables,
    work: createBedWork(CELLS),
    enthalpy: new Float64Array(CELLS).fill(enthalpyAt(tables, discharged)),
  };
}

/** Gas leaving a bed that has stood: in equilibrium with its last cell. */
function standingOutlet_K(bed: Bed, direction: Direction): number {
  return temperatureAt(bed.tables, bed.enthalpy[direction === 'charge' ? CELLS - 1 : 0]!);
}

function run(
  unit: UnitDefinition,
  machine: Machine,
  beds: readonly Bed[],
  direction: Direction,
): HalfCycle {
  const range = unit.limits[direction];
  const power_W = cyclePower_W(unit, direction);
  const outlet = new Map(beds.map((bed) => [bed.store.kind, standingOutlet_K(bed, direction)]));
  let energy_J = 0;
  let time_s = 0;
  const done = (ends_by: HalfEnd): HalfCycle => ({
    hours: time_s / HOUR_S,
    energy_MWh_el: energy_J / 3.6e9,
    ends_by,
  });
  while (time_s < MOST_H * HOUR_S) {
    const outlets: StoreTemperatures = {
      hot_K: outlet.get('hot')!,
      cold_K: outlet.get('cold') ?? null,
    };
    const stopped = stopRule(unit, beds, direction, outlets);
    if (stopped !== null) return done(stopped);
    const answer = machine.flowForPower(direction, power_W, outlets, unit.ambient_K);
    if ('reason' in answer) return done('empty');
    // A charge may go on with less power; a discharge owes what was asked.
    if (direction === 'discharge' && answer.flow_kg_s > range.flow_max_kg_s) return done('flow');
    const flow = Math.min(Math.max(answer.flow_kg_s, range.flow_min_kg_s), range.flow_max_kg_s);
    const limit = unit.limits.pressure_drop_max_Pa;
    if (limit !== null && beds.some((bed) => dropOf(bed, flow) > limit))
      return done('pressure_drop');
    energy_J += STEP_S * machine.powerForFlow(direction, flow, outlets, unit.ambient_K);
    const { inlets } = machine.operate(direction, outlets, unit.ambient_K);
    for (const bed of beds) {
      const inlet_K = bed.store.kind === 'hot' ? inlets.hot_K : inlets.cold_K!;
      stepBed(
        bed.tables,
        bed.enthalpy,
        {
          massFlux_kg_m2s: ((direction === 'charge' ? 1 : -1) * flow) / bed.store.bed.area_m2,
          inlet_K,
          ambient_K: unit.ambient_K,
          dt_s: STEP_S,
          heatTransferFactor: 1,
          wallLoss_W_m3K: wallLossPerVolume(bed.tables),
        },
        bed.work,
      );
      outlet.set(bed.store.kind, bed.work.outlet_K);
    }
    time_s += STEP_S;
  }
  return done('time');
}

/** Pressure drop [Pa] at the bed's present temperatures, read at every eighth cell. */
function dropOf(bed: Bed, flow_kg_s: number): number {
  const profile: number[] = [];
  for (let i = 4; i < CELLS; i += 8) profile.push(temperatureAt(bed.tables, bed.enthalpy[i]!));
  return pressureDrop(bed.store.bed, flow_kg_s / bed.store.bed.area_m2, profile);
}

function stopRule(
  unit: UnitDefinition,
  beds: readonly Bed[],
  direction: Direction,
  outlets: StoreTemperatures,
): HalfEnd | null {
  const { limits } = unit;
  const half = (kind: 'hot' | 'cold') => {
    const store = beds.find((bed) => bed.store.kind === kind)?.store;
    return store === undefined ? null : (store.reference_hot_K + store.reference_cold_K) / 2;
  };
  const { hot_K, cold_K } = outlets;
  if (direction === 'discharge') {
    const hotMin =
      limits.hot_outlet_min_K ?? (limits.cold_outlet_max_K === null ? half('hot') : null);
    if (hotMin !== null && hot_K < hotMin) return 'hot_outlet';
    const coldMax = limits.cold_outlet_max_K;
    if (coldMax !== null && cold_K !== null && cold_K > coldMax) return 'cold_outlet';
    return null;
  }
  const hotMax = limits.charge_hot_outlet_max_K ?? half('hot');
  if (hotMax !== null && hot_K > hotMax) return 'hot_outlet';
  const coldMin = limits.charge_cold_outlet_min_K ?? half('cold');
  if (coldMin !== null && cold_K !== null && cold_K < coldMin) return 'cold_outlet';
  return null;
}
