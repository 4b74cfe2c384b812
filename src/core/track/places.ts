import type { TubeModel, TubeState } from './tube.js';

/** Spread of the gas share from one thermocouple to the next (insertion, thermowell): half of 0..1. */
const SHARE_SPREAD = 0.25;

/**
 * Each junction sees its own share of the gas; the tube's state is their common part. The rest acts
 * like an error of the place, (s_k - s) l, and jumps with the lag l when the flow stops or turns:
 * the variance of a position grows by the square of that jump, up to the prior and the largest lag.
 *
 * @param lag_m gas-to-rock lag of each cell at this step [m]; `state` still holds that of the one before
 * @param sign of the metered flow: +1 charge, -1 discharge, 0 standing
 */
export function loosenPositions(
  model: TubeModel,
  state: TubeState,
  lag_m: Float64Array,
  sign: number,
): void {
  const { layout, string, estimator, tables } = model;
  const p = state.covariance;
  for (let k = 0; k < layout.sensors; k++) {
    const x = (string.thermocouples[k] as { position_m: number }).position_m;
    const i = Math.min(layout.cells - 1, Math.floor((x / tables.bed.length_m) * layout.cells));
    const now = sign * (lag_m[i] as number);
    const jump = SHARE_SPREAD * (now - (state.gasLag_m[i] as number));
    if (jump === 0) continue;
    const own = (layout.position + k) * (layout.size + 1);
    const most =
      estimator.position_sigma_m ** 2 +
      (SHARE_SPREAD * 2 * Math.max(Math.abs(now), Math.abs(state.gasLag_m[i] as number))) ** 2;
    p[own] = Math.max(p[own] as number, Math.min(most, (p[own] as number) + jump * jump));
  }
}
