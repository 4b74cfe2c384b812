import type { Direction } from '../definitions.js';
import { referenceEnthalpies, type StoreEnergy } from '../track/storeEnergy.js';
import { meanTemperatureAt, meanTemperatures, mixedOutlet } from '../track/storeEstimate.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import { lastingShare } from './lasting.js';

/** ln of a ratio and its variance when it was measured; see `varianceNow`. */
export interface Measured {
  readonly log: number;
  readonly variance: number;
  /** Time since [s]; absent in a state saved before it was counted = 0. */
  age_s?: number;
}

/** Heat balance of a store over the present run in one direction, and what the last runs gave. */
export interface HeatBalance {
  direction: Direction | null;
  /** State of charge at the run's start and its sigma. */
  soc: number;
  soc_sigma: number;
  /** Of its variance, as far as strings see it: what lasts over the run, and what does not. */
  lasting: number;
  passing: number;
  /** Share of the variance that lasts as last worked out, and the state of charge then (-1 = never). */
  share: number;
  share_soc: number;
  /** Heat in the wall's steel then, and since what the metered gas has brought and what was lost [J]. */
  steel: number;
  metered: number;
  lost: number;
  readonly last: Record<Direction, Measured | null>;
}

/** A balance that has seen nothing: the first step with a direction begins its run. */
export function startHeatBalance(): HeatBalance {
  return {
    direction: null,
    soc: 0,
    soc_sigma: 0,
    lasting: 0,
    passing: 0,
    share: 0,
    share_soc: -1,
    steel: 0,
    metered: 0,
    lost: 0,
    last: { charge: null, discharge: null },
  };
}

/** A run tells something once the state of charge has changed by so much. */
const LEAST_CHANGE = 0.15;
/** Before that it begins anew where the state of charge has become so much surer. */
const SURER = 0.8;
const SHARE_STEP = 0.01;
/** What the balance leaves out: the steel of the ends (0.2 % of a full store), a fifth of the losses. */
const LEFT_OUT = 0.004;
/** Thermometers at the two ends: +/-1 K each. */
const GAS_SIGMA_K = 0.7;
/**
 * Gas flows faster and slower in the rings of a bed of random packing, by 1 to 2 % (common
 * practice); a string shows that of its own place. One sigma of its deviation from its tube's mean.
 */
export const STRING_FLOW_SIGMA = 0.01;
/**
 * Meter and rock move on: a meter fouls as a machine does, by one to two per cent in some weeks
 * (common practice, no source), 0.1 % in an hour and 0.5 % in a day as a random walk; rock settles
 * and breaks far more slowly.
 */
const WALK_PER_SQRT_H = 0.001;

/** What one scan tells the balance of a store; `inlet_K` is that of the gas which enters it [K]. */
export interface BalanceStep {
  /** null where it stands or the flow is not known. */
  readonly direction: Direction | null;
  /** Metered, of either sign [kg/s]. */
  readonly flow_kg_s: number;
  readonly inlet_K: number;
  readonly ambient_K: number;
  readonly dt_s: number;
}

/**
 * One scan of a store's heat balance. Over a run in one direction
 *
 *   f = (E_full (soc_1 - soc_0) + what the wall's steel took + losses)/(integral of m cp (T_in - T_out) dt)
 *
 * is the travel per metered kilogram over that of the model, as the tubes' flow factors are: these
 * follow the last hour or so, the balance weighs the whole run. Its variance is that of the change
 * of the state of charge at the strings: what lasts of its two errors (offsets, see `lastingShare`) is
 * in both and counts by its difference, as for constants that a filter learns, cov(1, 0) = var(1),
 *
 *   var = (p_0 + p_1 + |l_0 - l_1|)/(soc_1 - soc_0)^2
 *
 * What all runs of a store have in common, the rings that no string sees among it, is `sharedSigma`.
 */
export function stepHeatBalance(
  model: StoreModel,
  state: StoreState,
  balance: HeatBalance,
  energy: StoreEnergy,
  step: BalanceStep,
): void {
  const { direction } = step;
  for (const last of Object.values(balance.last)) {
    if (last !== null) last.age_s = (last.age_s ?? 0) + step.dt_s;
  }
  // A state saved before errors were told apart: the run begins anew.
  if (!Number.isFinite(balance.passing)) balance.direction = null;
  const change = energy.soc - balance.soc;
  const surer = Math.abs(change) < LEAST_CHANGE && energy.soc_sigma < SURER * balance.soc_sigma;
  if (direction === null || direction !== balance.direction || surer) {
    balance.direction = direction;
    balance.soc = energy.soc;
    balance.soc_sigma = energy.soc_sigma;
    if (direction !== null) Object.assign(balance, errorsOf(model, state, balance, energy));
    balance.steel = steelOf(model, state);
    balance.metered = 0;
    balance.lost = 0;
    return;
  }
  const outlet = mixedOutlet(model, state);
  if (!Number.isFinite(outlet)) return;
  const { bed } = model.store;
  const { charged, discharged } = referenceEnthalpies(model);
  const full_J = (charged - discharged) * bed.area_m2 * bed.length_m;
  const cp = bed.fluid.heatCapacity((step.inlet_K + outlet) / 2);
  const heat = Math.abs(step.flow_kg_s) * cp * (step.inlet_K - outlet);
  balance.metered += heat * step.dt_s;
  balance.lost += lossOf(model, state, step.ambient_K) * step.dt_s;
  if (Math.abs(change) < LEAST_CHANGE) return;
  const beside = balance.lost + steelOf(model, state) - balance.steel;
  const ratio = (change * full_J + beside) / balance.metered;
  if (!(ratio > 0.2 && ratio < 5)) return;
  const now = errorsOf(model, state, balance, energy);
  const variance =
    (balance.passing + now.passing + Math.abs(balance.lasting - now.lasting)) / change ** 2;
  balance.last[direction] = { log: Math.log(ratio), variance, age_s: 0 };
}

/**
 * The variance of the state of charge by how long its causes last. Their shares are worked out anew
 * with every per cent of it, since that costs a tenth of a scan.
 */
function errorsOf(
  model: StoreModel,
  state: StoreState,
  balance: HeatBalance,
  energy: StoreEnergy,
): Pick<HeatBalance, 'lasting' | 'passing'> {
  const seen = Math.max(0, energy.soc_sigma ** 2 - energy.unseen ** 2);
  if (!(Math.abs(energy.soc - balance.share_soc) < SHARE_STEP)) {
    balance.share = lastingShare(model, state);
    balance.share_soc = energy.soc;
  }
  const lasting = seen * balance.share;
  return { lasting, passing: seen - lasting };
}

/**
 * One sigma of what is the same in all balances of a store, charging or discharging, in ln: the gas
 * thermometers at its ends, what the balance leaves out, and the flow at the strings' places, whose
 * fronts lead or lag the store's mean by the same share of their way in either direction. No number
 * of runs averages it away.
 */
export function sharedSigma(model: StoreModel): number {
  const span = model.store.reference_hot_K - model.store.reference_cold_K;
  const squares = model.tubes.reduce((sum, tube) => sum + tube.string.area_share ** 2, 0);
  return Math.hypot(GAS_SIGMA_K / span, LEFT_OUT, STRING_FLOW_SIGMA * Math.sqrt(squares));
}

/** Variance of a balance today: as measured, and as meter and rock may have moved on since. */
export function varianceNow(measured: Measured): number {
  return measured.variance + (WALK_PER_SQRT_H ** 2 * (measured.age_s ?? 0)) / 3600;
}

/** Heat in the wall's steel [J] above 0 K, 0 where none is modelled. */
function steelOf(model: StoreModel, state: StoreState): number {
  const { bed } = model.store;
  const steel = state.wall?.steel_K;
  if (steel === undefined) return 0;
  const mean = steel.reduce((sum, T) => sum + T, 0) / steel.length;
  return mean * (bed.wall_capacity_J_m2K ?? 0) * Math.PI * bed.diameter_m * bed.length_m;
}

/** Heat lost through mantle and ends, as modelled [W]. */
function lossOf(model: StoreModel, state: StoreState, ambient_K: number): number {
  const { bed } = model.store;
  const beside = state.wall?.steel_K ?? meanTemperatures(model, state);
  const mantle = beside.reduce((sum, T) => sum + T, 0) / beside.length - ambient_K;
  const first = meanTemperatureAt(model, state, 0);
  const last = meanTemperatureAt(model, state, model.x_m.length - 1);
  const ends =
    bed.end_loss_W_m2K.charge_inlet * (first - ambient_K) +
    bed.end_loss_W_m2K.discharge_inlet * (last - ambient_K);
  return (
    bed.loss_factor *
    (bed.wall_loss_W_m2K * Math.PI * bed.diameter_m * bed.length_m * mantle + bed.area_m2 * ends)
  );
}
