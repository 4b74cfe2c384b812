import { enthalpyAt } from '../bed/tables.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { streamsOf } from './streams.js';
import type { TubeModel, TubeState } from './tube.js';
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
 * e'P e with e_i = C_i/(N (H_c - H_d)); the part that comes from what the tubes share (card and
 * inlet offsets, the meter) adds up as if one, the rest as independent:
 *
 *   var = sum w^2 var (1 - s) + (sum w sqrt(var s))^2
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
  let independent = 0;
  let common = 0;
  let aligned = 0;
  let squares = 0;
  for (const { share, enthalpy } of streamsOf(model, state)) {
    let sum = 0;
    for (const h of enthalpy) sum += h - discharged;
    soc += (share * sum) / (enthalpy.length * span);
  }
  model.tubes.forEach((tube, k) => {
    const tubeState = state.tubes[k] as TubeState;
    const w = tube.string.area_share;
    const { variance, shared } = tubeVariance(tube, tubeState, span);
    independent += w * w * variance * (1 - shared);
    common += w * Math.sqrt(variance * shared);
    aligned += w * Math.sqrt(variance);
    squares += w * w * variance;
  });
  const variance = independent + common * common;
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

/** Variance of one tube's state of charge, and the share of it that other tubes have in common. */
function tubeVariance(
  tube: TubeModel,
  state: TubeState,
  span: number,
): { variance: number; shared: number } {
  const { cells, size } = tube.layout;
  const p = state.covariance;
  const e = new Float64Array(cells);
  for (let i = 0; i < cells; i++) {
    e[i] = heatCapacityAt(tube, state.enthalpy[i] as number) / (cells * span);
  }
  const projected = new Float64Array(size);
  for (let i = 0; i < cells; i++) {
    const a = e[i] as number;
    for (let j = 0; j < size; j++) {
      projected[j] = (projected[j] as number) + a * (p[i * size + j] as number);
    }
  }
  let variance = 0;
  for (let i = 0; i < cells; i++) variance += (e[i] as number) * (projected[i] as number);
  variance = Math.max(variance, 0);
  const commonStates = [
    tube.layout.flow,
    tube.layout.inlet.charge_inlet,
    tube.layout.inlet.discharge_inlet,
    ...tube.layout.groups.map((_, g) => tube.layout.group + g),
  ];
  let explained = 0;
  for (const index of commonStates) {
    const own = p[index * size + index] as number;
    if (own > 0) explained += (projected[index] as number) ** 2 / own;
  }
  return { variance, shared: variance > 0 ? Math.min(1, explained / variance) : 0 };
}

function heatCapacityAt(tube: TubeModel, enthalpy: number): number {
  const { tables } = tube;
  const s = Math.min(tables.segments - 1, Math.max(0, Math.floor(enthalpy * tables.inverse_dH)));
  return tables.heatCapacity[s] as number;
}
