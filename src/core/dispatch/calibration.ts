import type { Direction } from '../definitions.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import { streamsOf } from '../track/streams.js';
import type { TubeState } from '../track/tube.js';
import type { UnitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { type Gaussian, independent, observe, transformed } from './gaussian.js';
import { STRING_FLOW_SIGMA, sharedSigma, varianceNow } from './heatBalance.js';
import type { HeatCapacity } from './heatCapacity.js';
import { machineSpread } from './machineSpread.js';

/** What meter, rock and machine are together taken to be, for a discharge at one power. */
export interface Calibration {
  /**
   * Per store ln(travel per metered kilogram over that of the model), then
   * ln(work per metered kilogram over that of the model at rated flow), discharging and, where asked
   * for, charging: joint, one vector.
   */
  readonly joint: Gaussian;
  /** Heat capacity of each store's rock. */
  readonly capacity: readonly HeatCapacity[];
}

/**
 * Error of a flow meter of the usual classes: +/-2 % of the reading, and as much again from no load
 * to rated flow, as two sigmas.
 */
export const METER_SIGMA = 0.01;
export const METER_SLOPE_SIGMA = 0.01;
/**
 * A meter may be fouled or moved, which is likelier than rock of four sigmas: its sigma is at least
 * this share of the mean ln(flow factor) of the stores.
 */
const METER_BROKEN = 0.5;
/** Relative load of a direction in which nothing was learned yet. */
const USUAL_LOAD = 0.9;

/**
 * Joint linear-Gaussian estimate of what a meter, the rock and the machine share. With, in ln,
 * b the meter (true over metered flow) and its slope with load r, c_s the heat capacity of store s,
 * e_d the work of the machine in direction d:
 *
 *   travel per metered kilogram   ln f_s  = b + slope r - c_s      the tubes' mean flow factor
 *   work per metered kilogram     ln k_d  = b + slope r_d + e_d    the learned machine factor
 *
 * Hours need f_s/k_discharge, from which the meter drops out; they rest on the rock and on the
 * machine. Priors are the classes of the instruments, `heat_capacity_sigma` and the spread of the
 * machine, whose errors in charging and discharging hang together (see machineSpread). A store's heat
 * balances, in place of its tubes once they tell more, share an error n_s: ln f_s + n_s is what they
 * measure.
 *
 * @param load flow of the discharge asked about, over rated flow [-]
 * @param chargeLoad the same of a charge; null: none is asked about
 */
export function calibrate(
  model: UnitModel,
  state: UnitState,
  load: number,
  chargeLoad: number | null = null,
): Calibration {
  const spread = machineSpread(model.unit);
  const stores = model.stores.length;
  const travel = model.stores.map((store, s) => meanFlow(store, state.stores[s] as StoreState));
  const shown = travel.reduce((sum, f) => sum + f.log, 0) / stores;
  const sigmaC = model.unit.estimator.heat_capacity_sigma;
  // b, slope, c_1 .. c_n, e_charge, e_discharge, and what the balances of a store share: n_1 .. n_n
  const charge = 2 + stores;
  const discharge = charge + 1;
  const g = independent([
    Math.max(METER_SIGMA, METER_BROKEN * Math.abs(shown)) ** 2,
    METER_SLOPE_SIGMA ** 2,
    ...model.stores.map(() => sigmaC ** 2),
    spread.variance.charge,
    spread.variance.discharge,
    ...model.stores.map((store) => sharedSigma(store) ** 2),
  ]);
  (g.covariance[charge] as Float64Array)[discharge] = spread.covariance;
  (g.covariance[discharge] as Float64Array)[charge] = spread.covariance;
  const row = (entries: Readonly<Record<number, number>>): number[] =>
    Array.from({ length: 4 + 2 * stores }, (_, i) => entries[i] ?? 0);
  const loadOf = (d: Direction): number => {
    const { flow_kg_s } = state.factors[d];
    return flow_kg_s > 0 ? flow_kg_s / spread.ratedFlow_kg_s : USUAL_LOAD;
  };
  // The tubes' factors are of the flow that moved the fronts last.
  const last: Direction =
    state.factors.discharge.age_s < state.factors.charge.age_s ? 'discharge' : 'charge';
  travel.forEach((f, s) => {
    const runs = (['charge', 'discharge'] as const).flatMap((d) => {
      const run = state.balances[s]?.last[d] ?? null;
      return run === null ? [] : [{ d, ...run }];
    });
    // The tubes' factors come from the same thermometers: they count until a run has told more.
    if (
      runs.every(
        (run) => varianceNow(run) + sharedSigma(model.stores[s] as StoreModel) ** 2 > f.variance,
      )
    ) {
      observe(g, row({ 0: 1, 1: loadOf(last), [2 + s]: -1 }), f.log, f.variance);
      return;
    }
    for (const run of runs) {
      const entries = { 0: 1, 1: loadOf(run.d), [2 + s]: -1, [discharge + 1 + s]: 1 };
      observe(g, row(entries), run.log, varianceNow(run));
    }
  });
  for (const d of ['charge', 'discharge'] as const) {
    const { log, variance } = state.factors[d];
    if (variance === null) continue;
    const r = loadOf(d);
    // Learned in part load, the loop's loss adds what it is not known to follow.
    const loss = spread.partLoad[d] * spread.partLoadSigma * (r * r - load * load);
    const noise = variance + spread.outlets[d] ** 2 + (d === 'discharge' ? loss ** 2 : 0);
    observe(g, row({ 0: 1, 1: r, [d === 'charge' ? charge : discharge]: 1 }), log, noise);
  }
  if (state.factors.discharge.variance === null) {
    const loss = spread.partLoad.discharge * spread.partLoadSigma * (1 - load * load);
    (g.covariance[discharge] as Float64Array)[discharge]! += loss * loss;
  }
  return {
    // Made where it is asked for: each scan asks for the capacity alone.
    get joint() {
      return transformed(g, [
        ...model.stores.map((_, s) => row({ 0: 1, 1: load, [2 + s]: -1 })),
        row({ 0: 1, 1: load, [discharge]: 1 }),
        ...(chargeLoad === null ? [] : [row({ 0: 1, 1: chargeLoad, [charge]: 1 })]),
      ]);
    },
    capacity: model.stores.map((_, s) => ({
      log: g.mean[2 + s] as number,
      sigma: Math.sqrt(Math.max(0, g.covariance[2 + s]?.[2 + s] as number)),
    })),
  };
}

/**
 * Area-mean flow factor of a store, the layers at the wall with it: all the gas that was metered
 * passes through the whole cross-section.
 */
export function meanFlowFactor(model: StoreModel, state: StoreState): number {
  return streamsOf(model, state).reduce((sum, s) => sum + s.share * s.flowFactor, 0);
}

/**
 * ln of a store's mean flow factor, with what the strings' places leave open. All tubes read the
 * same thermometers at the inlets: what of a tube's variance these explain adds up as one, the rest as
 * independent,
 *
 *   var = sum w^2 (v - v_i) + (sum w sqrt(v_i))^2,     v_i = P_fi^2/P_ii
 */
function meanFlow(store: StoreModel, state: StoreState): { log: number; variance: number } {
  let own = 0;
  let shared = 0;
  store.tubes.forEach((tube, k) => {
    const { flow, inlet, size } = tube.layout;
    const p = (state.tubes[k] as TubeState).covariance;
    const w = tube.string.area_share;
    const v = p[flow * size + flow] as number;
    const explained = [inlet.charge_inlet, inlet.discharge_inlet].reduce((sum, i) => {
      const variance = p[i * size + i] as number;
      return variance > 0 ? sum + (p[flow * size + i] as number) ** 2 / variance : sum;
    }, 0);
    const common = Math.min(v, explained);
    own += w * w * (v - common + STRING_FLOW_SIGMA ** 2);
    shared += w * Math.sqrt(common);
  });
  return { log: Math.log(meanFlowFactor(store, state)), variance: own + shared * shared };
}
