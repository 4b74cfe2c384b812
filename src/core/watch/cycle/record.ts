import type { Mode } from '../../definitions.js';
import type { CycleRecord, StoreRun, ToldRunEnd, WidthAtPlace } from '../cycleRecord.js';
import type { IndicatorView } from '../indicator.js';
import type { ToldEnd } from '../runEnd.js';
import type { CycleRules } from './cycleScan.js';
import type { StoreEnd } from './ends.js';
import type { RoundTrip } from './moments.js';
import { PLACES } from './places.js';
import type { Stretch } from './stretch.js';

/** What stands beside the sums of a run when it is over. */
export interface RunOver {
  readonly no: number;
  readonly mode: Mode;
  /** It was under way when the log began. */
  readonly begunBefore: boolean;
  readonly trip: RoundTrip | null;
  readonly indicators: readonly IndicatorView[];
}

const known = (value: number | null | undefined): number | null =>
  value === null || value === undefined || !Number.isFinite(value) ? null : value;

/** The record of a run that is over. */
export function recordOf(rules: CycleRules, stretch: Stretch, over: RunOver): CycleRecord {
  const { mode, trip } = over;
  const { start, end } = stretch;
  const own = stretch.modes[mode];
  const powerRead = stretch.power_most_MW >= 0;
  const incomplete: CycleRecord['incomplete'][number][] = [];
  if (over.begunBefore) incomplete.push('began_before');
  if (stretch.gap) incomplete.push('gap');
  if (stretch.flow_unknown_s > rules.gap_s) incomplete.push('flow_unknown');
  if (!powerRead || stretch.power_unknown_s > rules.gap_s) incomplete.push('power_unknown');
  const time = (ms: number) => new Date(ms).toISOString();
  return {
    unit: rules.unit,
    no: over.no,
    kind: mode,
    from: time(start.time_ms),
    to: time(end.time_ms),
    incomplete,
    running_h: (own?.seconds ?? 0) / 3600,
    drawn_MWh_el: powerRead ? stretch.drawn_MWh : null,
    delivered_MWh_el: powerRead ? stretch.delivered_MWh : null,
    power_most_MW_el: powerRead ? stretch.power_most_MW : null,
    flow_mean_kg_s: mode === 'stand' || !own || own.flow_s === 0 ? null : own.flow_kg / own.flow_s,
    soc_from: known(start.soc),
    soc_to: known(end.soc),
    ambient_mean_K: stretch.ambient_Ks / stretch.seconds,
    stores: Object.fromEntries(end.stores.map(({ id }, s) => [id, storeRun(stretch, mode, s)])),
    raised: stretch.raised,
    told: mode === 'discharge' && stretch.told ? toldOf(stretch.told) : null,
    round_trip: trip?.efficiency ?? null,
    round_trip_over:
      trip === null
        ? null
        : {
            from: time(trip.from_ms),
            drawn_MWh_el: trip.drawn_MWh_el,
            delivered_MWh_el: trip.delivered_MWh_el,
            soc_left: Object.fromEntries(
              end.stores.map(({ id }, s) => [id, trip.soc_left[s] as number]),
            ),
          },
    indicators: over.indicators,
  };
}

function toldOf({ made_ms, power_W, end_ms, firm_ms }: ToldEnd): ToldRunEnd {
  const time = (ms: number) => new Date(ms).toISOString();
  return {
    made: time(made_ms),
    power_MW_el: power_W / 1e6,
    end: time(end_ms),
    firm_end: time(firm_ms),
  };
}

function storeRun(stretch: Stretch, mode: Mode, s: number): StoreRun {
  const start = stretch.start.stores[s] as StoreEnd;
  const end = stretch.end.stores[s] as StoreEnd;
  const sums = stretch.stores[s] as Stretch['stores'][number];
  const own = stretch.modes[mode];
  // What is found of the heat capacity meanwhile is no change of the stored heat.
  const from = start.soc * end.capacity_MWh_th;
  const to = end.soc * end.capacity_MWh_th;
  const outlet = mode === 'stand' ? null : (own?.outlets[s] ?? null);
  const lost = sums.carried_MWh - (to - from);
  const widths = (mode === 'stand' ? [] : (own?.places[s] ?? [])).flatMap(
    (at, i): WidthAtPlace[] =>
      at === null
        ? []
        : [
            {
              place_m: (PLACES[i] as number) * end.length_m,
              share: PLACES[i] as number,
              width_m: at.width_m,
              width_sigma_m: at.width_sigma_m,
              spread_ratio: at.spread_ratio,
            },
          ],
  );
  return {
    soc_from: start.soc,
    soc_to: end.soc,
    stored_from_MWh_th: from,
    stored_to_MWh_th: to,
    stored_sigma_MWh_th: end.stored_sigma_MWh_th,
    carried_MWh_th: stretch.flowed ? sums.carried_MWh : null,
    lost_MWh_th: known(lost),
    lost_sigma_MWh_th:
      mode === 'stand' ? known(end.capacity_MWh_th * changeSigma(start, end)) : null,
    widths,
    outlet_from_K: known(outlet?.from_K),
    outlet_to_K: known(outlet?.to_K),
    hottest_K: known(sums.hottest_K),
    coldest_K: known(sums.coldest_K),
    heat_transfer_factor: end.heat_transfer_factor,
    heat_transfer_factor_sigma: end.heat_transfer_factor_sigma,
    flow_factors: end.flow_factors,
    thermocouples_rejected: end.thermocouples_rejected,
  };
}

/**
 * Sigma of a change of the state of charge over a stand, as of a run in `heatBalance.ts`: what lasts of
 * the two errors is in both and counts by its difference, sqrt(p_0 + p_1 + |l_0 - l_1|). What passes is
 * taken as independent at the two ends, though a filter remembers some of it.
 */
function changeSigma(start: StoreEnd, end: StoreEnd): number {
  const lasting = Math.abs(start.soc_lasting - end.soc_lasting);
  return Math.sqrt(start.soc_passing + end.soc_passing + lasting);
}
