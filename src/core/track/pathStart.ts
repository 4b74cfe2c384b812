import { type Past, pastsOf, STEP_CELLS } from './pasts.js';
import type { StartReading } from './start.js';
import { setTubeTemperatures, type TubeDrive, type TubeModel, type TubeState } from './tube.js';

/** A candidate explains a reading to this share of the references' span: else the past was another. */
const FIT_SHARE = 0.06;
/**
 * What moved unseen is known to this share of the span, since gas may have entered otherwise meanwhile,
 * and its front in place to so many metres: a third of a width.
 */
const LEVEL_SHARE = 0.02;
const SHAPE_M = 0.1;
const SHAPE_LENGTH_M = 0.3;
/** Thermocouples as near as this to one another draw a front as it is: eight along the bed. */
const DENSE_SHARE = 1 / 8;
/** A past less likely than this adds nothing. */
const LEAST_WEIGHT = 1e-9;

/**
 * Draws a tube's profile anew from what it was: as the bed would be after a charge or a discharge of
 * any length from there, weighted by how well each explains the readings,
 *
 *   w_j ~ exp(-sum_i (z_i - T_j(x_i - s l_i))^2/(2 sigma_i^2)),
 *   T = sum_j w_j T_j,   P = sum_j w_j (T_j - T)(T_j - T)' + P before, carried + what moved unseen
 *
 * so that an unseen change of the store leaves the front its shape, and P says which of the places
 * between two thermocouples it may have. Where these stand close a line between them tells more: see
 * `startTube`. The further states keep what is known of them; their correlation with the old profile
 * is dropped.
 *
 * @param drive of the scan: gas that enters now, and the lag that turns with its flow
 * @returns false, with nothing changed, where no such past explains the readings
 */
export function startAlongPath(
  model: TubeModel,
  state: TubeState,
  readings: readonly StartReading[],
  drive: TubeDrive,
): boolean {
  const { layout, estimator, store, tables } = model;
  const { cells, size } = layout;
  const span = Math.abs(store.reference_hot_K - store.reference_cold_K);
  const dx = tables.bed.length_m / cells;
  const share = state.further[layout.share - cells] as number;
  const white = Math.hypot(
    estimator.reading_sigma_K,
    estimator.offset_sigma_K,
    estimator.group_offset_sigma_K,
    LEVEL_SHARE * span,
  );
  const candidates: (Past & { readonly cost: number })[] = [];
  let least = Number.POSITIVE_INFINITY;
  let moved = 0;
  for (const { profile, moved_cells } of pastsOf(model, state, drive)) {
    let cost = 0;
    let worst = 0;
    for (const { position_m, value_K } of readings) {
      const lag = state.gasLag_m[Math.min(cells - 1, Math.floor(position_m / dx))] as number;
      const place = Math.min(cells - 1, Math.max(0, (position_m - share * lag) / dx - 0.5));
      const cell = Math.min(cells - 2, Math.floor(place));
      const step = (profile[cell + 1] as number) - (profile[cell] as number);
      const away = value_K - (profile[cell] as number) - (place - cell) * step;
      const sigma = Math.hypot(white, (SHAPE_M * step) / dx);
      cost += (away / sigma) ** 2 / 2 + Math.log(sigma);
      worst = Math.max(worst, Math.abs(away));
    }
    if (worst > FIT_SHARE * span) continue;
    candidates.push({ profile, moved_cells, cost });
    if (cost < least) moved = Math.round(moved_cells);
    least = Math.min(least, cost);
  }
  if (candidates.length === 0) return false;
  const weights = candidates.map(({ cost }) => Math.exp(least - cost));
  const total = weights.reduce((a, b) => a + b, 0);
  const mean = new Float64Array(cells);
  candidates.forEach(({ profile }, j) => {
    const w = (weights[j] as number) / total;
    for (let i = 0; i < cells; i++) mean[i] = (mean[i] as number) + w * (profile[i] as number);
  });
  const p = state.covariance;
  carryRock(p, size, cells, moved);
  const apart = new Float64Array(cells);
  candidates.forEach(({ profile }, j) => {
    const w = (weights[j] as number) / total;
    if (w < LEAST_WEIGHT) return;
    for (let i = 0; i < cells; i++) apart[i] = (profile[i] as number) - (mean[i] as number);
    addCorrelated(p, size, apart, w, () => 1);
  });
  const slope = slopeOf(mean, dx);
  // Its place between two candidates, and what the share of gas that junctions see is not known to.
  const shareSigma = Math.sqrt(p[layout.share * (size + 1)] as number);
  const between_m = (STEP_CELLS * dx) / Math.sqrt(12);
  const along = slope.map(
    (k, i) => k * Math.hypot(shareSigma * (state.gasLag_m[i] as number), between_m),
  );
  addCorrelated(p, size, along, 1, () => 1);
  const bent = slope.map((k) => k * SHAPE_M);
  addCorrelated(p, size, bent, 1, (d) => Math.exp(-(d * dx) / SHAPE_LENGTH_M));
  const level = new Float64Array(cells).fill(LEVEL_SHARE * span);
  const length = widestGap(readings, tables.bed.length_m) / 2;
  addCorrelated(p, size, level, 1, (d) => Math.exp(-(d * dx) / length));
  setTubeTemperatures(model, state, mean);
  return true;
}

/** Fewer readings do not show whether a front is as wide as the model has it. */
const LEAST_READINGS = 3;

/** Whether thermocouples stand too far apart for straight lines between them to draw a front. */
export function isSparse(readings: readonly StartReading[], length_m: number): boolean {
  return (
    readings.length >= LEAST_READINGS && widestGap(readings, length_m) > DENSE_SHARE * length_m
  );
}

/** Widest gap between two readings, at least a hundredth of the bed [m]. */
function widestGap(readings: readonly StartReading[], length_m: number): number {
  const places = readings.map((r) => r.position_m).sort((a, b) => a - b);
  let widest = length_m / 100;
  for (let i = 1; i < places.length; i++) {
    widest = Math.max(widest, (places[i] as number) - (places[i - 1] as number));
  }
  return widest;
}

/** Moves what the cells were not known to along the bed, cuts it off from the rest; new rock has none. */
function carryRock(p: Float64Array, size: number, cells: number, moved: number): void {
  const old = p.slice(0, cells * size);
  for (let i = 0; i < cells; i++) {
    for (let j = 0; j < size; j++) p[i * size + j] = p[j * size + i] = 0;
  }
  for (let i = Math.max(0, moved); i < Math.min(cells, cells + moved); i++) {
    for (let j = Math.max(0, moved); j < Math.min(cells, cells + moved); j++) {
      p[i * size + j] = old[(i - moved) * size + j - moved] as number;
    }
  }
}

function slopeOf(profile: Float64Array, dx: number): Float64Array {
  const last = profile.length - 1;
  return profile.map((_, i) => {
    const [a, b] = [Math.max(0, i - 1), Math.min(last, i + 1)];
    return ((profile[b] as number) - (profile[a] as number)) / ((b - a) * dx);
  });
}

/** P <- P + scale v_i v_j c(|i - j|) on the cells. */
function addCorrelated(
  p: Float64Array,
  size: number,
  v: Float64Array,
  scale: number,
  correlation: (apart: number) => number,
): void {
  const c = v.map((_, d) => scale * correlation(d));
  for (let i = 0; i < v.length; i++) {
    for (let j = 0; j < v.length; j++) {
      const at = i * size + j;
      p[at] =
        (p[at] as number) + (v[i] as number) * (v[j] as number) * (c[Math.abs(i - j)] as number);
    }
  }
}
