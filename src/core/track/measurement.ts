import { enthalpyNear, temperatureAt } from '../bed/tables.js';
import type { TubeModel, TubeState } from './tube.js';

/**
 * What a thermocouple of a tube should read, and the derivative with respect to the states:
 *
 *   z = T(x + e - s l) + o + g
 *
 * T the rock's profile (straight between cell centres), e the position error, s the net gas share,
 * l the signed gas-to-rock lag G cf/hv: gas at x has the temperature of the rock at x - l, so a
 * junction that sees the share s of it reads, to first order, the rock at x - s l. o the sensor's
 * own offset, g the offset common to its group.
 */
export interface ReadingModel {
  value_K: number;
  /** Cells of the interpolation; the weight of `cell + 1` is `weight`. */
  cell: number;
  weight: number;
  /** dT/dx at the junction [K/m]. */
  slope_K_m: number;
  /** Signed lag there [m]. */
  lag_m: number;
}

/** Predicted reading of sensor `sensor` of a tube, into `out`. */
export function predictReading(
  model: TubeModel,
  state: TubeState,
  sensor: number,
  out: ReadingModel,
): void {
  const { layout, tables } = model;
  const further = state.further;
  const cells = layout.cells;
  const dx = tables.bed.length_m / cells;
  const thermocouple = model.string.thermocouples[sensor];
  if (thermocouple === undefined) throw new RangeError(`sensor ${sensor}: not in this string`);
  const x = thermocouple.position_m + (further[layout.position + sensor - cells] as number);
  const near = Math.min(cells - 1, Math.max(0, Math.floor(x / dx)));
  const lag = state.gasLag_m[near] as number;
  const share = further[layout.share - cells] as number;
  const place = (x - share * lag) / dx - 0.5;
  const cell = Math.min(cells - 2, Math.max(0, Math.floor(place)));
  const weight = Math.min(1, Math.max(0, place - cell));
  const a = temperatureAt(tables, state.enthalpy[cell] as number);
  const b = temperatureAt(tables, state.enthalpy[cell + 1] as number);
  const group = layout.groupOf[sensor] as number;
  out.cell = cell;
  out.weight = weight;
  out.slope_K_m = (b - a) / dx;
  out.lag_m = lag;
  out.value_K =
    a +
    weight * (b - a) +
    (further[layout.offset + sensor - cells] as number) +
    (group >= 0 ? (further[layout.group + group - cells] as number) : 0);
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
  const rowA = reading.cell * size;
  const rowB = rowA + size;
  const rowShare = layout.share * size;
  const rowOffset = (layout.offset + sensor) * size;
  const rowPosition = (layout.position + sensor) * size;
  const group = layout.groupOf[sensor] as number;
  const wA = 1 - reading.weight;
  const wB = reading.weight;
  const wShare = -reading.lag_m * reading.slope_K_m;
  const slope = reading.slope_K_m;
  for (let j = 0; j < size; j++) {
    out[j] =
      wA * (p[rowA + j] as number) +
      wB * (p[rowB + j] as number) +
      wShare * (p[rowShare + j] as number) +
      slope * (p[rowPosition + j] as number) +
      (p[rowOffset + j] as number);
  }
  if (group >= 0) {
    const row = (layout.group + group) * size;
    for (let j = 0; j < size; j++) out[j] = (out[j] as number) + (p[row + j] as number);
  }
  return observe(model, sensor, reading, out);
}

/** H x of one reading for a vector over all states. */
export function observe(
  model: TubeModel,
  sensor: number,
  reading: ReadingModel,
  vector: Float64Array,
): number {
  const { layout } = model;
  const group = layout.groupOf[sensor] as number;
  return (
    (1 - reading.weight) * (vector[reading.cell] as number) +
    reading.weight * (vector[reading.cell + 1] as number) -
    reading.lag_m * reading.slope_K_m * (vector[layout.share] as number) +
    reading.slope_K_m * (vector[layout.position + sensor] as number) +
    (vector[layout.offset + sensor] as number) +
    (group >= 0 ? (vector[layout.group + group] as number) : 0)
  );
}

/** White variance of a reading [K2]: its noise, and the straight line between cell centres. */
export function readingVariance(model: TubeModel, reading: ReadingModel): number {
  const dx = model.tables.bed.length_m / model.layout.cells;
  const noise = model.estimator.reading_sigma_K;
  const between = 0.05 * reading.slope_K_m * dx;
  return noise * noise + between * between;
}

/** A reading that is to be taken in: v = P H' as `projectReading` left it. */
export interface AcceptedReading {
  readonly sensor: number;
  readonly reading: ReadingModel;
  readonly v: Float64Array;
  readonly innovation_K: number;
  /** Variance R of the reading's own error [K2]. */
  readonly variance_K2: number;
}

/**
 * Kalman update with all accepted readings of a scan at once, linearised at the prediction:
 *
 *   S = H P H' + R = L L',  W = V L'^-1,  P <- P - W W',  x <- x + V S^-1 (z - h)
 *
 * with V = P H' and L the Cholesky factor: symmetric to the bit, no inverse, and the same as taking
 * the readings one after another. Temperatures move as enthalpy of the cell's table segment.
 */
export function applyReadings(
  model: TubeModel,
  state: TubeState,
  accepted: readonly AcceptedReading[],
  scratchTemperature: Float64Array,
): void {
  const { layout, tables } = model;
  const { size, cells } = layout;
  const m = accepted.length;
  if (m === 0) return;
  const factor = innovationFactor(model, accepted);
  const weights = solveNormal(factor, m, accepted);
  for (let i = 0; i < cells; i++) {
    scratchTemperature[i] = temperatureAt(tables, state.enthalpy[i] as number);
  }
  for (let a = 0; a < m; a++) {
    const { v } = accepted[a] as AcceptedReading;
    const weight = weights[a] as number;
    for (let i = 0; i < cells; i++) {
      scratchTemperature[i] = (scratchTemperature[i] as number) + (v[i] as number) * weight;
    }
    for (let i = cells; i < size; i++) {
      state.further[i - cells] = (state.further[i - cells] as number) + (v[i] as number) * weight;
    }
  }
  moveTo(model, state, scratchTemperature);
  subtractOuter(state.covariance, forwardSolve(factor, m, size, accepted), size, m);
}

/** W' = L^-1 V', one row of all states per reading: forward substitution. */
function forwardSolve(
  factor: Float64Array,
  m: number,
  size: number,
  accepted: readonly AcceptedReading[],
): Float64Array {
  const w = new Float64Array(m * size);
  for (let a = 0; a < m; a++) {
    const row = w.subarray(a * size, (a + 1) * size);
    row.set((accepted[a] as AcceptedReading).v);
    let b = 0;
    // Four rows at a time: what is left of this one is read and written once for all four.
    for (; b + 4 <= a; b += 4) {
      const l0 = factor[a * m + b] as number;
      const l1 = factor[a * m + b + 1] as number;
      const l2 = factor[a * m + b + 2] as number;
      const l3 = factor[a * m + b + 3] as number;
      const r0 = b * size;
      const r1 = r0 + size;
      const r2 = r1 + size;
      const r3 = r2 + size;
      for (let i = 0; i < size; i++) {
        row[i] =
          (row[i] as number) -
          l0 * (w[r0 + i] as number) -
          l1 * (w[r1 + i] as number) -
          l2 * (w[r2 + i] as number) -
          l3 * (w[r3 + i] as number);
      }
    }
    for (; b < a; b++) {
      const l = factor[a * m + b] as number;
      const other = b * size;
      for (let i = 0; i < size; i++) row[i] = (row[i] as number) - l * (w[other + i] as number);
    }
    const own = factor[a * m + a] as number;
    for (let i = 0; i < size; i++) row[i] = (row[i] as number) / own;
  }
  return w;
}

/**
 * P <- P - W W', upper triangle computed, lower mirrored, in tiles of two rows by four columns: eight
 * sums that do not wait for one another. A tile that reaches beyond the end does its last row or
 * columns more than once, from the same P: all are read before any is written.
 */
function subtractOuter(p: Float64Array, w: Float64Array, size: number, m: number): void {
  const last = size - 1;
  const end = m * size;
  for (let i0 = 0; i0 < size; i0 += 2) {
    const i1 = Math.min(i0 + 1, last);
    const r0 = i0 * size;
    const r1 = i1 * size;
    for (let j0 = i0; j0 < size; j0 += 4) {
      const j1 = Math.min(j0 + 1, last);
      const j2 = Math.min(j0 + 2, last);
      const j3 = Math.min(j0 + 3, last);
      let s00 = 0;
      let s01 = 0;
      let s02 = 0;
      let s03 = 0;
      let s10 = 0;
      let s11 = 0;
      let s12 = 0;
      let s13 = 0;
      for (let a = 0; a < end; a += size) {
        const x0 = w[a + i0] as number;
        const x1 = w[a + i1] as number;
        const y0 = w[a + j0] as number;
        const y1 = w[a + j1] as number;
        const y2 = w[a + j2] as number;
        const y3 = w[a + j3] as number;
        s00 += x0 * y0;
        s01 += x0 * y1;
        s02 += x0 * y2;
        s03 += x0 * y3;
        s10 += x1 * y0;
        s11 += x1 * y1;
        s12 += x1 * y2;
        s13 += x1 * y3;
      }
      s00 = (p[r0 + j0] as number) - s00;
      s01 = (p[r0 + j1] as number) - s01;
      s02 = (p[r0 + j2] as number) - s02;
      s03 = (p[r0 + j3] as number) - s03;
      s10 = (p[r1 + j0] as number) - s10;
      s11 = (p[r1 + j1] as number) - s11;
      s12 = (p[r1 + j2] as number) - s12;
      s13 = (p[r1 + j3] as number) - s13;
      p[r0 + j0] = s00;
      p[r0 + j1] = s01;
      p[r0 + j2] = s02;
      p[r0 + j3] = s03;
      p[r1 + j0] = s10;
      p[r1 + j1] = s11;
      p[r1 + j2] = s12;
      p[r1 + j3] = s13;
      const c0 = j0 * size;
      const c1 = j1 * size;
      const c2 = j2 * size;
      const c3 = j3 * size;
      p[c0 + i0] = s00;
      p[c1 + i0] = s01;
      p[c2 + i0] = s02;
      p[c3 + i0] = s03;
      p[c0 + i1] = s10;
      p[c1 + i1] = s11;
      p[c2 + i1] = s12;
      p[c3 + i1] = s13;
    }
  }
}

/** Lower Cholesky factor of S = H P H' + R, row-major m x m. */
function innovationFactor(model: TubeModel, accepted: readonly AcceptedReading[]): Float64Array {
  const { layout } = model;
  const m = accepted.length;
  const s = new Float64Array(m * m);
  for (let a = 0; a < m; a++) {
    const { sensor, reading, variance_K2 } = accepted[a] as AcceptedReading;
    // As `observe`, its places looked up once for all of the row.
    const { cell, slope_K_m: slope } = reading;
    const wA = 1 - reading.weight;
    const wB = reading.weight;
    const wShare = reading.lag_m * slope;
    const position = layout.position + sensor;
    const offset = layout.offset + sensor;
    const group = layout.groupOf[sensor] as number;
    for (let b = 0; b <= a; b++) {
      const { v } = accepted[b] as AcceptedReading;
      let value =
        wA * (v[cell] as number) +
        wB * (v[cell + 1] as number) -
        wShare * (v[layout.share] as number) +
        slope * (v[position] as number) +
        (v[offset] as number) +
        (group >= 0 ? (v[layout.group + group] as number) : 0);
      if (a === b) value += variance_K2;
      for (let c = 0; c < b; c++) value -= (s[a * m + c] as number) * (s[b * m + c] as number);
      s[a * m + b] = a === b ? Math.sqrt(value) : value / (s[b * m + b] as number);
    }
  }
  return s;
}

/** S^-1 (z - h) by the two triangular solves. */
function solveNormal(
  factor: Float64Array,
  m: number,
  accepted: readonly AcceptedReading[],
): Float64Array {
  const x = new Float64Array(m);
  for (let a = 0; a < m; a++) {
    let value = (accepted[a] as AcceptedReading).innovation_K;
    for (let b = 0; b < a; b++) value -= (factor[a * m + b] as number) * (x[b] as number);
    x[a] = value / (factor[a * m + a] as number);
  }
  for (let a = m - 1; a >= 0; a--) {
    let value = x[a] as number;
    for (let b = a + 1; b < m; b++) value -= (factor[b * m + a] as number) * (x[b] as number);
    x[a] = value / (factor[a * m + a] as number);
  }
  return x;
}

/** Moves each cell to a temperature, starting the table search from where the cell is. */
function moveTo(model: TubeModel, state: TubeState, temperature: Float64Array): void {
  const { enthalpy } = state;
  for (let i = 0; i < temperature.length; i++) {
    const h = enthalpy[i] as number;
    enthalpy[i] = enthalpyNear(model.tables, temperature[i] as number, h);
  }
}
