/** What `tune` tells of one store, and of the unit. */
export const STORE_TUNABLES = [
  'heat_transfer',
  'conductivity',
  'loss',
  'heat_capacity',
  'gas_share',
  'front_travel',
] as const;
export const UNIT_TUNABLES = ['true_over_metered_flow', 'work_charge', 'work_discharge'] as const;
export type Tunable = (typeof STORE_TUNABLES)[number] | (typeof UNIT_TUNABLES)[number];

/** Why a recording does not determine a value. */
export const TUNE_REASONS = [
  'meter_or_heat_capacity',
  'no_string_near_wall',
  'no_standing',
  'no_steep_front_standing',
  'front_too_still',
  'no_power_that_way',
  'tells_less_than_known',
  'moves_with_another',
] as const;
export type TuneReason = (typeof TUNE_REASONS)[number];

/** One value: a factor on what the configuration says, or a share. */
export interface TuneRow {
  /** Id of the store, null for the unit's own. */
  readonly store: string | null;
  readonly name: Tunable;
  /** Factor: times the configuration's correlation or value, that tuned before included; share: itself. */
  readonly value: number;
  /** Standard error: of a factor relative to it, of a share absolute. Both null: nothing to say. */
  readonly sigma: number | null;
  /** The same before the recording. */
  readonly prior_sigma: number | null;
  readonly determined: boolean;
  readonly reason: TuneReason | null;
  /** The row that it moves with most, and by how much. */
  readonly with: { readonly row: number; readonly correlation: number } | null;
}

/** How one store's recording was followed. */
export interface TuneFitQuality {
  readonly store: string;
  readonly residual_K: number;
  readonly converged: boolean;
  readonly left_out: readonly { readonly id: string; readonly residual_K: number }[];
}

/** Everything that tuning one unit gives. */
export interface TuneResult {
  readonly unit: string;
  readonly from: string;
  readonly to: string;
  readonly hours: Readonly<Record<'charge' | 'discharge' | 'stand', number>>;
  /** Other stretches of the recording, parted by gaps, and their hours: not used. */
  readonly other_stretches: number;
  readonly other_hours: number;
  readonly rows: readonly TuneRow[];
  /** Of all rows with each other, in their order; 0 with a row that tells nothing. */
  readonly correlations: readonly (readonly number[])[];
  readonly fits: readonly TuneFitQuality[];
  /** Factors for the configuration that go with each other, null where not determined or settled. */
  readonly configure: TuneConfigure;
}

/** What goes into the configuration: factors as a whole, to be written there together. */
export interface TuneConfigure {
  readonly work_factor: Readonly<Record<'charge' | 'discharge', number | null>>;
  readonly stores: readonly {
    readonly id: string;
    readonly heat_transfer: number | null;
    readonly conductivity: number | null;
    readonly loss: number | null;
    readonly heat_capacity: number | null;
    readonly gas_share: number | null;
  }[];
}

/** Why nothing can be tuned at all. */
export const TUNE_REFUSALS = [
  'no_rows',
  'too_short',
  'no_flow',
  'no_thermocouples',
  'cannot_follow',
] as const;
export type TuneRefusal = (typeof TUNE_REFUSALS)[number];
