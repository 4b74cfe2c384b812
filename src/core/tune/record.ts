import type { Direction, StoreEnd, UnitDefinition } from '../definitions.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import {
  type Conditions,
  type ConditionsState,
  readConditions,
  startConditions,
} from '../track/conditions.js';
import { withoutImplausible } from '../track/plausible.js';
import type { UnitModel } from '../unitModel.js';
import { type EndSteel, passEnd, startEndSteel } from './endSteel.js';

/** One interval of a thinned recording; every array is indexed by store, then as stated. */
export interface TuneBin {
  readonly end_ms: number;
  readonly dt_s: number;
  /** Mean metered flow, + = charge, 0 = standing [kg/s]. */
  readonly flow_kg_s: number;
  readonly ambient_K: number;
  /** Mean time of the bin's readings from its start, as a share of dt. */
  readonly middle: number;
  /** Counts the runs: one more at each start or turn of the flow. */
  readonly run: number;
  /** Gas entering the bed behind the end's steel, per store [K]; not to be read while standing. */
  readonly inlet_K: readonly number[];
  /** Whether it was measured. */
  readonly inletMeasured: readonly boolean[];
  /** Mean reading of each thermocouple, per store in the order of strings and sensors; NaN = none [K]. */
  readonly readings: readonly Float64Array[];
  /** For the machine: net power, gas leaving the stores; NaN where a part of the bin lacks them. */
  readonly power_W: number;
  readonly outlets: StoreTemperatures;
  /** Time since the flow last started or turned, at the bin's start [s]. */
  readonly since_s: number;
}

export interface TuneRecord {
  readonly bins: readonly TuneBin[];
  readonly from_ms: number;
  readonly to_ms: number;
  /** Stretches that gaps left, the longest of which this is, and the time in the others [s]. */
  readonly stretches: number;
  readonly leftOut_s: number;
}

/** Length of a bin [s]: a front moves some 4 cm meanwhile, a tenth of its width. */
const BIN_S = 300;
/** The same while standing, when nothing is quick [s]. */
const STANDING_BIN_S = 900;
/** A front that moved for this long without a known flow stands nobody knows where [s]. */
const GAP_S = 900;

interface Sums {
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

/** Thins a recording while it is read: scans in, bins out. */
export interface Thinning {
  readonly model: UnitModel;
  readonly conditions: ConditionsState;
  readonly steel: EndSteel[];
  time_ms: number | null;
  sums: Sums | null;
  sign: number;
  running: number;
  run: number;
  since_s: number;
  scans: number;
  flowing_s: number;
  bins: TuneBin[];
  readonly done: TuneBin[][];
}

export function startThinning(model: UnitModel): Thinning {
  return {
    model,
    conditions: startConditions(),
    steel: model.stores.map(startEndSteel),
    time_ms: null,
    sums: null,
    sign: 0,
    running: 0,
    run: 0,
    since_s: 0,
    scans: 0,
    flowing_s: 0,
    bins: [],
    done: [],
  };
}

/** Takes one scan in; scans come in the order of time. */
export function thin(state: Thinning, raw: Scan): void {
  const { model } = state;
  const { scan } = withoutImplausible(model.ranges, raw);
  const dt_s = state.time_ms === null ? 0 : (scan.time_ms - state.time_ms) / 1000;
  state.time_ms = scan.time_ms;
  state.scans++;
  const outlets = bothOutlets(model, scan);
  const conditions = readConditions(
    model.unit,
    model.map,
    model.machine,
    state.conditions,
    scan,
    dt_s,
    outlets,
  );
  if (dt_s <= 0) return;
  const gap = dt_s > GAP_S || !conditions.flowKnown || conditions.flowStandIn;
  if (gap) {
    closeBin(state);
    // A meter that is silent for a scan or two is held; longer, and the way of the front is unknown.
    endStretch(state);
    return;
  }
  const sign = Math.sign(conditions.flow_kg_s);
  if (sign !== state.sign) {
    closeBin(state);
    if (sign !== 0 && sign !== state.running) {
      state.run++;
      state.running = sign;
    }
    state.sign = sign;
    state.since_s = 0;
  }
  if (sign !== 0) state.flowing_s += dt_s;
  add(state, scan, dt_s, conditions, outlets);
  if ((state.sums as Sums).dt_s >= (sign === 0 ? STANDING_BIN_S : BIN_S)) closeBin(state);
}

/** The longest stretch without a gap. */
export function finishThinning(state: Thinning): TuneRecord {
  closeBin(state);
  endStretch(state);
  const length = (bins: readonly TuneBin[]) => bins.reduce((sum, b) => sum + b.dt_s, 0);
  const longest = state.done.reduce<TuneBin[]>(
    (best, bins) => (length(bins) > length(best) ? bins : best),
    [],
  );
  const all = state.done.reduce((sum, bins) => sum + length(bins), 0);
  const first = longest[0];
  const last = longest[longest.length - 1];
  return {
    bins: longest,
    from_ms: first === undefined ? Number.NaN : first.end_ms - first.dt_s * 1000,
    to_ms: last?.end_ms ?? Number.NaN,
    stretches: state.done.length,
    leftOut_s: all - length(longest),
  };
}

function endStretch(state: Thinning): void {
  if (state.bins.length > 0) state.done.push(state.bins);
  state.bins = [];
  state.sign = 0;
  state.running = 0;
  state.since_s = 0;
}

/** Gas leaving the stores in either direction: as measured, else the reference of a settled plant. */
function bothOutlets(model: UnitModel, scan: Scan): Record<Direction, StoreTemperatures> {
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

function add(
  state: Thinning,
  scan: Scan,
  dt_s: number,
  conditions: Conditions,
  outlets: Record<Direction, StoreTemperatures>,
): void {
  const { model } = state;
  state.sums ??= emptySums(model);
  const sums = state.sums;
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
    const steel = state.steel[s] as EndSteel;
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

function emptySums(model: UnitModel): Sums {
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

function closeBin(state: Thinning): void {
  const { sums } = state;
  if (sums === null || sums.dt_s <= 0) return;
  const { dt_s } = sums;
  const twoStores = state.model.unit.stores.some((store) => store.kind === 'cold');
  state.bins.push({
    end_ms: state.time_ms as number,
    dt_s,
    flow_kg_s: sums.flow / dt_s,
    ambient_K: sums.ambient / dt_s,
    middle: sums.timed / sums.scans / dt_s,
    run: state.run,
    inlet_K: sums.inlet.map((sum) => sum / dt_s),
    inletMeasured: sums.inletAll,
    readings: sums.readings.map((row, s) =>
      row.map((sum, n) => {
        const count = (sums.counts[s] as Int32Array)[n] as number;
        return count > 0 ? sum / count : Number.NaN;
      }),
    ),
    power_W: sums.power / dt_s,
    outlets: { hot_K: sums.hot / dt_s, cold_K: twoStores ? sums.cold / dt_s : null },
    since_s: state.since_s,
  });
  state.since_s += dt_s;
  state.sums = null;
}
