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
  // P is symmetric: rows for columns, contiguous.
  const projectedOn = (index: number): number => {
    let sum = 0;
    for (let i = 0; i < cells; i++) sum += (e[i] as number) * (p[index * size + i] as number);
    return sum;
  };
  let variance = 0;
  for (let i = 0; i < cells; i++) variance += (e[i] as number) * projectedOn(i);
  const causes = new Map<string, { part: number; unseen: number }>();
  const add = (name: string, index: number, prior: number): void => {
    const own = p[index * size + index] as number;
    if (!(own > 0) || !(prior > 0)) return;
    causes.set(name, { part: projectedOn(index) / Math.sqrt(own), unseen: own / (prior * prior) });
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

function heatCapacityAt(tube: TubeModel, enthalpy: number): number {
  const { tables } = tube;
  const s = Math.min(tables.segments - 1, Math.max(0, Math.floor(enthalpy * tables.inverse_dH)));
  return tables.heatCapacity[s] as number;
}
