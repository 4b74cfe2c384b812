import type { EstimatorDefinition } from '../definitions.js';
import type { StoreModel } from '../track/storeTracker.js';
import { advance, assemble, COUNT, type Guess, partOf, priorOf } from './fitStep.js';
import type { StoreFit } from './fitTypes.js';
import { inverse, solve } from './linear.js';
import { KEPT, type StringNormal, stringNormal } from './normal.js';
import { JUNCTION, type TunePriors } from './priors.js';
import type { TuneBin } from './record.js';
import { type SensorResidual, sensorResiduals } from './residuals.js';
import { ringsOf } from './rings.js';
import type { RunPlan, StoreGuess } from './simulate.js';
import { type HatColumns, hatColumns, type StringColumns, storeColumns } from './stringColumns.js';
import { type StringData, startStringState, stringData } from './stringData.js';

/** Noise of the first rounds over the last [-]: a front that stands elsewhere is drawn in step by step. */
const ROUGH = [30, 5] as const;
const MOST_ROUNDS = 20;
/** The noise is measured so often, then it stays: each change moves what it is measured by. */
const MEASURED = 3;
/** A round that moves nothing by more than this share of its sigma ends the search. */
const SETTLED = 0.05;
/** Rounding of the model itself: below this nothing is believed of a reading [K]. */
const LEAST_NOISE_K = 0.02;
/** A thermocouple that leaves this much, and so many times more than its fellows, is left out. */
const ODD_K = 3;
const ODD_TIMES = 5;

/** Cells of the fit's profiles: so many to a piece of rock at most, so that the scheme spreads no front. */
const CELL_PIECES = 3;
const MOST_CELLS = 400;

/**
 * Fits one store's parameters to a recording: output error, that is, the bed model is driven by the
 * metered flow and the measured inlet gas alone, and its readings held against the recorded ones.
 * Gauss-Newton with difference quotients; priors on everything; instruments' errors, the starting
 * profile, wobble of fronts and unlike strings are fitted along as nuisance, each within its class,
 * so that their uncertainty stands in the covariance of what is asked. What is left after all that
 * is correlated in time; it sets the noise of a reading through its integrated autocorrelation.
 *
 * @param s index of the store in the bins
 * @param onRound told after each round, for a progress line
 */
export function fitStore(
  store: StoreModel,
  estimator: EstimatorDefinition,
  priors: TunePriors,
  bins: readonly TuneBin[],
  s: number,
  onRound: (round: number) => void = () => undefined,
): StoreFit {
  const running = bins.filter((bin) => bin.flow_kg_s !== 0);
  const plan: RunPlan = {
    store,
    rings: ringsOf(store),
    bins,
    s,
    meanFlow_kg_s:
      running.reduce((sum, bin) => sum + Math.abs(bin.flow_kg_s), 0) / Math.max(1, running.length),
    positions_m: store.store.strings.map((one) => one.thermocouples.map((t) => t.position_m)),
  };
  const { length_m, particle_diameter_m } = store.store.bed;
  const fine = Math.ceil(length_m / (CELL_PIECES * particle_diameter_m));
  const cells = Math.min(MOST_CELLS, Math.max(estimator.cells, fine));
  let first = 0;
  const data = plan.positions_m.map((row, k) => {
    const one = stringData(plan, k, first, cells);
    first += row.length;
    return one;
  });
  const size = COUNT + data.length;
  const guess: Guess = { values: new Float64Array(size), strings: data.map(startStringState) };
  guess.values[3] = JUNCTION.share;
  guess.values[7] = JUNCTION.lag_s;
  const prior = priorOf(store, estimator, priors, bins, s, size);
  const leftOut: { id: string; residual_K: number }[] = [];
  let noise_K: number = estimator.reading_sigma_K;
  let residual_K = Number.NaN;
  let measured = 0;
  let converged = false;
  let information: Float64Array = new Float64Array(size * size);
  let hats: HatColumns | null = null;
  let round = 0;
  for (; round < MOST_ROUNDS; round++) {
    const rough = ROUGH[round] ?? 1;
    const at = storeGuess(guess.values);
    if (hats === null || round === ROUGH.length) hats = hatColumns(plan, data, at, guess.strings);
    const columns = storeColumns(plan, data, at, guess.strings, hats, estimator);
    const normals = data.map((one, k) =>
      stringNormal(
        one,
        columns[k] as StringColumns,
        bins,
        s,
        noise_K * rough,
        rough <= 1,
        estimator,
      ),
    );
    const sum = assemble(normals, prior, guess.values, size);
    information = sum.information;
    const step = solve(information, size, sum.right);
    const worst = advance(guess, step, normals, data, information, size);
    onRound(round + 1);
    if (rough > 1) continue;
    const settled = worst < SETTLED;
    if (settled && measured >= MEASURED) {
      converged = true;
      break;
    }
    // A faulty thermocouple may be what keeps the search from settling: look for it all the same.
    const near = worst <= 1;
    if (measured >= MEASURED || (!near && round <= ROUGH.length)) continue;
    const left = leftover(data, columns, normals, step, bins, s, noise_K, estimator);
    if (left.length === 0) continue;
    const typical = median(left.map((one) => one.rms_K));
    residual_K = Math.sqrt(mean(left.map((one) => one.rms_K ** 2)));
    // One at a time: it bends what its neighbours are held against.
    const oddest = left.reduce((a, b) => (b.rms_K > a.rms_K ? b : a));
    if (oddest.rms_K > ODD_K && oddest.rms_K > ODD_TIMES * typical) {
      const own = data[oddest.string] as StringData;
      own.used[oddest.sensor] = false;
      const id = own.string.thermocouples[oddest.sensor]?.id ?? '';
      leftOut.push({ id, residual_K: oddest.rms_K });
      measured = 0;
      continue;
    }
    if (!near) continue;
    measured++;
    noise_K = Math.max(
      LEAST_NOISE_K,
      Math.sqrt(mean(left.map((one) => one.even_K ** 2 * one.lasting))),
    );
  }
  return {
    values: guess.values,
    covariance: inverse(information, size),
    size,
    residual_K,
    noise_K,
    leftOut,
    iterations: round,
    converged,
  };
}

function storeGuess(v: Float64Array): StoreGuess {
  return {
    transfer: v[0] as number,
    conductivity: v[1] as number,
    loss: v[2] as number,
    share: v[3] as number,
    chargeInlet_K: v[4] as number,
    dischargeInlet_K: v[5] as number,
    meterSlope: v[6] as number,
    lag_s: v[7] as number,
    wallSteel: v[8] as number,
  };
}

function leftover(
  data: readonly StringData[],
  columns: readonly StringColumns[],
  normals: readonly StringNormal[],
  step: Float64Array,
  bins: readonly TuneBin[],
  s: number,
  noise_K: number,
  estimator: EstimatorDefinition,
): ({ string: number; sensor: number } & SensorResidual)[] {
  return data.flatMap((one, k) => {
    const part = partOf(step, k);
    const own = (normals[k] as StringNormal).own(part);
    const full = new Float64Array(KEPT + own.length);
    full.set(part);
    full.set(own, KEPT);
    const left = sensorResiduals(
      one,
      columns[k] as StringColumns,
      full,
      bins,
      s,
      noise_K,
      estimator,
    );
    return left.flatMap((residual, sensor) =>
      residual === null || !one.used[sensor] ? [] : [{ string: k, sensor, ...residual }],
    );
  });
}

const mean = (values: readonly number[]): number =>
  values.reduce((sum, v) => sum + v, 0) / Math.max(1, values.length);

function median(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[sorted.length >> 1] ?? Number.NaN;
}
