import { temperatureAt } from '../bed/tables.js';
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
  return (
    wA * (out[reading.cell] as number) +
    wB * (out[reading.cell + 1] as number) +
    wShare * (out[layout.share] as number) +
    slope * (out[layout.position + sensor] as number) +
    (out[layout.offset + sensor] as number) +
    (group >= 0 ? (out[layout.group + group] as number) : 0)
  );
}

/** White variance of a reading [K2]: its noise, and the straight line between cell centres. */
export function readingVariance(model: TubeModel, reading: ReadingModel): number {
  const dx = model.tables.bed.length_m / model.layout.cells;
  const noise = model.estimator.reading_sigma_K;
  const between = 0.05 * reading.slope_K_m * dx;
  return noise * noise + between * between;
}

/**
 * Kalman update with one reading: x <- x + v (z - h)/S, P <- P - v v'/S, in a form that stays
 * symmetric to the bit. Temperatures move as enthalpy of the cell's table segment.
 *
 * @param v P H' as `projectReading` left it; overwritten
 */
export function applyReading(
  model: TubeModel,
  state: TubeState,
  innovation_K: number,
  variance_K2: number,
  v: Float64Array,
  scratchTemperature: Float64Array,
): void {
  const { layout, tables } = model;
  const { size, cells } = layout;
  const step = innovation_K / variance_K2;
  for (let i = 0; i < cells; i++) {
    const h = state.enthalpy[i] as number;
    scratchTemperature[i] = temperatureAt(tables, h) + step * (v[i] as number);
  }
  for (let i = cells; i < size; i++) {
    state.further[i - cells] = (state.further[i - cells] as number) + step * (v[i] as number);
  }
  moveTo(model, state, scratchTemperature);
  const root = 1 / Math.sqrt(variance_K2);
  for (let i = 0; i < size; i++) v[i] = (v[i] as number) * root;
  const p = state.covariance;
  for (let i = 0; i < size; i++) {
    const a = v[i] as number;
    const row = i * size;
    for (let j = 0; j < size; j++) p[row + j] = (p[row + j] as number) - a * (v[j] as number);
  }
}

/** Moves each cell to a temperature, starting the table search from where the cell is. */
function moveTo(model: TubeModel, state: TubeState, temperature: Float64Array): void {
  const { tables } = model;
  const nodes = tables.temperature_K;
  const last = tables.segments - 1;
  for (let i = 0; i < temperature.length; i++) {
    const t = temperature[i] as number;
    let s = Math.floor((state.enthalpy[i] as number) * tables.inverse_dH);
    if (s < 0) s = 0;
    else if (s > last) s = last;
    while (s < last && t >= (nodes[s + 1] as number)) s++;
    while (s > 0 && t < (nodes[s] as number)) s--;
    const t0 = nodes[s] as number;
    state.enthalpy[i] = tables.dH * (s + (t - t0) / ((nodes[s + 1] as number) - t0));
  }
}
