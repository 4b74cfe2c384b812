import type { UnitDefinition } from '../../core/definitions.js';
import { type Estimate, QUALITIES } from '../../core/estimate.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';

/** What a scan adds to its estimate in the history. */
export interface Measured {
  readonly flow_kg_s: number | null;
  readonly power_MW_el: number | null;
}

const MODES: readonly Estimate['mode'][] = ['discharge', 'stand', 'charge'];
/** Series of words; stored as their place in these lists. */
const WORDS: Readonly<Record<string, readonly string[]>> = { mode: MODES, quality: QUALITIES };

const STORE_SERIES = [
  'soc',
  'soc_sigma',
  'stored_MWh_th',
  'stored_sigma_MWh_th',
  'front_m',
  'front_sigma_m',
  'width_m',
  'width_sigma_m',
  'energy_position_m',
  'spread_ratio',
  'heat_transfer_factor',
  'heat_transfer_factor_sigma',
  'outlet_degC',
  'sensors_used',
  'sensors_rejected',
] as const;
const STRING_SERIES = ['flow_factor', 'position_m', 'width_m'] as const;

/**
 * Names of the series of a unit, in the order in which their values are stored:
 * `state_of_charge`, `mode`, `quality`, `flow_kg_s`, `power_MW_el`; per store `STORE.soc` and so on
 * (STORE_SERIES; front and width are those of the first front); per string
 * `STORE.STRING.flow_factor`, `.position_m`, `.width_m`; and for each power of `hours_at`
 * `hours_p90_at_P_MW`, `hours_p50_at_P_MW`, `hours_p10_at_P_MW`, where the scan computed them.
 */
export function seriesNames(unit: UnitDefinition): string[] {
  const stores = unit.stores.flatMap((store) => [
    ...STORE_SERIES.map((name) => `${store.id}.${name}`),
    ...store.strings.flatMap((string) =>
      STRING_SERIES.map((name) => `${store.id}.${string.id}.${name}`),
    ),
  ]);
  const hours = unit.hours_at_W.flatMap((power_W) =>
    ['p90', 'p50', 'p10'].map((quantile) => `hours_${quantile}_at_${power_W / 1e6}_MW`),
  );
  const site = ['state_of_charge', 'mode', 'quality', 'flow_kg_s', 'power_MW_el'];
  return [...site, ...stores, ...hours];
}

/** The values of `seriesNames(unit)` in an estimate; NaN where there is none. */
export function seriesValues(
  unit: UnitDefinition,
  estimate: Estimate,
  measured: Measured,
): Float64Array {
  const values: (number | null | undefined)[] = [
    estimate.state_of_charge,
    MODES.indexOf(estimate.mode),
    QUALITIES.indexOf(estimate.quality),
    measured.flow_kg_s,
    measured.power_MW_el,
  ];
  for (const { id, strings } of unit.stores) {
    const store = estimate.stores[id];
    const front = store?.fronts[0];
    values.push(
      store?.soc,
      store?.soc_sigma,
      store?.stored_MWh_th,
      store?.stored_sigma_MWh_th,
      front?.position_m,
      front?.position_sigma_m,
      front?.width_m,
      front?.width_sigma_m,
      store?.energy_position_m,
      store?.spread_ratio,
      store?.heat_transfer_factor,
      store?.heat_transfer_factor_sigma,
      store?.outlet_K == null ? null : store.outlet_K - ZERO_CELSIUS_K,
      store?.sensors.used,
      store?.sensors.rejected.length,
    );
    for (const string of strings) {
      const found = store?.strings.find((one) => one.id === string.id);
      values.push(found?.flow_factor, found?.position_m, found?.width_m);
    }
  }
  for (const power_W of unit.hours_at_W) {
    const answer = estimate.dispatch?.find((one) => one.power_MW === power_W / 1e6);
    values.push(answer?.hours.p90, answer?.hours.p50, answer?.hours.p10);
  }
  return Float64Array.from(values, (value) => value ?? Number.NaN);
}

/** The words of a series of words, undefined for one of numbers. */
export function wordsOf(name: string): readonly string[] | undefined {
  return Object.hasOwn(WORDS, name) ? WORDS[name] : undefined;
}
