import { enthalpyAt } from '../bed/tables.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { streamsOf } from './streams.js';
import { leakSigma, type TubeModel, type TubeState } from './tube.js';
import { unseenSigma } from './unseenFlow.js';

const J_PER_MWH = 3.6e9;

export interface StoreEnergy {
  /** Enthalpy above the discharged reference over that between the references [-], not clamped. */
  readonly soc: number;
  readonly soc_sigma: number;
  readonly stored_MWh_th: number;
  readonly stored_sigma_MWh_th: number;
  readonly capacity_MWh_th: number;
  /** The part of soc_sigma from flow that no string sees [-]. */
  readonly unseen: number;
  /**
   * Variance of the area-weighted sum over that of fully correlated tubes: how much of the tubes'
   * errors is shared [-].
   */
  readonly correlation: number;
  /** The same variance over that of independent tubes, >= 1 [-]. */
  readonly shared_over_independent: number;
}

/** H at the charged and at the discharged reference [J/m3 of bed]. */
export function referenceEnthalpies(model: StoreModel): { charged: number; discharged: number } {
  const hot = enthalpyAt(model.tables, model.store.reference_hot_K);
  const cold = enthalpyAt(model.tables, model.store.reference_cold_K);
  return model.store.kind === 'hot'
    ? { charged: hot, discharged: cold }
    : { charged: cold, discharged: hot };
}

/**
 * Energy of a store from its tubes.
 *
 * soc = sum_k w_k mean_i (H_ki - H_d)/(H_c - H_d), w_k the area shares. Its variance: each tube's is
 * e'P e with e_i = C_i/(N (H_c - H_d)). What tubes have in common (a card, an inlet's thermocouple,
 * the meter) makes their errors correlated: cause c of variance p_c explains a_kc = cov(soc_k, c)/
 * sqrt(p_c) of tube k, and
 *
 *   var = sum_k w_k^2 var_k + 2 sum_(k<l) w_k w_l sum_c a_kc a_lc rho_c,   rho_c = sqrt(p_kc p_lc)/p_0
 *
 * p_0 the variance before any reading: each tube learns a cause from its own readings, so that of
 * two tubes' errors in it only the part p/p_0 that neither has seen is still the same one.
 *
 * Stored energy carries the uncertainty of the rock's heat capacity on top, which the state of
 * charge, a ratio, does not.
 */
export function storeEnergy(model: StoreModel, state: StoreState): StoreEnergy {
  const { charged, discharged } = referenceEnthalpies(model);
  const span = charged - discharged;
  const bed = model.store.bed;
  const capacity = (Math.abs(span) * bed.area_m2 * bed.length_m) / J_PER_MWH;
  let soc = 0;
  for (const { share, enthalpy } of streamsOf(model, state)) {
    let sum = 0;
    for (const h of enthalpy) sum += h - discharged;
    soc += (share * sum) / (enthalpy.length * span);
  }
  const tubes = model.tubes.map((tube, k) => tubeVariance(tube, state.tubes[k] as TubeState, span));
  let aligned = 0;
  let squares = 0;
  let shared = 0;
  model.tubes.forEach((tube, k) => {
    const w = tube.string.area_share;
    const own = tubes[k] as TubeVariance;
    aligned += w * Math.sqrt(own.variance);
    squares += w * w * own.variance;
    for (let l = 0; l < k; l++) {
      const other = tubes[l] as TubeVariance;
      shared += 2 * w * (model.tubes[l] as TubeModel).string.area_share * common(own, other);
    }
  });
  const variance = Math.max(squares + shared, squares / Math.max(1, tubes.length));
  const unseen = unseenSigma(model, state);
  const soc_sigma = Math.hypot(Math.sqrt(variance), unseen);
  const capacitySigma = model.tubes[0]?.estimator.heat_capacity_sigma ?? 0;
  return {
    soc,
    soc_sigma,
    stored_MWh_th: soc * capacity,
    stored_sigma_MWh_th: capacity * Math.hypot(soc_sigma, soc * capacitySigma),
    capacity_MWh_th: capacity,
    unseen,
    correlation: aligned > 0 ? Math.min(1, variance / (aligned * aligned)) : 1,
    shared_over_independent: squares > 0 ? Math.max(1, variance / squares) : 1,
  };
}

interface TubeVariance {
  /** Of the tube's state of charge. */
  readonly variance: number;
  /** By cause: what it explains, as a standard deviation with a sign, and p/p_0. */
  readonly causes: ReadonlyMap<string, { readonly part: number; readonly unseen: number }>;
}

/** Covariance of two tubes' states of charge through what they have in common. */
function common(a: TubeVariance, b: TubeVariance): number {
  let sum = 0;
  for (const [name, own] of a.causes) {
    const other = b.causes.get(name);
    if (other === undefined) continue;
    sum += own.part * other.part * Math.min(1, Math.sqrt(own.unseen * other.unseen));
  }
  return sum;
}

function tubeVariance(tube: TubeModel, state: TubeState, span: number): TubeVariance {
  const { layout, estimator } = tube;
  const { cells, size } = layout;
  const p = state.covariance;
  const e = new Float64Array(cells);
  for (let i = 0; i < cells; i++) {
    e[i] = heatCapacityAt(tube, state.enthalpy[i] as number) / (cells * span);
  }
  const variance = quadratic(p, size, e);
  const causes = new Map<string, { part: number; unseen: number }>();
  const add = (name: string, index: number, prior: number): void => {
    const own = p[index * size + index] as number;
    if (!(own > 0) || !(prior > 0)) return;
    causes.set(name, {
      part: projected(p, index * size, e) / Math.sqrt(own),
      unseen: own / (prior * prior),
    });
  };
  add('flow', layout.flow, estimator.flow_factor_sigma);
  add('transfer', layout.transfer, estimator.heat_transfer_factor_sigma);
  add('share', layout.share, estimator.gas_share_sigma);
  add('charge_inlet', layout.inlet.charge_inlet, estimator.inlet_sigma_K);
  add('discharge_inlet', layout.inlet.discharge_inlet, estimator.inlet_sigma_K);
  add('leak', layout.leak, leakSigma(tube));
  layout.groups.forEach((name, g) => {
    add(`group ${name}`, layout.group + g, estimator.group_offset_sigma_K);
  });
  return { variance: Math.max(variance, 0), causes };
}

/** e'P e over the cells. P is symmetric: rows for columns, contiguous. */
function quadratic(p: Float64Array, size: number, e: Float64Array): number {
  let variance = 0;
  let i = 0;
  // Four rows at a time: their sums do not wait for one another.
  for (; i + 4 <= e.length; i += 4) {
    const row = i * size;
    let s0 = 0;
    let s1 = 0;
    let s2 = 0;
    let s3 = 0;
    for (let j = 0, at = row; j < e.length; j++, at++) {
      const own = e[j] as number;
      s0 += own * (p[at] as number);
      s1 += own * (p[at + size] as number);
      s2 += own * (p[at + 2 * size] as number);
      s3 += own * (p[at + 3 * size] as number);
    }
    variance += (e[i] as number) * s0;
    variance += (e[i + 1] as number) * s1;
    variance += (e[i + 2] as number) * s2;
    variance += (e[i + 3] as number) * s3;
  }
  for (; i < e.length; i++) variance += (e[i] as number) * projected(p, i * size, e);
  return variance;
}

/** Covariance of the sum over the cells that `e` weighs with the state whose row begins at `row`. */
function projected(p: Float64Array, row: number, e: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < e.length; i++) sum += (e[i] as number) * (p[row + i] as number);
  return sum;
}

function heatCapacityAt(tube: TubeModel, enthalpy: number): number {
  const { tables } = tube;
  const s = Math.min(tables.segments - 1, Math.max(0, Math.floor(enthalpy * tables.inverse_dH)));
  return tables.heatCapacity[s] as number;
}
