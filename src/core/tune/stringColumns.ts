import type { EstimatorDefinition } from '../definitions.js';
import { NUISANCE } from './priors.js';
import { type RunPlan, runStore, type StoreGuess, type StringRun } from './simulate.js';
import { type StringData, type StringState, stringGuess } from './stringData.js';

/** Columns of one string in the order [store parameters | own flow | own states | linear nuisance]. */
export interface StringColumns {
  readonly run: StringRun;
  /** Derivatives of the readings, each bins x sensors. */
  readonly columns: readonly Float64Array[];
  /** Prior sigma of each column behind the store's parameters and own flow, and its present value. */
  readonly sigmas: readonly number[];
  readonly values: readonly number[];
}

/** Steps of the difference quotients: small against a front, large against rounding. */
const PROBE = {
  transfer: 0.02,
  conductivity: 0.05,
  loss: 0.1,
  chargeInlet_K: 0.5,
  dischargeInlet_K: 0.5,
  meterSlope: 0.004,
  wallSteel: 0.1,
} as const;
const PROBE_FLOW = 0.002;

/** Derivatives by the hats, by hat and string: slow to make, and they hardly change. */
export type HatColumns = readonly (readonly Float64Array[])[];

function quotients(runs: readonly StringRun[], others: readonly StringRun[], step: number) {
  return others.map((other, k) => {
    const run = runs[k] as StringRun;
    return other.value.map((v, i) => (v - (run.value[i] as number)) / step);
  });
}

/** Each string's answer to its own hats: one run raises the same hat of every string. */
export function hatColumns(
  plan: RunPlan,
  data: readonly StringData[],
  guess: StoreGuess,
  states: readonly StringState[],
): HatColumns {
  const with_ = (raised: number) =>
    runStore(
      plan,
      guess,
      data.map((one, k) => stringGuess(one, states[k] as StringState, raised)),
    );
  const runs = with_(-1);
  const count = data[0]?.hatSigma_K.length ?? 0;
  return Array.from({ length: count }, (_, h) => quotients(runs, with_(h), 1));
}

/** All columns of all strings of a store about a guess. */
export function storeColumns(
  plan: RunPlan,
  data: readonly StringData[],
  guess: StoreGuess,
  states: readonly StringState[],
  hats: HatColumns,
  estimator: EstimatorDefinition,
): StringColumns[] {
  const own = data.map((one, k) => stringGuess(one, states[k] as StringState));
  const runs = runStore(plan, guess, own);
  const ofStore = (key: keyof typeof PROBE) =>
    quotients(runs, runStore(plan, { ...guess, [key]: guess[key] + PROBE[key] }, own), PROBE[key]);
  const transfer = ofStore('transfer');
  const conductivity = ofStore('conductivity');
  const loss = ofStore('loss');
  const charge = ofStore('chargeInlet_K');
  const discharge = ofStore('dischargeInlet_K');
  const slope = ofStore('meterSlope');
  const steel = ofStore('wallSteel');
  const more = own.map((one) => ({ ...one, flow: one.flow + PROBE_FLOW }));
  const flow = quotients(runs, runStore(plan, guess, more), PROBE_FLOW);
  return data.map((one, k) => {
    const run = runs[k] as StringRun;
    const state = states[k] as StringState;
    const share = run.value.map((_, i) => -(run.lag[i] as number) * (run.slope[i] as number));
    const at = (of: readonly Float64Array[]) => of[k] as Float64Array;
    const stored = [transfer, conductivity, loss].map(at);
    const columns = [
      ...stored,
      share,
      ...[charge, discharge, slope].map(at),
      run.rate.map((rate) => -rate),
      ...[steel, flow].map(at),
      at(transfer),
      at(conductivity),
      ...hats.map(at),
      ...runColumns(plan, one, run, (way) => NUISANCE.runWay * way),
      ...(one.rim ? runColumns(plan, one, run, () => NUISANCE.rimShift_m) : []),
      ...knotColumns(plan, one),
    ];
    const shifts = one.rim ? 2 * one.runs : one.runs;
    const sigmas = [
      NUISANCE.stringTransfer,
      one.rim && data.length > 1 ? NUISANCE.rimConductivity : NUISANCE.stringConductivity,
      ...one.hatSigma_K,
      ...Array.from({ length: shifts }, () => 1),
      ...Array.from({ length: one.knots }, () => estimator.group_offset_sigma_K),
    ];
    const linear = Array.from({ length: shifts + one.knots }, () => 0);
    const values = [state.transfer, state.conductivity, ...state.hats, ...linear];
    return { run, columns, sigmas, values };
  });
}

/** A string's front runs ahead of its model in each run, by a sigma that may grow with the way. */
function runColumns(
  plan: RunPlan,
  data: StringData,
  run: StringRun,
  sigma_m: (way_m: number) => number,
): Float64Array[] {
  const n = data.positions_m.length;
  return Array.from({ length: data.runs }, (_, r) => {
    const column = new Float64Array(run.value.length);
    for (let b = 0; b < plan.bins.length; b++) {
      if (data.runOf[b] !== r) continue;
      const way = sigma_m(data.way_m[b] as number);
      for (let j = 0; j < n; j++) column[b * n + j] = -way * (run.slope[b * n + j] as number);
    }
    return column;
  });
}

/** The offset that a group shares, straight between knots of time. */
function knotColumns(plan: RunPlan, data: StringData): Float64Array[] {
  const n = data.positions_m.length;
  return Array.from({ length: data.knots }, (_, k) => {
    const column = new Float64Array(plan.bins.length * n);
    for (let b = 0; b < plan.bins.length; b++) {
      const w = data.knotWeight[b] as number;
      const height = data.knot[b] === k ? 1 - w : data.knot[b] === k - 1 ? w : 0;
      if (height > 0) column.fill(height, b * n, (b + 1) * n);
    }
    return column;
  });
}
