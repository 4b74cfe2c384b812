import { storeEnergy } from '../track/storeEnergy.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import type { TubeModel, TubeState } from '../track/tube.js';
import { bumpWeights } from './roller.js';

/** Slopes of each rule's time along what is uncertain in one store, by bump or rule. */
export interface StoreResponse {
  /** [s/K], by bump and rule: the whole store moved along that bump. */
  readonly bumps: readonly (readonly number[])[];
  /** [s] per ln, by rule. */
  readonly flow: readonly number[];
  readonly transfer: readonly number[];
}

/**
 * Adds to the covariance of the rules' times what a store's profile and heat transfer leave open
 * while its flow factors are given, and returns the slope along ln(flow factor) with all that moves
 * along with it in the filter's covariance P:
 *
 *   var  = g' (P - P_f P_f'/P_ff) g,       slope = g_f + g' P_f/P_ff
 *
 * How uncertain the flow itself is comes from `calibrate`, which knows more of it than a tube. The
 * bumps move all tubes at once; a tube's own share of the response is its share of the area. What
 * tubes share in their errors is counted through the correlation of the store's energy
 * (see storeEnergy).
 *
 * @returns [s] per ln, by rule
 */
export function addProfile(
  model: StoreModel,
  state: StoreState,
  response: StoreResponse,
  covariance: readonly Float64Array[],
): number[] {
  const rules = response.flow.length;
  const cells = (model.tubes[0] as TubeModel).layout.cells;
  const weights = response.bumps.map((_, b) => bumpWeights(model, b));
  const totals = weights.map((w) => w.reduce((a, v) => a + v, 0));
  const inflate = model.tubes.length === 1 ? 1 : storeEnergy(model, state).shared_over_independent;
  const slopes = [...response.flow];
  for (const [k, tube] of model.tubes.entries()) {
    const { size, flow, transfer } = tube.layout;
    const p = (state.tubes[k] as TubeState).covariance;
    const share = tube.string.area_share;
    const gradients = Array.from({ length: rules }, (_, r) => {
      const g = new Float64Array(size);
      for (let i = 0; i < cells; i++) {
        let sum = 0;
        weights.forEach((w, b) => {
          sum += ((w[i] as number) * (response.bumps[b]?.[r] as number)) / (totals[b] as number);
        });
        g[i] = share * sum;
      }
      g[transfer] = share * (response.transfer[r] as number);
      return g;
    });
    const projected = gradients.map((g) => multiply(p, g, size));
    const variance = p[flow * size + flow] as number;
    const along = projected.map((v) => (variance > 0 ? (v[flow] as number) / variance : 0));
    for (let a = 0; a < rules; a++) {
      slopes[a] = (slopes[a] as number) + (along[a] as number);
      for (let b = 0; b < rules; b++) {
        let sum = -(along[a] as number) * (along[b] as number) * variance;
        for (let i = 0; i < size; i++) {
          sum += (gradients[a]?.[i] as number) * (projected[b]?.[i] as number);
        }
        (covariance[a] as Float64Array)[b]! += sum * inflate;
      }
    }
  }
  return slopes;
}

function multiply(p: Float64Array, g: Float64Array, size: number): Float64Array {
  const out = new Float64Array(size);
  for (let i = 0; i < size; i++) {
    const a = g[i] as number;
    if (a === 0) continue;
    for (let j = 0; j < size; j++) out[j] = (out[j] as number) + a * (p[i * size + j] as number);
  }
  return out;
}
