import { enthalpyNear, temperatureAt } from '../bed/tables.js';
import { observe, type ReadingModel } from './measurement.js';
import { forwardSolve, subtractOuter } from './readingAlgebra.js';
import type { TubeModel, TubeState } from './tube.js';

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
  const rows = accepted.map(({ v }) => v);
  subtractOuter(state.covariance, forwardSolve(factor, rows, size), size);
}

/** Lower Cholesky factor of S = H P H' + R, row-major m x m. */
function innovationFactor(model: TubeModel, accepted: readonly AcceptedReading[]): Float64Array {
  const m = accepted.length;
  const s = new Float64Array(m * m);
  for (let a = 0; a < m; a++) {
    const { sensor, reading, variance_K2 } = accepted[a] as AcceptedReading;
    for (let b = 0; b <= a; b++) {
      let value = observe(model, sensor, reading, (accepted[b] as AcceptedReading).v);
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
