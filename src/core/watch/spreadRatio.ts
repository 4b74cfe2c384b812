import { enthalpyAt } from '../bed/tables.js';
import { energyPosition } from '../track/energyPosition.js';
import {
  type MeasuredFront,
  profileFronts,
  type TwinModel,
  type TwinState,
  twinTemperatures,
} from './healthyTwin.js';

export interface SpreadRatio {
  readonly ratio: number;
  readonly sigma: number;
}

/** Fronts of bed and twin further apart than this share of the length are not the same one. */
const SAME_SHARE = 0.15;

/**
 * Spread ratio: width of a measured front over the width that the healthy twin shows for the same
 * front (the nearest one), and its sigma from both widths. Of several fronts the one that is widest
 * beyond doubt (ratio less two sigmas).
 *
 * Where the bed's front has gone further by d along the present flow than the twin's, the twin's width
 * is carried there: what it has grown since its start is taken as proportional to the way (w^2 =
 * w0^2 + 2 (D/v) s), so w_at^2 = w^2 + (w^2 - w0^2) d/travelled. Only the first order is meant: beyond
 * half the way there is no ratio. d is the difference of the energy-equivalent positions, which is
 * what each has taken in, not of the crossings: a damaged front is skewed, and its crossing stands
 * elsewhere after the same way. The twin's own width is as uncertain as the one it started with;
 * tuned factors of the bed are taken as they stand, which the limit has to allow for.
 *
 * @param fronts published fronts of the store's mean profile
 * @param direction +1 charging, -1 discharging; while standing that of the last flow
 * @param energyPosition_m published energy-equivalent position of the store [m]; null: d by crossings
 * @returns null where either has no width, they stand too far apart, or the twin is lost
 */
export function spreadRatio(
  model: TwinModel,
  state: TwinState,
  fronts: readonly MeasuredFront[],
  direction: 1 | -1,
  energyPosition_m: number | null = null,
): SpreadRatio | null {
  if (state.enthalpy === null || state.lost) return null;
  const further =
    energyPosition_m === null ? null : energyPosition_m - twinEnergyPosition(model, state.enthalpy);
  const twins = profileFronts(model, twinTemperatures(model, state.enthalpy)).fronts;
  let worst: SpreadRatio | null = null;
  for (const { position_m, width_m, width_sigma_m } of fronts) {
    if (position_m === null || width_m === null || width_sigma_m === null) continue;
    const twin = twins.reduce(
      (best, next) =>
        Math.abs(next.position_m - position_m) < Math.abs(best.position_m - position_m)
          ? next
          : best,
      twins[0]!,
    );
    if (twin?.width_m == null) continue;
    const apart = position_m - twin.position_m;
    if (Math.abs(apart) > SAME_SHARE * model.store.bed.length_m) continue;
    const square = carriedSquare(state, twin.width_m ** 2, direction * (further ?? apart));
    if (square === null) continue;
    const ratio = width_m / Math.sqrt(square);
    const own = Math.sqrt(state.startWidthVariance_m4) / (2 * square);
    const sigma = ratio * Math.hypot(width_sigma_m / width_m, own);
    if (worst === null || ratio - 2 * sigma > worst.ratio - 2 * worst.sigma)
      worst = { ratio, sigma };
  }
  return worst;
}

function twinEnergyPosition(model: TwinModel, enthalpy: Float64Array): number {
  const { store, tables, x_m } = model;
  const hot = enthalpyAt(tables, store.reference_hot_K);
  const cold = enthalpyAt(tables, store.reference_cold_K);
  const [charged, discharged] = store.kind === 'hot' ? [hot, cold] : [cold, hot];
  return energyPosition(enthalpy, store.bed.length_m / x_m.length, charged, discharged);
}

/** Twin's width squared at a place `ahead` of it along the present flow; null beyond first order. */
function carriedSquare(state: TwinState, square: number, ahead: number): number | null {
  const growth = square - state.startWidth_m2;
  if (state.travelled_m > 0 && Math.abs(ahead) <= 0.5 * state.travelled_m) {
    const carried = square + (growth * ahead) / state.travelled_m;
    // A twin that is much narrower than it began (the start's front has left, another is nearest) says
    // nothing of growth: carried on, its square would fall below zero.
    return carried >= 0.5 * square ? carried : null;
  }
  // Next to nothing travelled, and next to nothing apart: nothing to carry.
  return Math.abs(ahead) <= 0.1 * Math.sqrt(square) ? square : null;
}
