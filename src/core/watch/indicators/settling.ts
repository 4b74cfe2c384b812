import { createBedWork, stepBed } from '../../bed/kernel.js';
import { temperatureAt } from '../../bed/tables.js';
import type { SensorVerdict } from '../../estimate.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { Indicator, IndicatorInput, IndicatorsDefinition } from '../indicator.js';
import { decisionAt, type SequentialValue, stepSequential } from '../sequential.js';
import { followEntry, UNCOVERED } from './settlingEntry.js';
import { type Level, restart, startLevel, type Top, topEnd } from './settlingLevel.js';
import { APART_K, settlingView } from './settlingView.js';
import { remembered, stampOf } from './shown.js';

/** Junctions and gas settle first; then means over this long are compared [s]. */
const SETTLE_S = 600;
const MEAN_S = 600;
/**
 * One sigma of how far a reading's change is from that of gas or rock: thermowells of up to 3 min while
 * the gas cools by 0.2 K a minute, noise, what the model makes wrong of rock near the lid [K].
 */
const CHANGE_K = 0.8;
/** Rock near the lid loses as much more or less than modelled as insulation does; so, of its own change. */
const ROCK_SHARE = 0.7;
/** Later in a rest both cool together, and what they part by takes hours: no value of that [s]. */
const PAIR_S = 5400;
/** Share of the gas's movement that a covered junction just below the surface may show. */
const COVERED = 0.2;
const SHARE_SIGMA = 0.15;

/** Readings of these tell of no place at all; `offset` and `drifting` are what hanging in gas is taken for. */
const NO_PLACE: readonly (SensorVerdict | null)[] = [
  'open',
  'burst',
  'stuck',
  'reversed',
  'swapped',
  'wrong_type',
  'outlier',
];

export interface SettlingState {
  readonly stores: Level[];
}

/**
 * How far the bed has sunk, by thermocouples that hang in gas. While the unit stands, the gas under the
 * lid cools or warms with the lid's steel, by 10 K and more in a hot store, and the rock below hardly at
 * all. Whenever gas and rock have moved apart by 5 K, the share
 *
 *   s = (reading's change - rock's change) / (gas's change - rock's change)
 *
 * is one value of each topmost thermocouple's test: about 0 in rock, 1 in gas. Constant offsets cancel.
 * How quickly they follow gas that begins to enter there is another one (see followEntry).
 * Thermocouples that the judgement calls `uncovered` count as well.
 */
export const SETTLING: Indicator<SettlingState> = {
  kind: 'settling',
  start: (model) => ({ stores: model.stores.map(startLevel) }),
  step(state, rule, watching, input) {
    return input.model.stores.map((store, s) => {
      const level = state.stores[s] as Level;
      const gas = gasAbove(store, input);
      if (gas >= 0) follow(level, store, s, gas, watching, input);
      const own = input.state.stores[s] as StoreState;
      const bare = own.sensors.flat().filter(({ verdict }) => verdict === 'uncovered').length;
      const tests = level.tops.map(({ followed }) => followed.test.count).join();
      const stamp = `${stampOf(level.whole)} ${tests} ${bare} ${rule.limit}`;
      return remembered(level, stamp, () => settlingView(level, store, own, gas, rule));
    });
  },
};

/** Channel of the gas above the bed, -1 = none. */
const gasAbove = (store: StoreModel, { model }: IndicatorInput): number =>
  model.map.gas[store.store.id]?.[topEnd(store)] ?? -1;

function follow(
  level: Level,
  model: StoreModel,
  s: number,
  gas: number,
  watching: IndicatorsDefinition,
  input: IndicatorInput,
): void {
  const { state, taken, dt_s, time_ms } = input;
  const { conditions, scan } = taken;
  const store = state.stores[s] as StoreState;
  const stands = conditions.mode === 'stand' && conditions.flow_kg_s === 0 && conditions.flowKnown;
  const read = scan.values[gas] as number;
  if (store.started && dt_s <= MEAN_S) enter(level, model, store, read, watching, input);
  if (!stands || !store.started || dt_s > MEAN_S) {
    if (level.stood_s > 0) restart(level);
    return;
  }
  level.stood_s += dt_s;
  if (level.stood_s < SETTLE_S) return;
  level.beds ??= store.tubes.map(({ enthalpy }) => enthalpy.slice());
  level.mean_s += dt_s;
  if (Number.isFinite(read)) {
    level.scans++;
    level.gas_K += read;
    for (const top of level.tops) {
      const own = readingOf(model, store, scan.values, top);
      if (!Number.isFinite(own)) continue;
      top.sum_K += own;
      top.count++;
    }
  }
  if (level.mean_s < MEAN_S) return;
  standTubes(level.beds, model, conditions.ambient_K, level.mean_s);
  if (level.scans > 0) compare(level, model, watching, time_ms);
  level.mean_s = 0;
  level.scans = 0;
  level.gas_K = 0;
  for (const top of level.tops) Object.assign(top, { sum_K: 0, count: 0 });
}

/** Reading of a thermocouple [K]; NaN where there is none, or it is no temperature of where it hangs. */
function readingOf(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  { tube, sensor }: Pick<Top, 'tube' | 'sensor'>,
): number {
  const verdict = state.sensors[tube]?.[sensor]?.verdict ?? null;
  if (NO_PLACE.includes(verdict)) return Number.NaN;
  return values[model.channels[tube]?.[sensor] as number] as number;
}

/** Gas that begins to enter at the top. */
function enter(
  level: Level,
  model: StoreModel,
  store: StoreState,
  gas_K: number,
  { in_control_d }: IndicatorsDefinition,
  { taken, dt_s, time_ms }: IndicatorInput,
): void {
  const { conditions, scan } = taken;
  const atTop = conditions.flow_kg_s > 0 === (model.store.charge_inlet_at === 'top');
  const leaps = followEntry(level.entry, model, store, level.tops, {
    gas_K,
    read_K: level.tops.map((top) => readingOf(model, store, scan.values, top)),
    massFlux_kg_m2s: atTop ? conditions.flow_kg_s / model.store.bed.area_m2 : 0,
    ambient_K: conditions.ambient_K,
    dt_s,
  });
  leaps.forEach((leap, i) => {
    if (leap === null) return;
    const { value, sigma, covered } = leap;
    const tested = { value, sigma, healthy: covered, degraded: UNCOVERED };
    take(level, level.tops[i] as Top, tested, in_control_d, time_ms);
  });
}

function compare(
  level: Level,
  model: StoreModel,
  { in_control_d }: IndicatorsDefinition,
  time_ms: number,
): void {
  const gas_K = level.gas_K / level.scans;
  for (const top of level.tops) {
    const now = {
      stood_s: level.stood_s,
      read_K: top.sum_K / top.count,
      gas_K,
      rock_K: rockAt(level.beds as Float64Array[], model, top),
    };
    if (!Number.isFinite(now.read_K)) continue;
    const { from } = top;
    top.from ??= now;
    if (from === null) continue;
    const rocks = now.rock_K - from.rock_K;
    const apart = gas_K - from.gas_K - rocks;
    const old = now.stood_s - from.stood_s > PAIR_S;
    if (Math.abs(apart) < APART_K && !old) continue;
    top.from = now;
    if (old) continue;
    const value = (now.read_K - from.read_K - rocks) / apart;
    const sigma = Math.hypot(CHANGE_K / apart, (ROCK_SHARE * rocks) / apart, SHARE_SIGMA);
    const tested = { value, sigma, healthy: COVERED, degraded: 1 };
    take(level, top, tested, in_control_d, time_ms);
  }
}

/** Hands a value to the test of its thermocouple and, of a topmost one, to that of the whole bed. */
function take(
  { whole, tops }: Level,
  { first, followed }: Top,
  tested: SequentialValue,
  in_control_d: number,
  time_ms: number,
): void {
  const { value, sigma } = tested;
  // One test for each, and that of the whole, which takes as many values as there are topmost ones.
  const count = tops.length + tops.filter((top) => top.first).length;
  for (const one of first ? [followed, whole] : [followed]) {
    one.decision = decisionAt(in_control_d, 6 * MEAN_S, count);
    stepSequential(one.test, tested, one.decision);
    Object.assign(one, { value, sigma, time_ms });
  }
}

/** Tubes that stand, each by itself, over `dt_s`. */
function standTubes(
  beds: readonly Float64Array[],
  { tubes, tables }: StoreModel,
  ambient_K: number,
  dt_s: number,
): void {
  tubes.forEach(({ wallLoss_W_m3K }, k) => {
    const bed = beds[k] as Float64Array;
    const step = {
      ...{ massFlux_kg_m2s: 0, inlet_K: ambient_K, ambient_K, dt_s },
      ...{ heatTransferFactor: 1, wallLoss_W_m3K },
    };
    stepBed(tables, bed, step, createBedWork(bed.length));
  });
}

/** Rock at a thermocouple [K]. */
function rockAt(beds: readonly Float64Array[], model: StoreModel, { tube, sensor }: Top): number {
  const { layout, string } = model.tubes[tube] as StoreModel['tubes'][number];
  const share = (string.thermocouples[sensor]?.position_m ?? 0) / model.store.bed.length_m;
  const cell = Math.min(layout.cells - 1, Math.max(0, Math.floor(share * layout.cells)));
  return temperatureAt(model.tables, (beds[tube] as Float64Array)[cell] as number);
}
