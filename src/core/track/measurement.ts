import { temperatureAt } from '../bed/tables.js';
import { type GasGap, gasGap } from './gasGap.js';
import type { TubeLayout } from './layout.js';
import type { TubeGas, TubeModel, TubeState } from './tube.js';

/**
 * What a thermocouple of a tube should read, and the derivative with respect to the states:
 *
 *   z = T(x + e) - s D(x + e) + o + g
 *
 * T the rock's profile (straight between cell centres), D how far it is from the gas there
 * (`gasGap`), e the position error, s the net gas share, o the sensor's own offset, g the offset
 * common to its group. D depends on the rock upstream, on the gas that enters and on the lag
 * l = G cf/hv, which moves with the states of flow and transfer:
 *
 *   ln l = ln l_0 + (1 - d ln hv/d ln G) (flow - flow_0) - (transfer - transfer_0)
 *
 * from the states at which the bed was last moved. In an even slope far from the inlet s D is
 * s l dT/dx: a junction that sees the share s of the gas reads the rock at x - s l.
 */
export interface ReadingModel {
  value_K: number;
  /** dz/dT of each cell; zero but from `from` to `to`. */
  readonly weights: Float64Array;
  from: number;
  to: number;
  /** dz/dx at the junction [K/m]. */
  slope_K_m: number;
  /** Signed lag there [m]. */
  lag_m: number;
  /** D [K], what is left there of the entering gas (0..1), and dD/d ln l [K]. */
  readonly gap: GasGap;
  /** Derivatives with respect to ln flow factor and ln phi_h [K], and to the inlet's offset [-]. */
  perFlow_K: number;
  perTransfer_K: number;
  perInlet: number;
  /** White variance that the entering gas brings, where it is not measured [K2]. */
  inletVariance_K2: number;
}

/** A reading that nothing has been predicted for yet, of a tube of `cells` cells. */
export function emptyReading(cells: number): ReadingModel {
  return {
    value_K: 0,
    weights: new Float64Array(cells),
    from: 0,
    to: -1,
    slope_K_m: 0,
    lag_m: 0,
    gap: { gap_K: 0, perLnLag_K: 0, remainder: 0, from: 0, to: -1 },
    perFlow_K: 0,
    perTransfer_K: 0,
    perInlet: 0,
    inletVariance_K2: 0,
  };
}

/**
 * Predicted reading of sensor `sensor` of a tube, into `out`. In the level half cells at both ends
 * the slope is that of the next piece, so that a place there is as uncertain as its neighbours.
 *
 * @throws RangeError for a sensor that the string does not have
 */
export function predictReading(
  model: TubeModel,
  state: TubeState,
  sensor: number,
  out: ReadingModel,
): void {
  const { layout, tables } = model;
  const { further } = state;
  const { cells } = layout;
  const dx = tables.bed.length_m / cells;
  const thermocouple = model.string.thermocouples[sensor];
  if (thermocouple === undefined) throw new RangeError(`sensor ${sensor}: not in this string`);
  const x = thermocouple.position_m + (further[layout.position + sensor - cells] as number);
  const place = x / dx - 0.5;
  const cell = Math.min(cells - 2, Math.max(0, Math.floor(place)));
  const weight = Math.min(1, Math.max(0, place - cell));
  const a = temperatureAt(tables, state.enthalpy[cell] as number);
  const b = temperatureAt(tables, state.enthalpy[cell + 1] as number);
  const group = layout.groupOf[sensor] as number;
  const { weights } = out;
  weights.fill(0, out.from, out.to + 1);
  weights[cell] = 1 - weight;
  weights[cell + 1] = weight;
  out.from = cell;
  out.to = cell + 1;
  out.slope_K_m = (b - a) / dx;
  out.value_K =
    a +
    weight * (b - a) +
    (further[layout.offset + sensor - cells] as number) +
    (group >= 0 ? (further[layout.group + group - cells] as number) : 0);
  addGas(model, state, x, out);
}

/** The gas's part of a reading, -s D, and its derivatives. */
function addGas(model: TubeModel, state: TubeState, x: number, out: ReadingModel): void {
  const { layout, tables } = model;
  const { gas, further } = state;
  const near = Math.floor((x / tables.bed.length_m) * layout.cells);
  const before = state.gasLag_m[Math.min(layout.cells - 1, Math.max(0, near))] as number;
  const lag = gas === undefined || before === 0 ? before : before * lagFactor(gas, further, layout);
  const { gap } = out;
  out.lag_m = lag;
  if (gas === undefined || lag === 0) {
    gap.gap_K = 0;
    gap.perLnLag_K = 0;
    gap.remainder = 0;
    out.perFlow_K = 0;
    out.perTransfer_K = 0;
    out.perInlet = 0;
    out.inletVariance_K2 = 0;
    return;
  }
  const share = further[layout.share - layout.cells] as number;
  const offset = layout.inlet[lag > 0 ? 'charge_inlet' : 'discharge_inlet'];
  const inlet = gas.inlet_K + (further[offset - layout.cells] as number);
  gasGap(tables, state.enthalpy, x, lag, inlet, -share, out.weights, gap);
  out.from = Math.min(out.from, gap.from);
  out.to = Math.max(out.to, gap.to);
  out.value_K -= share * gap.gap_K;
  out.slope_K_m -= share * (out.slope_K_m - gap.gap_K / lag);
  out.perTransfer_K = share * gap.perLnLag_K;
  out.perFlow_K = -gas.flowSlope * out.perTransfer_K;
  out.perInlet = share * gap.remainder;
  out.inletVariance_K2 = (out.perInlet * gas.inletSigma_K) ** 2;
}

/**
 * v = P H' for one reading into `out` (length size), and H P H' returned [K2].
 */
export function projectReading(
  model: TubeModel,
  state: TubeState,
  sensor: number,
  reading: ReadingModel,
  out: Float64Array,
): number {
  const { layout } = model;
  const { size } = layout;
  const p = state.covariance;
  const rowOffset = (layout.offset + sensor) * size;
  const rowPosition = (layout.position + sensor) * size;
  const { weights, from, to, slope_K_m } = reading;
  const group = layout.groupOf[sensor] as number;
  out.fill(0);
  const [first, second] = [weightAt(reading, from), weightAt(reading, from + 1)];
  addRows(
    out,
    p,
    rowPosition,
    slope_K_m,
    rowOffset,
    1,
    from * size,
    first,
    from * size + size,
    second,
  );
  let i = from + 2;
  for (; i + 3 <= to; i += 4) {
    const row = i * size;
    const [a, b] = [weights[i] as number, weights[i + 1] as number];
    const [c, d] = [weights[i + 2] as number, weights[i + 3] as number];
    addRows(out, p, row, a, row + size, b, row + 2 * size, c, row + 3 * size, d);
  }
  // The last cells and the group; those that are not stand in with 0.
  if (i <= to || group >= 0) {
    const row = i * size;
    const [a, b, c] = [weightAt(reading, i), weightAt(reading, i + 1), weightAt(reading, i + 2)];
    const common = group >= 0 ? (layout.group + group) * size : rowOffset;
    addRows(out, p, row, a, row + size, b, row + 2 * size, c, common, group >= 0 ? 1 : 0);
  }
  if (reading.lag_m !== 0) {
    const { perFlow_K, perTransfer_K, perInlet } = reading;
    const [flow, transfer] = [layout.flow * size, layout.transfer * size];
    const [share, inlet] = [layout.share * size, inletOf(model, reading) * size];
    const gap = -reading.gap.gap_K;
    addRows(out, p, flow, perFlow_K, transfer, perTransfer_K, share, gap, inlet, perInlet);
  }
  return observe(model, sensor, reading, out);
}

/** dz/dT of a cell; 0 beyond those that the reading depends on. */
function weightAt({ weights, to }: ReadingModel, cell: number): number {
  return cell <= to ? (weights[cell] as number) : 0;
}

/** out <- out + a P_a + b P_b + c P_c + d P_d, four rows of P in one pass over `out`. */
function addRows(
  out: Float64Array,
  p: Float64Array,
  rowA: number,
  a: number,
  rowB: number,
  b: number,
  rowC: number,
  c: number,
  rowD: number,
  d: number,
): void {
  for (let j = 0; j < out.length; j++) {
    out[j] =
      (out[j] as number) +
      a * (p[rowA + j] as number) +
      b * (p[rowB + j] as number) +
      c * (p[rowC + j] as number) +
      d * (p[rowD + j] as number);
  }
}

/** l/l_0: how flow and transfer have moved since the bed was. */
function lagFactor(gas: TubeGas, further: Float64Array, layout: TubeLayout): number {
  const flow = (further[layout.flow - layout.cells] as number) - gas.flow;
  const transfer = (further[layout.transfer - layout.cells] as number) - gas.transfer;
  return Math.exp(gas.flowSlope * flow - transfer);
}

/** State of the offset of the gas that enters. */
function inletOf(model: TubeModel, reading: ReadingModel): number {
  return model.layout.inlet[reading.lag_m > 0 ? 'charge_inlet' : 'discharge_inlet'];
}

/** H x of one reading for a vector over all states. */
export function observe(
  model: TubeModel,
  sensor: number,
  reading: ReadingModel,
  vector: Float64Array,
): number {
  const { layout } = model;
  const { weights, to } = reading;
  const group = layout.groupOf[sensor] as number;
  let value =
    reading.slope_K_m * (vector[layout.position + sensor] as number) +
    (vector[layout.offset + sensor] as number) +
    (group >= 0 ? (vector[layout.group + group] as number) : 0);
  for (let i = reading.from; i <= to; i++) {
    value += (weights[i] as number) * (vector[i] as number);
  }
  if (reading.lag_m === 0) return value;
  return (
    value -
    reading.gap.gap_K * (vector[layout.share] as number) +
    reading.perFlow_K * (vector[layout.flow] as number) +
    reading.perTransfer_K * (vector[layout.transfer] as number) +
    reading.perInlet * (vector[inletOf(model, reading)] as number)
  );
}

/**
 * White variance of a reading [K2]: its noise, the straight line between cell centres, and what is
 * not known of gas that enters unmeasured.
 */
export function readingVariance(model: TubeModel, reading: ReadingModel): number {
  const dx = model.tables.bed.length_m / model.layout.cells;
  const noise = model.estimator.reading_sigma_K;
  const between = 0.05 * reading.slope_K_m * dx;
  return noise * noise + between * between + reading.inletVariance_K2;
}
