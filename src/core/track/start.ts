import type { TubeModel, TubeState } from './tube.js';
import { leakSigma, setTubeTemperatures } from './tube.js';

/** One usable reading for a start. */
export interface StartReading {
  readonly position_m: number;
  readonly value_K: number;
  /** Index of the thermocouple in the tube's own string, -1 where it stands on another string. */
  readonly sensor: number;
}

/** Share of the step between two thermocouples by which the profile may leave the straight line. */
const BETWEEN = 0.25;
/** Beyond the outermost thermocouples the profile is unknown within this share of the span, reached over a metre. */
const BEYOND = 0.3;

/** A tube that knows nothing yet: mid temperature, sigma of half the span. */
export function blankTube(model: TubeModel): TubeState {
  const { layout } = model;
  const state: TubeState = {
    enthalpy: new Float64Array(layout.cells),
    further: new Float64Array(layout.size - layout.cells),
    covariance: new Float64Array(layout.size * layout.size),
    gasLag_m: new Float64Array(layout.cells),
    outlet_K: Number.NaN,
    surprise: 1,
  };
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const middle = new Float64Array(layout.cells).fill((hot + cold) / 2);
  setTubeTemperatures(model, state, middle);
  const sigma = (hot - cold) / 2;
  const byDistance = Float64Array.from(
    middle,
    (_, apart) => sigma * sigma * Math.exp(-4 * (apart / layout.cells)),
  );
  for (let i = 0; i < layout.cells; i++) {
    for (let j = 0; j < layout.cells; j++) {
      state.covariance[i * layout.size + j] = byDistance[Math.abs(i - j)] as number;
    }
  }
  priorOfFurther(model, state);
  return state;
}

/**
 * Starts (or restarts) a tube's profile from readings: straight lines between them, with the
 * covariance of that interpolation:
 *
 *   P = W R W' + A_i A_j exp(-|x_i - x_j|/l),   W the interpolation weights,
 *
 * R the readings' noise and offsets (a group's common to its own readings alone), A the room that
 * the profile has between and beyond the thermocouples. The readings' offsets are correlated with
 * the profile that was drawn through them: cov(T, o_s) = -W_s sigma_o^2. Factors keep what is known
 * of them; their correlation with the old profile is dropped.
 *
 * @param inflate factor on sigma, > 1 when re-acquiring
 * @throws RangeError for fewer than two readings
 */
export function startTube(
  model: TubeModel,
  state: TubeState,
  readings: readonly StartReading[],
  inflate: number,
): void {
  if (readings.length < 2) throw new RangeError(`readings: ${readings.length}, expected 2 or more`);
  const { layout, estimator, tables } = model;
  const { cells, size } = layout;
  const dx = tables.bed.length_m / cells;
  const sorted = [...readings].sort((a, b) => a.position_m - b.position_m);
  const offsetVariance = estimator.offset_sigma_K ** 2;
  const noise = estimator.reading_sigma_K ** 2;
  const group = estimator.group_offset_sigma_K ** 2;
  const span = model.store.reference_hot_K - model.store.reference_cold_K;
  const temperature = new Float64Array(cells);
  const room = new Float64Array(cells);
  const left = new Int32Array(cells);
  const right = new Int32Array(cells);
  const weight = new Float64Array(cells);
  let widest = 2 * dx;
  for (let i = 0; i < cells; i++) {
    const x = (i + 0.5) * dx;
    let b = sorted.findIndex((r) => r.position_m >= x);
    if (b < 0) b = sorted.length - 1;
    const a = (sorted[b] as StartReading).position_m >= x && b > 0 ? b - 1 : b;
    const ra = sorted[a] as StartReading;
    const rb = sorted[b] as StartReading;
    const gap = rb.position_m - ra.position_m;
    const u = gap > 0 ? Math.min(1, Math.max(0, (x - ra.position_m) / gap)) : 0;
    widest = Math.max(widest, gap);
    left[i] = a;
    right[i] = b;
    weight[i] = u;
    temperature[i] = ra.value_K + u * (rb.value_K - ra.value_K);
    const step = Math.abs(rb.value_K - ra.value_K);
    const outside = gap > 0 && u > 0 && u < 1 ? 0 : Math.abs(x - (u >= 1 ? rb : ra).position_m);
    room[i] =
      0.3 +
      BETWEEN * step * Math.sqrt(4 * u * (1 - u)) +
      BEYOND * span * (1 - Math.exp(-outside / 1));
  }
  const p = state.covariance;
  const keep = Float64Array.from(p);
  p.fill(0);
  for (let a = cells; a < size; a++) {
    for (let b = cells; b < size; b++) p[a * size + b] = keep[a * size + b] as number;
  }
  // Weight of a cell's interpolation on the readings of each group; those of another string are one.
  const kinds = layout.groups.length + 1;
  const byGroup = new Float64Array(cells * kinds);
  const groupOf = sorted.map(({ sensor }) =>
    sensor < 0 ? layout.groups.length : (layout.groupOf[sensor] as number),
  );
  for (let i = 0; i < cells; i++) {
    const u = weight[i] as number;
    for (const [reading, w] of [
      [left[i] as number, 1 - u],
      [right[i] as number, u],
    ] as const) {
      const g = groupOf[reading] as number;
      if (g >= 0) byGroup[i * kinds + g] = (byGroup[i * kinds + g] as number) + w;
    }
  }
  const length = widest / 2;
  const scale = inflate * inflate;
  for (let i = 0; i < cells; i++) {
    for (let j = i; j < cells; j++) {
      const correlation = Math.exp(-(Math.abs(i - j) * dx) / length);
      const value =
        scale * (room[i] as number) * (room[j] as number) * correlation +
        scale * (shared(i, j) * (noise + offsetVariance) + sharedGroups(i, j) * group);
      p[i * size + j] = value;
      p[j * size + i] = value;
    }
  }
  for (let s = 0; s < layout.sensors; s++) freshOffset(s);
  for (let g = 0; g < layout.groups.length; g++) reset(layout.group + g, group);
  for (let i = 0; i < cells; i++) {
    couple(i, left[i] as number, 1 - (weight[i] as number));
    couple(i, right[i] as number, weight[i] as number);
  }
  setTubeTemperatures(model, state, temperature);

  function weightOf(i: number, reading: number): number {
    const u = weight[i] as number;
    return (left[i] === reading ? 1 - u : 0) + (right[i] === reading ? u : 0);
  }
  function shared(i: number, j: number): number {
    let sum = weightOf(i, left[i] as number) * weightOf(j, left[i] as number);
    if (right[i] !== left[i]) {
      sum += weightOf(i, right[i] as number) * weightOf(j, right[i] as number);
    }
    return sum;
  }
  function sharedGroups(i: number, j: number): number {
    let sum = 0;
    for (let g = 0; g < kinds; g++) {
      sum += (byGroup[i * kinds + g] as number) * (byGroup[j * kinds + g] as number);
    }
    return sum;
  }
  function freshOffset(s: number): void {
    reset(layout.offset + s, offsetVariance);
  }
  function reset(index: number, variance: number): void {
    for (let j = 0; j < size; j++) {
      p[index * size + j] = 0;
      p[j * size + index] = 0;
    }
    p[index * size + index] = variance * scale;
    state.further[index - cells] = 0;
  }
  function couple(i: number, reading: number, w: number): void {
    const sensor = (sorted[reading] as StartReading).sensor;
    if (sensor < 0 || w === 0) return;
    put(i, layout.offset + sensor, -w * offsetVariance * scale);
    const g = layout.groupOf[sensor] as number;
    if (g >= 0) put(i, layout.group + g, -w * group * scale);
  }
  function put(i: number, index: number, value: number): void {
    p[i * size + index] = (p[i * size + index] as number) + value;
    p[index * size + i] = p[i * size + index] as number;
  }
}

/** Prior of the further states, from the configuration. */
export function priorOfFurther(model: TubeModel, state: TubeState): void {
  const { layout, estimator } = model;
  const { size, cells } = layout;
  const set = (index: number, value: number, sigma: number): void => {
    state.further[index - cells] = value;
    for (let j = 0; j < size; j++) {
      state.covariance[index * size + j] = 0;
      state.covariance[j * size + index] = 0;
    }
    state.covariance[index * size + index] = sigma * sigma;
  };
  set(layout.flow, 0, estimator.flow_factor_sigma);
  set(layout.transfer, 0, estimator.heat_transfer_factor_sigma);
  set(layout.share, estimator.gas_share, estimator.gas_share_sigma);
  set(layout.inlet.charge_inlet, 0, estimator.inlet_sigma_K);
  set(layout.inlet.discharge_inlet, 0, estimator.inlet_sigma_K);
  set(layout.leak, 0, leakSigma(model));
  for (let s = 0; s < layout.sensors; s++) {
    set(layout.offset + s, 0, estimator.offset_sigma_K);
    set(layout.position + s, 0, estimator.position_sigma_m);
  }
  for (let g = 0; g < layout.groups.length; g++) {
    set(layout.group + g, 0, estimator.group_offset_sigma_K);
  }
}
