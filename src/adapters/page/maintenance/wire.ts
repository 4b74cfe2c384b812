import type { Mode } from '../../../core/definitions.js';
import type { WatchView } from '../../../core/watch/causes.js';
import type { IndicatorKind, IndicatorView } from '../../../core/watch/indicator.js';
import type { EstimateState, Profile, StoreProfile, Tube } from '../lib/wire.js';

/** What the server sends for maintenance; a test holds it against the server's schemas. */

export type Indicator = Omit<IndicatorView, 'only_while_cold'>;

/** What the indicators show, and what is probably behind it. */
export type Watch = Omit<WatchView, 'indicators'> & {
  readonly indicators: readonly Indicator[];
  readonly age_s: number | null;
  readonly stale: boolean;
};

type Column = (number | null)[];

/** An indicator over time; each column has an entry for each of the answer's times. */
export interface IndicatorCourse {
  kind: IndicatorKind;
  subject: string;
  unit: string;
  value: Column;
  sigma: Column;
  healthy: Column;
  limit: Column;
  deadband: Column;
  score: Column;
  state: (IndicatorView['state'] | null)[];
}

export interface WatchHistory {
  from: string;
  to: string;
  thinned: boolean;
  every_s: number;
  times: string[];
  indicators: IndicatorCourse[];
}

/** A charge, stand or discharge that is over. */
export interface Run {
  no: number;
  kind: Mode;
  from: string;
  to: string;
  incomplete: string[];
  running_h: number;
  stores: Record<
    string,
    {
      soc_from: number;
      soc_to: number;
      heat_transfer_factor: number;
      heat_transfer_factor_sigma: number;
      flow_factors: Record<string, number>;
      thermocouples_rejected: number;
      widths: {
        share: number;
        width_m: number | null;
        width_sigma_m: number | null;
        spread_ratio: number | null;
      }[];
    }
  >;
}

export interface Runs {
  from: string;
  to: string;
  older_left_out: boolean;
  cycles: Run[];
}

/** What was the case at a moment that is past. */
interface Past {
  time: string;
  estimate: EstimateState | null;
  flow_kg_s: number | null;
  power_MW_el: number | null;
}

export type PastProfile = Past & Pick<Profile, 'stores'>;

/** A moment of many: without sigmas where they were not asked for. */
export type PlayedMoment = Past & {
  stores: Record<
    string,
    Omit<StoreProfile, 'tubes'> & {
      tubes: (Omit<Tube, 'sigma_K'> & { sigma_K?: number[] | undefined })[];
    }
  >;
};

export interface Playback {
  from: string;
  to: string;
  thinned: boolean;
  every_s: number;
  profiles: PlayedMoment[];
}

/** What the loss (or the repair) of a thermocouple would do. */
export interface SensorWorth {
  stores: {
    store: string;
    sensors: { id: string; in_use: boolean; rise: number; most_in: Mode | null }[];
  }[];
}
