import { setTubeTemperatures, type TubeModel, type TubeState, tubeTemperatures } from './tube.js';

/** How far along the bed a sensor bends the profile that it pulls at: the length of shape noise [m]. */
const BENT_LENGTH_M = 0.3;
/** Share of what it was off by that the profile may have taken on, and the most of it [K]. */
const BENT_SHARE = 0.3;
const BENT_MOST_K = 5;

/**
 * Takes back what a sensor has told a tube while it was not yet found out: its offset is treated
 * as a constant of which nothing was known beforehand,
 *
 *   x <- x + c o/(s^2 - P_oo),  P <- P + c c'/(s^2 - P_oo),   c = P e_o, s the prior's sigma,
 *
 * which leaves its readings no say in the level of the profile; the offset itself is then the prior's.
 * After it the same with its place, which in the front takes on what the offset does not; a place that
 * a turn of the flow has loosened beyond its prior keeps its variance and is only cut off from the rest.
 * What it may have bent beyond that, as it did not stay constant, is added as one common doubt around it.
 */
export function forgetSensor(
  model: TubeModel,
  state: TubeState,
  sensor: number,
  off_K: number,
): void {
  const { layout, estimator } = model;
  forget(model, state, layout.offset + sensor, estimator.offset_sigma_K ** 2);
  forget(model, state, layout.position + sensor, estimator.position_sigma_m ** 2);
  widen(model, state, sensor, Math.min(BENT_MOST_K, BENT_SHARE * Math.abs(off_K)), BENT_LENGTH_M);
}

/** Takes back what one further state, of which `prior` is the variance, has told all others. */
function forget(model: TubeModel, state: TubeState, own: number, prior: number): void {
  const { size, cells } = model.layout;
  const p = state.covariance;
  const variance = p[own * (size + 1)] as number;
  const left = prior - variance;
  if (left > 0.05 * prior) {
    const value = state.further[own - cells] as number;
    const temperature = tubeTemperatures(model, state, new Float64Array(cells));
    const column = Float64Array.from(p.subarray(own * size, own * size + size));
    for (let i = 0; i < size; i++) {
      const move = ((column[i] as number) * value) / left;
      if (i < cells) temperature[i] = (temperature[i] as number) + move;
      else state.further[i - cells] = (state.further[i - cells] as number) + move;
      for (let j = 0; j < size; j++) {
        p[i * size + j] =
          (p[i * size + j] as number) + ((column[i] as number) * (column[j] as number)) / left;
      }
    }
    setTubeTemperatures(model, state, temperature);
  }
  state.further[own - cells] = 0;
  for (let j = 0; j < size; j++) p[own * size + j] = p[j * size + own] = 0;
  p[own * (size + 1)] = Math.max(prior, variance);
}

/**
 * Adds a doubt of `sigma_K` about the rock at a sensor, which fades along the bed as a Gaussian of
 * `length_m`: all of it moves together.
 */
export function widen(
  model: TubeModel,
  state: TubeState,
  sensor: number,
  sigma_K: number,
  length_m: number,
): void {
  const { layout, tables, string } = model;
  const { size, cells } = layout;
  const p = state.covariance;
  const dx = tables.bed.length_m / cells;
  const x = string.thermocouples[sensor]?.position_m as number;
  const bump = Float64Array.from(
    { length: cells },
    (_, i) => sigma_K * Math.exp(-0.5 * (((i + 0.5) * dx - x) / length_m) ** 2),
  );
  for (let i = 0; i < cells; i++) {
    for (let j = 0; j < cells; j++) {
      p[i * size + j] = (p[i * size + j] as number) + (bump[i] as number) * (bump[j] as number);
    }
  }
}
