/** Places of a store's own parameters in its vector; ln(true/metered flow) of each string follows. */
export const STORE_PARAMETERS = [
  'transfer',
  'conductivity',
  'loss',
  'share',
  'chargeInlet_K',
  'dischargeInlet_K',
  'meterSlope',
  'lag_s',
  'wallSteel',
] as const;
export type StoreParameter = (typeof STORE_PARAMETERS)[number];

/** Result of one store's fit: the vector above, its covariance (row-major), and how it fits. */
export interface StoreFit {
  readonly values: Float64Array;
  readonly covariance: Float64Array;
  readonly size: number;
  /** What is left at the thermocouples once everything was fitted, rms [K]. */
  readonly residual_K: number;
  /** Effective noise of one bin's reading, in which what is left is correlated in time [K]. */
  readonly noise_K: number;
  /** Thermocouples that the model cannot follow, left out, with what they leave [K]. */
  readonly leftOut: readonly { readonly id: string; readonly residual_K: number }[];
  readonly iterations: number;
  readonly converged: boolean;
}
