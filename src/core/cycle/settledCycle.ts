import { type BedWork, createBedWork, stepBed, wallLossPerVolume } from '../bed/kernel.js';
import { pressureDrop } from '../bed/pressureDrop.js';
import { type BedTables, buildBedTables, enthalpyAt, temperatureAt } from '../bed/tables.js';
import type { Direction, Mode, StoreDefinition, UnitDefinition } from '../definitions.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';

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

/** One step of the last cycle, as it begins. */
export interface CycleStep {
  readonly mode: Mode;
  /** Metered flow, + = charge [kg/s]; 0 while standing. */
  readonly flow_kg_s: number;
  /** Gas entering each store, in the order of the unit's stores [K]. */
  readonly inlets_K: readonly number[];
  readonly outlets: StoreTemperatures;
  readonly dt_s: number;
  /** Enthalpy of each store's cells [J/m3 of bed]; the march's own arrays, to be copied. */
  readonly enthalpy: readonly Float64Array[];
}

/** How finely a cycle is marched, and who watches. */
export interface CycleOptions {
  readonly cells?: number;
  readonly step_s?: number;
  readonly stand_step_s?: number;
  /** Time stood after each charge and each discharge [s], from the hours run in the last cycle. */
  readonly stand_s?: (running_h: number) => number;
  /** Called for each step of the last cycle. */
  readonly each?: (step: CycleStep) => void;
}

interface March {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  readonly beds: readonly Bed[];
  readonly step_s: number;
  readonly stand_step_s: number;
  each: ((step: CycleStep) => void) | null;
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
 * with losses, steel and plenums left out; no standing between unless it is asked for. A charge
 * without a rule of its own ends where the outlet has gone half the way to the other reference.
 */
export function settledCycle(
  unit: UnitDefinition,
  machine: Machine,
  options: CycleOptions = {},
): SettledCycle {
  const { cells = 80, step_s = 60, stand_s = () => 0, each } = options;
  const { stand_step_s = step_s } = options;
  const beds = unit.stores.map((store) => startBed(store, cells));
  const march: March = { unit, machine, beds, step_s, stand_step_s, each: null };
  let stood_s = 0;
  let last: SettledCycle | null = null;
  for (let i = 0; i < CYCLES; i++) {
    if (i === CYCLES - 1) march.each = each ?? null;
    const charge = run(march, 'charge');
    stand(march, stood_s);
    const discharge = run(march, 'discharge');
    stand(march, stood_s);
    stood_s = stand_s(charge.hours + discharge.hours);
    last = { charge, discharge };
  }
  return last!;
}

/**
 * One charge at the greatest power or discharge at rated power, from beds as they are, to the rule
 * that ends it; `cells` follows from the beds.
 *
 * @param start enthalpy of each store's cells [J/m3 of bed], in the order of the unit's stores
 */
export function halfCycle(
  unit: UnitDefinition,
  machine: Machine,
  direction: Direction,
  start: readonly Float64Array[],
  options: Pick<CycleOptions, 'step_s' | 'each'> = {},
): HalfCycle {
  const { step_s = 60, each = null } = options;
  const beds = unit.stores.map((store, s): Bed => {
    const enthalpy = Float64Array.from(start[s] as Float64Array);
    return { ...startBed(store, enthalpy.length), enthalpy };
  });
  return run({ unit, machine, beds, step_s, stand_step_s: step_s, each }, direction);
}

function startBed(store: StoreDefinition, cells: number): Bed {
  const tables = buildBedTables(store.bed, store.reference_cold_K, store.reference_hot_K);
  const discharged = store.kind === 'hot' ? store.reference_cold_K : store.reference_hot_K;
  return {
    store,
    tables,
    work: createBedWork(cells),
    enthalpy: new Float64Array(cells).fill(enthalpyAt(tables, discharged)),
  };
}

/** Gas leaving a bed that has stood: in equilibrium with its last cell. */
function standingOutlet_K(bed: Bed, direction: Direction): number {
  const { enthalpy, tables } = bed;
  return temperatureAt(tables, enthalpy[direction === 'charge' ? enthalpy.length - 1 : 0]!);
}

function outletsOf(outlet: ReadonlyMap<string, number>): StoreTemperatures {
  return { hot_K: outlet.get('hot')!, cold_K: outlet.get('cold') ?? null };
}

function run(march: March, direction: Direction): HalfCycle {
  const { unit, machine, beds, step_s } = march;
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
    const outlets = outletsOf(outlet);
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
    energy_J += step_s * machine.powerForFlow(direction, flow, outlets, unit.ambient_K);
    const { inlets } = machine.operate(direction, outlets, unit.ambient_K);
    const inlets_K = beds.map((bed) => (bed.store.kind === 'hot' ? inlets.hot_K : inlets.cold_K!));
    const signed = (direction === 'charge' ? 1 : -1) * flow;
    step(march, { mode: direction, flow_kg_s: signed, inlets_K, outlets, dt_s: step_s });
    for (const bed of beds) outlet.set(bed.store.kind, bed.work.outlet_K);
    time_s += step_s;
  }
  return done('time');
}

function stand(march: March, stand_s: number): void {
  const { beds, stand_step_s } = march;
  const steps = Math.round(stand_s / stand_step_s);
  for (let n = 0; n < steps; n++) {
    const outlet = new Map(beds.map((bed) => [bed.store.kind, standingOutlet_K(bed, 'discharge')]));
    step(march, {
      mode: 'stand',
      flow_kg_s: 0,
      inlets_K: beds.map((bed) => outlet.get(bed.store.kind)!),
      outlets: outletsOf(outlet),
      dt_s: stand_step_s,
    });
  }
}

function step(march: March, now: Omit<CycleStep, 'enthalpy'>): void {
  const { beds, unit } = march;
  march.each?.({ ...now, enthalpy: beds.map((bed) => bed.enthalpy) });
  beds.forEach((bed, s) => {
    stepBed(
      bed.tables,
      bed.enthalpy,
      {
        massFlux_kg_m2s: now.flow_kg_s / bed.store.bed.area_m2,
        inlet_K: now.inlets_K[s]!,
        ambient_K: unit.ambient_K,
        dt_s: now.dt_s,
        heatTransferFactor: 1,
        wallLoss_W_m3K: wallLossPerVolume(bed.tables),
      },
      bed.work,
    );
  });
}

/** Pressure drop [Pa] at the bed's present temperatures, read at every eighth cell. */
function dropOf(bed: Bed, flow_kg_s: number): number {
  const profile: number[] = [];
  const { length } = bed.enthalpy;
  for (let i = 4; i < length; i += 8) profile.push(temperatureAt(bed.tables, bed.enthalpy[i]!));
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
