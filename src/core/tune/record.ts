import type { StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import { type ConditionsState, readConditions, startConditions } from '../track/conditions.js';
import { withoutImplausible } from '../track/plausible.js';
import type { UnitModel } from '../unitModel.js';
import { addScan, bothOutlets, emptySums, type Sums } from './binSums.js';
import { type EndSteel, startEndSteel } from './endSteel.js';

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

/** A thinned recording: bins of one stretch without a gap. */
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

/** Begins to thin a recording of a unit. */
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
  state.sums ??= emptySums(model);
  addScan(model, state.steel, state.sums, scan, dt_s, conditions, outlets);
  if (state.sums.dt_s >= (sign === 0 ? STANDING_BIN_S : BIN_S)) closeBin(state);
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
