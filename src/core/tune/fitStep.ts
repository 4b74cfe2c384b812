import type { EstimatorDefinition } from '../definitions.js';
import type { StoreModel } from '../track/storeTracker.js';
import { STORE_PARAMETERS } from './fitTypes.js';
import { inverse } from './linear.js';
import { KEPT, type StringNormal } from './normal.js';
import { JUNCTION, NUISANCE, type TunePriors } from './priors.js';
import type { TuneBin } from './record.js';
import type { StringData, StringState } from './stringData.js';

/** Number of a store's own parameters; flows of its strings follow. */
export const COUNT = STORE_PARAMETERS.length;

/** Where the search stands. */
export interface Guess {
  readonly values: Float64Array;
  readonly strings: StringState[];
}

/** Largest step of a parameter in one round. */
const LARGEST = [0.5, 0.7, 0.7, 0.5, 5, 5, 0.02, 60, 0.5, 0.1] as const;

/** Mean and sigma of each parameter before the recording, in the order of the values. */
export interface Prior {
  readonly mean: Float64Array;
  readonly sigma: Float64Array;
}

/**
 * The prior of a store's fit: factors as configured, inlets by their sensors (or the machine's model
 * where the gas was not measured in some bin), flows by meter and heat capacity together.
 *
 * @param s index of the store in the bins
 * @param size parameters of the store and one flow per string
 */
export function priorOf(
  store: StoreModel,
  estimator: EstimatorDefinition,
  priors: TunePriors,
  bins: readonly TuneBin[],
  s: number,
  size: number,
): Prior {
  const mean = new Float64Array(size);
  mean[3] = JUNCTION.share;
  mean[7] = JUNCTION.lag_s;
  const measured = (sign: number) =>
    bins.every((bin) => Math.sign(bin.flow_kg_s) !== sign || bin.inletMeasured[s]);
  const inlet = (sign: number) => (measured(sign) ? estimator.inlet_sigma_K : ASSUMED_INLET_K);
  const flow = Math.hypot(priors.meter, priors.capacity);
  const sigma = Float64Array.from([
    priors.transfer,
    priors.conductivity,
    priors.loss,
    JUNCTION.shareSigma,
    inlet(1),
    inlet(-1),
    NUISANCE.meterSlope,
    JUNCTION.lagSigma_s,
    NUISANCE.wallSteel,
    ...store.store.strings.map(() => flow),
  ]).map((one) => Math.max(1e-6, one));
  return { mean, sigma: sigma.subarray(0, size) };
}

/** Sigma of an inlet that the machine's model stands in for [K], as in the tracker. */
const ASSUMED_INLET_K = 15;

/** Sum of the strings' normal equations over [store parameters | flow of each string], with priors. */
export function assemble(
  normals: readonly StringNormal[],
  prior: Prior,
  values: Float64Array,
  size: number,
): { information: Float64Array; right: Float64Array } {
  const information = new Float64Array(size * size);
  const right = new Float64Array(size);
  for (let i = 0; i < size; i++) {
    const precision = 1 / (prior.sigma[i] as number) ** 2;
    information[i * size + i] = precision;
    right[i] = precision * ((prior.mean[i] as number) - (values[i] as number));
  }
  normals.forEach((one, k) => {
    const place = (c: number) => (c < COUNT ? c : COUNT + k);
    for (let c = 0; c < KEPT; c++) {
      const r = place(c);
      right[r] = (right[r] as number) + (one.right[c] as number);
      for (let e = 0; e < KEPT; e++) {
        const at = r * size + place(e);
        information[at] = (information[at] as number) + (one.information[c * KEPT + e] as number);
      }
    }
  });
  return { information, right };
}

/** The part of a step that is a string's: store parameters and its own flow. */
export function partOf(step: Float64Array, k: number): Float64Array {
  const part = new Float64Array(KEPT);
  part.set(step.subarray(0, COUNT));
  part[COUNT] = step[COUNT + k] as number;
  return part;
}

/** Takes a step, shortened where it is too long to be believed; returns the largest in sigmas. */
export function advance(
  guess: Guess,
  step: Float64Array,
  normals: readonly StringNormal[],
  data: readonly StringData[],
  information: Float64Array,
  size: number,
): number {
  let share = 1;
  for (let i = 0; i < size; i++) {
    const most = LARGEST[Math.min(i, COUNT)] as number;
    share = Math.min(share, most / Math.max(1e-12, Math.abs(step[i] as number)));
  }
  const covariance = inverse(information, size);
  let worst = 0;
  for (let i = 0; i < size; i++) {
    const sigma = Math.sqrt(covariance[i * size + i] as number);
    worst = Math.max(worst, Math.abs(step[i] as number) / sigma);
    guess.values[i] = (guess.values[i] as number) + share * (step[i] as number);
  }
  data.forEach((one, k) => {
    const own = (normals[k] as StringNormal).own(partOf(step, k));
    const tube = guess.strings[k] as StringState;
    tube.flow = guess.values[COUNT + k] as number;
    tube.transfer += share * (own[0] as number);
    tube.conductivity += share * (own[1] as number);
    for (let h = 0; h < one.hatSigma_K.length; h++) {
      tube.hats[h] = (tube.hats[h] as number) + share * (own[2 + h] as number);
    }
  });
  return worst;
}
