import type { Direction, StoreEnd, UnitDefinition } from '../definitions.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import type { Conditions } from '../track/conditions.js';
import type { UnitModel } from '../unitModel.js';
import { type EndSteel, passEnd } from './endSteel.js';

/** Sums over the scans of a bin. */
export interface Sums {
  dt_s: number;
  scans: number;
  timed: number;
  flow: number;
  ambient: number;
  inlet: number[];
  inletAll: boolean[];
  readings: Float64Array[];
  counts: Int32Array[];
  power: number;
  hot: number;
  cold: number;
}

/** Gas leaving the stores in either direction: as measured, else the reference of a settled plant. */
export function bothOutlets(model: UnitModel, scan: Scan): Record<Direction, StoreTemperatures> {
  const at = (kind: 'hot' | 'cold', end: StoreEnd): number | null => {
    const store = model.unit.stores.find((s) => s.kind === kind);
    if (store === undefined) return null;
    const channel = model.map.gas[store.id]?.[end] ?? -1;
    const read = channel < 0 ? Number.NaN : (scan.values[channel] as number);
    if (Number.isFinite(read)) return read;
    const charged = kind === 'hot' ? store.reference_hot_K : store.reference_cold_K;
    const empty = kind === 'hot' ? store.reference_cold_K : store.reference_hot_K;
    return end === 'charge_inlet' ? charged : empty;
  };
  const leaving = (end: StoreEnd): StoreTemperatures => ({
    hot_K: at('hot', end) ?? (at('cold', end) as number),
    cold_K: at('cold', end),
  });
  return { charge: leaving('discharge_inlet'), discharge: leaving('charge_inlet') };
}

/** Adds one scan to a bin's sums. */
export function addScan(
  model: UnitModel,
  ends: readonly EndSteel[],
  sums: Sums,
  scan: Scan,
  dt_s: number,
  conditions: Conditions,
  outlets: Record<Direction, StoreTemperatures>,
): void {
  sums.dt_s += dt_s;
  sums.scans++;
  sums.timed += sums.dt_s;
  sums.flow += conditions.flow_kg_s * dt_s;
  sums.ambient += conditions.ambient_K * dt_s;
  sums.power += conditions.power_W * dt_s;
  const direction: Direction = conditions.flow_kg_s >= 0 ? 'charge' : 'discharge';
  const leaving = measuredOutlets(model, scan, direction);
  sums.hot += leaving.hot_K * dt_s;
  sums.cold += (leaving.cold_K ?? 0) * dt_s;
  const inlets = enteringGas(
    model.unit,
    model.machine,
    direction,
    outlets[direction],
    conditions.ambient_K,
  );
  model.stores.forEach((store, s) => {
    const steel = ends[s] as EndSteel;
    if (conditions.flow_kg_s !== 0) {
      const read = gasAt(
        model,
        scan,
        s,
        direction === 'charge' ? 'charge_inlet' : 'discharge_inlet',
      );
      const known = Number.isFinite(read);
      const entering = known ? read : (inlets[s] as number);
      const out = gasAt(
        model,
        scan,
        s,
        direction === 'charge' ? 'discharge_inlet' : 'charge_inlet',
      );
      const into = passEnd(store, steel, direction, entering, out, conditions.flow_kg_s, dt_s);
      sums.inlet[s] = (sums.inlet[s] as number) + into * dt_s;
      if (!known) sums.inletAll[s] = false;
    }
    let n = 0;
    for (const row of store.channels) {
      for (const channel of row) {
        const value = scan.values[channel] as number;
        if (Number.isFinite(value)) {
          const readings = sums.readings[s] as Float64Array;
          const counts = sums.counts[s] as Int32Array;
          readings[n] = (readings[n] as number) + value;
          counts[n] = (counts[n] as number) + 1;
        }
        n++;
      }
    }
  });
}

function gasAt(model: UnitModel, scan: Scan, s: number, end: StoreEnd): number {
  const id = model.unit.stores[s]?.id ?? '';
  const channel = model.map.gas[id]?.[end] ?? -1;
  return channel < 0 ? Number.NaN : (scan.values[channel] as number);
}

function measuredOutlets(model: UnitModel, scan: Scan, direction: Direction): StoreTemperatures {
  const end = direction === 'charge' ? 'discharge_inlet' : 'charge_inlet';
  const of = (kind: 'hot' | 'cold') => {
    const s = model.unit.stores.findIndex((store) => store.kind === kind);
    return s < 0 ? null : gasAt(model, scan, s, end);
  };
  return { hot_K: of('hot') ?? Number.NaN, cold_K: of('cold') };
}

/** What the machine model would send into each store, where no thermometer tells [K]. */
function enteringGas(
  unit: UnitDefinition,
  machine: Machine,
  direction: Direction,
  outlets: StoreTemperatures,
  ambient_K: number,
): number[] {
  const { inlets } = machine.operate(direction, outlets, ambient_K);
  return unit.stores.map((store) =>
    store.kind === 'hot' ? inlets.hot_K : (inlets.cold_K ?? store.reference_cold_K),
  );
}

/** Sums of a bin that holds nothing yet. */
export function emptySums(model: UnitModel): Sums {
  const sensors = (s: number) =>
    (model.stores[s]?.channels ?? []).reduce((n, r) => n + r.length, 0);
  return {
    dt_s: 0,
    scans: 0,
    timed: 0,
    flow: 0,
    ambient: 0,
    inlet: model.stores.map(() => 0),
    inletAll: model.stores.map(() => true),
    readings: model.stores.map((_, s) => new Float64Array(sensors(s))),
    counts: model.stores.map((_, s) => new Int32Array(sensors(s))),
    power: 0,
    hot: 0,
    cold: 0,
  };
}
