import type { ReportData } from '../../../src/core/report/reportData.js';
import type { CycleRecord, StoreRun } from '../../../src/core/watch/cycleRecord.js';
import type { IndicatorView } from '../../../src/core/watch/indicator.js';

export const FROM = Date.parse('2026-01-01T00:00:00Z');
const H = 3_600_000;
const iso = (hours: number) => new Date(FROM + hours * H).toISOString();

export function indicator(part: Partial<IndicatorView>): IndicatorView {
  return {
    ...{ kind: 'heat_transfer', subject: 'cold', value: 0.31, sigma: 0.03, unit: '-' },
    ...{ healthy: 0.9, healthy_from: 'learned', limit: 0.7, deadband: 0.1, on_delay_s: 0 },
    ...{ off_delay_s: 0, score: 1, state: 'degraded', reason: null, time: iso(10) },
    sentence: 'Store cold: heat transfer is 0.31 of 0.90.',
    ...part,
  };
}

export function run(part: Partial<StoreRun> = {}): StoreRun {
  return {
    ...{ soc_from: 0.2, soc_to: 0.7, stored_from_MWh_th: 10, stored_to_MWh_th: 35 },
    ...{ stored_sigma_MWh_th: 0.1, carried_MWh_th: 25.2, lost_MWh_th: 0.2 },
    lost_sigma_MWh_th: 0.05,
    widths: [{ share: 0.5, place_m: 4.6, width_m: 0.8, width_sigma_m: 0.05, spread_ratio: 1.02 }],
    ...{ outlet_from_K: 300, outlet_to_K: 310, hottest_K: 733, coldest_K: 298 },
    ...{ heat_transfer_factor: 0.9, heat_transfer_factor_sigma: 0.05 },
    ...{ flow_factors: { axis: 1.01, rim: 0.98 }, thermocouples_rejected: 0 },
    ...part,
  };
}

const toldFor = (hour: number) => ({
  ...{ made: iso(hour + 0.1), power_MW_el: 1, end: iso(hour + 6.25), firm_end: iso(hour + 5.5) },
});

/** Runs of six hours each, one after the other: charge, stand, discharge. */
export function cycles(count: number, part: Partial<CycleRecord> = {}): CycleRecord[] {
  return Array.from({ length: count }, (_, i): CycleRecord => {
    const kind = (['charge', 'stand', 'discharge'] as const)[i % 3] as CycleRecord['kind'];
    return {
      ...{ unit: 'u', no: i, kind, from: iso(6 * i), to: iso(6 * i + 6), incomplete: [] },
      running_h: 6,
      drawn_MWh_el: kind === 'charge' ? 12 : 0,
      delivered_MWh_el: kind === 'discharge' ? 6 : 0,
      ...{ power_most_MW_el: 2, flow_mean_kg_s: kind === 'stand' ? null : 20 },
      ...{ soc_from: 0.2, soc_to: 0.7, ambient_mean_K: 288, stores: { hot: run(), cold: run() } },
      raised: [],
      told: kind === 'discharge' ? toldFor(6 * i) : null,
      round_trip: kind === 'discharge' ? 0.5 : null,
      round_trip_over: null,
      indicators: [],
      ...part,
    };
  });
}

/** A report of a plant that is well. */
export function report(part: Partial<ReportData> = {}): ReportData {
  const stores = (['hot', 'cold'] as const).map((id) => ({
    ...{ id, kind: id, length_m: 9.2, strings: ['axis', 'rim'] },
    ...{ reference_hot_K: id === 'hot' ? 733 : 298, reference_cold_K: id === 'hot' ? 298 : 144 },
  }));
  return {
    ...{ site: 'Site', unit: 'u', unit_name: 'Unit <one>', version: '0' },
    ...{ from: iso(0), to: iso(72), made: iso(80), rated: { power_MW_el: 1.8, hours: 6 }, stores },
    readings: {
      scans: 8640,
      quality: { good: 8600, degraded: 40, blind: 0, stale: 0 },
      ...{ longest_gap_h: 0, missing_h: 0, thinned_before: null, thinned_to_s: 600 },
    },
    series: Array.from({ length: 60 }, (_, i) => ({
      ...{ time: iso(1.2 * i), state_of_charge: i / 60, power_MW_el: 1 },
      stores: Object.fromEntries(
        stores.map(({ id }) => [
          id,
          {
            ...{ soc: i / 70, width_m: 0.8, spread_ratio: 1, heat_transfer_factor: 0.9 },
            flow_factors: { axis: 1, rim: 1 },
          },
        ]),
      ),
    })),
    cycles: cycles(12),
    profiles: [],
    sensors: stores.flatMap(({ id, strings }) =>
      strings.flatMap((string) =>
        [0.5, 4.6].map((position_m) => ({
          ...{ id: `${id}_${string}_${position_m}`, store: id, string, position_m, group: null },
          ...{ now: null, verdicts: [] },
        })),
      ),
    ),
    indicators: [indicator({ state: 'normal', score: 0, value: 0.9 })],
    causes: [],
    ...{ events: [], older_events_left_out: false, degraded_at_start: [], alarms: null },
    ...part,
  };
}
