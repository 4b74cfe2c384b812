import { ZERO_CELSIUS_K } from '../units.js';
import type { CycleRecord, StoreRun } from './cycleRecord.js';

/** [K] -> [degC], rounded to 0.001 K. */
const celsius = (kelvin: number | null): number | null =>
  kelvin === null ? null : Math.round((kelvin - ZERO_CELSIUS_K) * 1000) / 1000;

function storeView(run: StoreRun) {
  const { outlet_from_K, outlet_to_K, hottest_K, coldest_K, widths, flow_factors, ...rest } = run;
  return {
    ...rest,
    outlet_from_degC: celsius(outlet_from_K),
    outlet_to_degC: celsius(outlet_to_K),
    hottest_degC: celsius(hottest_K),
    coldest_degC: celsius(coldest_K),
    widths: widths.map((width) => ({ ...width })),
    flow_factors: { ...flow_factors },
  };
}

/** A run as people and programs see it: temperatures in degC, everything else as in the record. */
export function cycleView(record: CycleRecord) {
  const { ambient_mean_K, stores, incomplete, raised, told, indicators, ...rest } = record;
  return {
    ...rest,
    incomplete: [...incomplete],
    ambient_mean_degC: celsius(ambient_mean_K) as number,
    stores: Object.fromEntries(Object.entries(stores).map(([id, run]) => [id, storeView(run)])),
    raised: [...raised],
    // Records kept before it was noted have none.
    told: told ?? null,
    indicators: indicators.map((indicator) => ({ ...indicator })),
  };
}
export type CycleView = ReturnType<typeof cycleView>;

type Cell = number | string | null;

const OF_UNIT = [
  ...['unit', 'no', 'kind', 'from', 'to', 'running_h', 'incomplete', 'drawn_MWh_el'],
  ...['delivered_MWh_el', 'power_most_MW_el', 'flow_mean_kg_s', 'soc_from', 'soc_to'],
  ...['ambient_mean_degC', 'round_trip', 'round_trip_from', 'told_made'],
  ...['told_power_MW_el', 'told_end', 'told_firm_end', 'raised', 'degraded'],
];
const OF_STORE = [
  ...(['soc_from', 'soc_to', 'stored_from_MWh_th', 'stored_to_MWh_th'] as const),
  ...([
    'stored_sigma_MWh_th',
    'carried_MWh_th',
    'lost_MWh_th',
    'lost_sigma_MWh_th',
    'outlet_from_degC',
  ] as const),
  ...(['outlet_to_degC', 'hottest_degC', 'coldest_degC', 'heat_transfer_factor'] as const),
  ...(['heat_transfer_factor_sigma', 'thermocouples_rejected'] as const),
];
const AT_PLACE = ['width_m', 'width_sigma_m', 'spread_ratio'] as const;

/**
 * Runs as rows: of each store `STORE.soc_from` and so on, `STORE.width_m_at_P_m` at each place, and of
 * each string `STORE.STRING.flow_factor`. Lists are words separated by spaces.
 */
export function cycleRows(runs: readonly CycleView[]): {
  columns: string[];
  rows: Record<string, Cell>[];
} {
  const columns = new Set(OF_UNIT);
  const rows = runs.map((run) => {
    const row: Record<string, Cell> = {
      ...{ unit: run.unit, no: run.no, kind: run.kind, from: run.from, to: run.to },
      ...{ running_h: run.running_h, incomplete: run.incomplete.join(' ') || null },
      ...{ drawn_MWh_el: run.drawn_MWh_el, delivered_MWh_el: run.delivered_MWh_el },
      ...{ power_most_MW_el: run.power_most_MW_el, flow_mean_kg_s: run.flow_mean_kg_s },
      ...{ soc_from: run.soc_from, soc_to: run.soc_to, ambient_mean_degC: run.ambient_mean_degC },
      ...{ round_trip: run.round_trip, round_trip_from: run.round_trip_over?.from ?? null },
      ...{ told_made: run.told?.made ?? null, told_power_MW_el: run.told?.power_MW_el ?? null },
      ...{ told_end: run.told?.end ?? null, told_firm_end: run.told?.firm_end ?? null },
      raised: run.raised.join(' ') || null,
      degraded: degradedOf(run) || null,
    };
    for (const [id, store] of Object.entries(run.stores)) {
      for (const name of OF_STORE) row[`${id}.${name}`] = store[name];
      for (const width of store.widths) {
        for (const name of AT_PLACE) row[`${id}.${name}_at_${width.place_m}_m`] = width[name];
      }
      for (const [string, factor] of Object.entries(store.flow_factors)) {
        row[`${id}.${string}.flow_factor`] = factor;
      }
    }
    for (const name of Object.keys(row)) columns.add(name);
    return row;
  });
  return { columns: [...columns], rows };
}

function degradedOf({ indicators }: CycleView): string {
  const degraded = indicators.filter(({ state }) => state === 'degraded');
  return degraded.map(({ kind, subject }) => `${kind}/${subject}`).join(' ');
}
