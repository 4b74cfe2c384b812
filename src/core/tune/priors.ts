import type { EstimatorDefinition } from '../definitions.js';

/**
 * What is believed before a recording is looked at: one sigma each, about the configuration. Those of
 * the instruments come from the configuration; the rest from the spread of published data.
 */
export interface TunePriors {
  /** In ln. */
  readonly transfer: number;
  readonly conductivity: number;
  readonly loss: number;
  readonly capacity: number;
  readonly meter: number;
  readonly machine: number;
  readonly share: number;
}

/**
 * ln of the bed conductivity: published correlations and measurements of packed beds with radiation
 * lie within a factor of 1.5 of each other (VDI Heat Atlas D6.3 gives +/-30 %).
 */
const CONDUCTIVITY_SIGMA = 0.4;
/** ln of the losses of a vessel as built against its insulation as drawn: a factor of 1.6, judgement. */
const LOSS_SIGMA = 0.5;

/** Priors of a unit's factors. */
export function tunePriors(estimator: EstimatorDefinition): TunePriors {
  return {
    transfer: estimator.heat_transfer_factor_sigma,
    conductivity: CONDUCTIVITY_SIGMA,
    loss: LOSS_SIGMA,
    capacity: estimator.heat_capacity_sigma,
    meter: estimator.flow_factor_sigma,
    machine: estimator.machine_factor_sigma,
    share: estimator.gas_share_sigma,
  };
}

/** Prior mean and sigma of all junctions' mean gas share [-] and lag [s]: thermowells of 30 to 180 s. */
export const JUNCTION = { share: 0.5, shareSigma: 0.15, lag_s: 100, lagSigma_s: 40 } as const;

/** Spread of what is no result but must not bend one; SI, one sigma. */
export const NUISANCE = {
  /** Gas share of one junction: anything between 0 and 1, so 0.5 +/- 0.29; lag of its thermowell [s]. */
  share: 0.29,
  lag_s: 45,
  /** A thermocouple's tolerance is an offset below 375 degC and a gain beyond (IEC 60584-1). */
  gainReach_K: 375,
  /** An offset shared by a card or cold junction wanders within the day: a knot of time each [s]. */
  groupKnot_s: 6 * 3600,
  /** ln(true/metered) changes with load by so much from no load to the mean: class 1 of flow meters. */
  meterSlope: 0.01,
  /**
   * Isotherms leave the shape of the model as the front travels, in 0.3 m pieces: metres per root
   * metre of way, as the tracker's process noise has it.
   */
  shape_m: 0.02,
  /** Share of the way by which a string's front runs ahead of its model within one run. */
  runWay: 0.006,
  /**
   * ln of heat transfer and conductivity that one string shows against the store's: unlike flow in
   * the rings around it widens and narrows its front, of which the model knows nothing. Beside the wall
   * conduction across speaks louder than that along: there it is left to itself.
   */
  stringTransfer: 0.04,
  stringConductivity: 0.2,
  rimConductivity: 0.9,
  /**
   * A string samples one or two rings of its part of the bed: ln of its flow against that part's mean.
   * Rings differ by 3 % at most, 1.5 % one sigma; two halve the variance.
   */
  stringFlow: 0.012,
  /**
   * ln of the heat capacity of the wall that takes part: flanges, the first centimetres of insulation.
   */
  wallSteel: 0.1,
  /**
   * Beside the wall a front lags or leads by what steel and rock there exchange, a decimetre or two;
   * models of it differ by half of that. Shift of the outermost string's front in a run, and the part
   * of it that one thermocouple sees alone [m].
   */
  rimShift_m: 0.06,
  /**
   * While a front passes a thermocouple no model follows it to better than some millimetres, alike for
   * the ten bins or so that it takes: 6 mm times the root of ten [m].
   */
  front_m: 0.02,
  /**
   * ln of the losses that models of wall, steel and rings beside it differ by: five treatments of the
   * same recordings of the finer plant gave 0.4 less to 0.4 more, and a bias of 0.3 stayed.
   */
  lossModel: 0.45,
} as const;
