import type { CycleScan } from './cycleScan.js';

/** A store at an edge of a run. */
export interface StoreEnd {
  readonly id: string;
  readonly length_m: number;
  readonly soc: number;
  readonly capacity_MWh_th: number;
  readonly stored_sigma_MWh_th: number;
  readonly soc_lasting: number;
  readonly soc_passing: number;
  readonly heat_transfer_factor: number;
  readonly heat_transfer_factor_sigma: number;
  readonly flow_factors: Readonly<Record<string, number>>;
  readonly thermocouples_rejected: number;
}

/** The unit at an edge of a run. Plain. */
export interface Ends {
  readonly time_ms: number;
  readonly soc: number;
  readonly stores: readonly StoreEnd[];
}

export function endsOf(scan: CycleScan): Ends {
  return {
    time_ms: scan.time_ms,
    soc: scan.soc,
    stores: scan.stores.map((store) => ({
      id: store.id,
      length_m: store.length_m,
      soc: store.soc,
      capacity_MWh_th: store.capacity_MWh_th,
      stored_sigma_MWh_th: store.stored_sigma_MWh_th,
      soc_lasting: store.soc_lasting,
      soc_passing: store.soc_passing,
      heat_transfer_factor: store.heat_transfer_factor,
      heat_transfer_factor_sigma: store.heat_transfer_factor_sigma,
      flow_factors: store.flow_factors,
      thermocouples_rejected: store.thermocouples_rejected,
    })),
  };
}

/** Half-way between two scans, where a change between them most likely was; factors are those before it. */
export function between(a: Ends, b: Ends): Ends {
  return {
    time_ms: Math.floor((a.time_ms + b.time_ms) / 2),
    soc: (a.soc + b.soc) / 2,
    stores: a.stores.map((store, s) => ({
      ...store,
      soc: (store.soc + (b.stores[s] as StoreEnd).soc) / 2,
    })),
  };
}

/** Mean of the stores' states of charge [-]. */
export function meanCharge({ stores }: Ends): number {
  return stores.reduce((sum, { soc }) => sum + soc, 0) / stores.length;
}
