import { temperatureAt } from '../bed/tables.js';
import {
  leakSigma,
  type TubeDrive,
  type TubeModel,
  type TubeScratch,
  type TubeState,
} from './tube.js';

const FLOW_NOISE = 0.015; // relative, common practice for a thermal or orifice meter's short-term error, no source
const FLOW_CORRELATION_S = 600;
const SHAPE_PER_METRE_M = 0.02; // [m per sqrt(m)], from the ring truth's isotherm scatter; see DEVELOPERS.md
const SHAPE_LENGTH_M = 0.3;
const STANDING_K_PER_SQRT_H = 0.05;
const FLOW_WALK_PER_SQRT_H = 0.01;
const TRANSFER_WALK_PER_SQRT_H = 0.06;
const SHARE_WALK_PER_SQRT_H = 0.02;
/** A leaking valve keeps what it lets through within this share of the prior over a day. */
const LEAK_WALK_PER_SQRT_DAY = 0.3;
const HOUR_S = 3600;
/**
 * Where the innovations of a tube are on average more than this times larger than expected (their
 * squares), the bed behaves as no healthy one: shape and transfer noise grow with the surprise, so
 * that a front that degrades within the hour is followed rather than its sensors doubted.
 */
const ADAPT_FROM = 2;
const ADAPT_MOST = 30;

/**
 * Time in which ln phi_h comes back to the configured factor [h of flow], as a first-order Gauss-Markov
 * state of the configured sigma that walks by 0.06 per root hour: 140 h with a sigma of 0.5. A walk
 * without a way back left what is healthy where fronts are too wide to tell of it (18 times the exchange
 * after a month of partial cycles).
 */
export function transferTime_h(sigma: number): number {
  return 2 * (sigma / TRANSFER_WALK_PER_SQRT_H) ** 2;
}

/**
 * What the bed model does not know, per scan, added to a tube's covariance:
 *
 * - flow: relative error of the metered flow over its correlation time, and unknown travel, as one
 *   common displacement of the profile: rank one along dT/dlnf or dT/dx;
 * - inlet: white error of an assumed inlet temperature, along the first cells' response;
 * - shape: displacement of single isotherms that grows with the square root of the distance
 *   travelled, correlated over SHAPE_LENGTH: (dT/dx)^2 kappa^2 |v| dt;
 * - standing: heat between tubes, natural convection and uncertain losses, as a slow walk of each
 *   temperature that grows with its distance from ambient;
 * - slow walks of the flow and gas-share factors; the transfer factor and offsets are first-order
 *   Gauss-Markov, the transfer factor's faster while the tube is surprised.
 *
 * Scaled by dt, so a scan in parts adds the same as one in whole.
 */
export function addProcessNoise(
  model: TubeModel,
  state: TubeState,
  drive: TubeDrive & { readonly scans: number },
  scratch: TubeScratch,
): void {
  const { layout, tables, estimator } = model;
  const { cells, size } = layout;
  const p = state.covariance;
  const dx = tables.bed.length_m / cells;
  const t = scratch.temperature;
  for (let i = 0; i < cells; i++) t[i] = temperatureAt(tables, state.enthalpy[i] as number);
  const slope = scratch.slope;
  for (let i = 0; i < cells; i++) {
    const a = i > 0 ? i - 1 : 0;
    const b = i + 1 < cells ? i + 1 : cells - 1;
    slope[i] = ((t[b] as number) - (t[a] as number)) / ((b - a) * dx);
  }
  const hours = drive.dt_s / HOUR_S;
  const flowing = drive.massFlux_kg_m2s !== 0;
  const adapt = Math.min(ADAPT_MOST, Math.max(1, state.surprise / ADAPT_FROM));
  if (flowing) {
    // White over FLOW_CORRELATION_S: the scan's share of variance is 2 tau/dt of the band's.
    const scale = FLOW_NOISE * Math.sqrt(Math.max(1, (2 * FLOW_CORRELATION_S) / drive.dt_s));
    addRankOne(p, size, cells, scratch.flowColumn, scale * scale);
    addShapeNoise(p, size, cells, dx, slope, adapt * travelOf(model, state, drive));
  }
  if (drive.travelSigma_m > 0) {
    addRankOne(p, size, cells, slope, drive.travelSigma_m * drive.travelSigma_m * drive.scans);
    // Nor does a front that moves unseen keep its shape.
    addShapeNoise(p, size, cells, dx, slope, adapt * drive.travelSigma_m * drive.scans);
  }
  if (drive.inletSigma_K > 0 && flowing) {
    addInletNoise(p, size, cells, scratch, drive);
  }
  const span = Math.abs(model.store.reference_hot_K - model.store.reference_cold_K);
  for (let i = 0; i < cells; i++) {
    const away = 0.2 + Math.abs((t[i] as number) - drive.ambient_K) / span;
    const sigma = STANDING_K_PER_SQRT_H * away;
    p[i * size + i] = (p[i * size + i] as number) + sigma * sigma * hours * (SHAPE_LENGTH_M / dx);
  }
  if (flowing) {
    walk(p, size, layout.flow, FLOW_WALK_PER_SQRT_H ** 2 * hours);
    const sigma = estimator.heat_transfer_factor_sigma;
    const kept = sigma > 0 ? Math.exp(-hours / transferTime_h(sigma)) : 1;
    fade(state, size, cells, layout.transfer, kept, sigma * sigma);
    const more = (adapt * adapt - 1) * TRANSFER_WALK_PER_SQRT_H ** 2 * hours;
    walk(p, size, layout.transfer, sigma > 0 ? more : 0);
    walk(p, size, layout.share, SHARE_WALK_PER_SQRT_H ** 2 * hours);
  } else {
    const step = LEAK_WALK_PER_SQRT_DAY * leakSigma(model);
    walk(p, size, layout.leak, (step * step * hours) / 24);
  }
  const decay = Math.exp(-drive.dt_s / estimator.offset_time_s);
  const inlet = estimator.inlet_sigma_K ** 2;
  fade(state, size, cells, layout.inlet.charge_inlet, decay, inlet);
  fade(state, size, cells, layout.inlet.discharge_inlet, decay, inlet);
  for (let s = 0; s < layout.sensors; s++) {
    fade(state, size, cells, layout.offset + s, decay, estimator.offset_sigma_K ** 2);
  }
  const groupDecay = Math.exp(-drive.dt_s / (24 * HOUR_S));
  for (let g = 0; g < layout.groups.length; g++) {
    fade(state, size, cells, layout.group + g, groupDecay, estimator.group_offset_sigma_K ** 2);
  }
}

/** Distance that the front travels in the scan [m]: G cf dt / C. */
function travelOf(model: TubeModel, state: TubeState, drive: TubeDrive): number {
  const { tables, layout } = model;
  const s = tables.segments >> 1;
  const f = Math.exp(state.further[layout.flow - layout.cells] as number);
  return (
    (Math.abs(drive.massFlux_kg_m2s) * f * drive.dt_s * (tables.fluidHeatCapacity[s] as number)) /
    (tables.heatCapacity[s] as number)
  );
}

/** Adds scale times v v', both halves alike: two rows at a time, the last of an odd number alone. */
function addRankOne(
  p: Float64Array,
  size: number,
  cells: number,
  vector: Float64Array,
  scale: number,
): void {
  const root = Math.sqrt(scale);
  for (let i = 0; i < cells; i += 2) {
    const other = i + 1 < cells;
    const a = root * (vector[i] as number);
    const b = other ? root * (vector[i + 1] as number) : 0;
    if (a === 0 && b === 0) continue;
    const first = i * size;
    // Without another row, nothing is added once more to the same one.
    const second = other ? first + size : first;
    for (let j = 0; j < cells; j++) {
      const v = root * (vector[j] as number);
      p[first + j] = (p[first + j] as number) + a * v;
      p[second + j] = (p[second + j] as number) + b * v;
    }
  }
}

function addShapeNoise(
  p: Float64Array,
  size: number,
  cells: number,
  dx: number,
  slope: Float64Array,
  travel_m: number,
): void {
  const root = SHAPE_PER_METRE_M * Math.sqrt(travel_m);
  const reach = Math.ceil((2 * COMPACT_SCALE * SHAPE_LENGTH_M) / dx);
  for (let d = 0; d <= reach; d++) {
    const correlation = compactCorrelation((d * dx) / SHAPE_LENGTH_M);
    for (let i = 0; i + d < cells; i++) {
      const a = root * (slope[i] as number) * (root * (slope[i + d] as number)) * correlation;
      p[i * size + i + d] = (p[i * size + i + d] as number) + a;
      if (d > 0) p[(i + d) * size + i] = (p[(i + d) * size + i] as number) + a;
    }
  }
}

/** Half the support of the correlation [lengths] at which it curves at 0 as exp(-x^2/2) does. */
const COMPACT_SCALE = Math.sqrt(10 / 3);

/**
 * Correlation at a distance of x lengths: Gaspari & Cohn 1999, eq. 4.10, positive definite and zero
 * beyond its support, which a Gaussian cut off is not.
 */
function compactCorrelation(x: number): number {
  const z = x / COMPACT_SCALE;
  if (z >= 2) return 0;
  if (z <= 1) return 1 + z * z * (-5 / 3 + z * (5 / 8 + z * (1 / 2 - z / 4)));
  return 4 - 5 * z + z * z * (5 / 3 + z * (5 / 8 + z * (-1 / 2 + z / 12))) - 2 / (3 * z);
}

/** White error of the inlet temperature: response of the cells to 1 K at the inlet in this step. */
function addInletNoise(
  p: Float64Array,
  size: number,
  cells: number,
  scratch: TubeScratch,
  drive: TubeDrive & { readonly scans: number },
): void {
  const { tangent } = scratch;
  const column = scratch.gain.subarray(0, cells);
  let e = tangent.inletHeatCapacity;
  for (let n = 0; n < cells; n++) {
    const i = tangent.forward ? n : cells - 1 - n;
    column[i] = (tangent.gas[i] as number) * e;
    e *= 1 - (tangent.pickup[i] as number);
  }
  const scale = drive.inletSigma_K ** 2 * Math.max(1, (2 * FLOW_CORRELATION_S) / drive.dt_s);
  addRankOne(p, size, cells, column, scale);
}

function walk(p: Float64Array, size: number, index: number, variance: number): void {
  p[index * size + index] = (p[index * size + index] as number) + variance;
}

/** First-order Gauss-Markov: x <- r x, P <- R P R + (1 - r^2) sigma^2. */
function fade(
  state: TubeState,
  size: number,
  cells: number,
  index: number,
  decay: number,
  variance: number,
): void {
  const p = state.covariance;
  state.further[index - cells] = (state.further[index - cells] as number) * decay;
  for (let j = 0; j < size; j++) {
    if (j === index) continue;
    const value = (p[index * size + j] as number) * decay;
    p[index * size + j] = value;
    p[j * size + index] = value;
  }
  const own = index * size + index;
  p[own] = (p[own] as number) * decay * decay + (1 - decay * decay) * variance;
}
