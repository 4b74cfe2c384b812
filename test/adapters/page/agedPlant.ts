import type { Mode } from '../../../src/core/definitions.js';
import type { WatchView } from '../../../src/core/watch/causes.js';
import type { CycleRecord, StoreRun } from '../../../src/core/watch/cycleRecord.js';
import type { IndicatorKind, IndicatorView } from '../../../src/core/watch/indicator.js';
import { COLD, HOT, unitOf } from '../http/scriptedDefinitions.js';
import { ScriptedPlant } from '../http/scriptedPlant.js';

/**
 * A scripted plant with two days behind it: 7 h charging, 5 h standing, 6 h discharging, 6 h standing,
 * profiles and views of the watch every 10 min. Dust comes into the hot store 20 h before the end and is
 * decided 8 h later. Between 30 h and 26 h before the end nothing was stored.
 */

const HOURS = 48;
const STEP_H = 1 / 6;
export const GAP_H = { from: 30, to: 26 } as const;
export const DUST_H = 20;
export const DECIDED_H = 12;

/** State of charge and mode some hours before the end. */
function momentAt(back_h: number): { charged: number; mode: Mode } {
  const hour = (((HOURS - back_h) % 24) + 24) % 24;
  if (hour < 7) return { mode: 'charge', charged: 0.15 + (0.7 * hour) / 7 };
  if (hour < 12) return { mode: 'stand', charged: 0.85 };
  if (hour < 18) return { mode: 'discharge', charged: 0.85 - (0.7 * (hour - 12)) / 6 };
  return { mode: 'stand', charged: 0.15 };
}

const isStored = (back_h: number) => back_h > GAP_H.from || back_h < GAP_H.to;

function indicator(
  kind: IndicatorKind,
  subject: string,
  parts: Partial<IndicatorView>,
): IndicatorView {
  return {
    kind,
    subject,
    ...{ value: 1, sigma: 0.02, unit: '-', healthy: 1, healthy_from: 'learned', limit: 1.3 },
    ...{
      deadband: 0.05,
      on_delay_s: 600,
      off_delay_s: 600,
      score: 0,
      state: 'normal',
      reason: null,
    },
    ...{ time: null, sentence: `Store ${subject}: ${kind} in a whole sentence.` },
    ...parts,
  };
}

/** Heat transfer of the hot store falls from 0.93 to 0.31 within 8 h. */
function watchAt(back_h: number, time: string): WatchView {
  const fallen = Math.min(1, Math.max(0, (DUST_H - back_h) / (DUST_H - DECIDED_H)));
  const degraded = back_h <= DECIDED_H;
  const unknown = { value: null, sigma: null, state: 'undetermined' as const };
  const strings = (store: string) =>
    ['A', 'B', 'C'].map((string, i) =>
      indicator('string_flow', `${store}/${string}`, {
        ...{ value: 1 + 0.01 * i, healthy: 1, limit: 1.06, sigma: 0.01 },
      }),
    );
  const indicators = [
    indicator('spread_ratio', 'hot', { value: 1.02 + 0.2 * fallen, score: 0.5 * fallen }),
    indicator('heat_transfer', 'hot', {
      value: 0.93 - 0.62 * fallen,
      sigma: 0.03,
      healthy: 0.93,
      limit: 0.65,
      score: fallen,
      state: degraded ? 'degraded' : 'normal',
      time,
    }),
    ...strings('hot'),
    indicator('standing_loss', 'hot', { ...unknown, limit: 1.6, reason: 'not_exercised' }),
    indicator('spread_ratio', 'cold', { value: 1.04 }),
    indicator('heat_transfer', 'cold', { value: 0.95, healthy: 0.95, limit: 0.66 }),
    ...strings('cold'),
    indicator('settling', 'cold', {
      ...unknown,
      unit: 'm',
      healthy: 0,
      limit: 0.43,
      reason: 'not_instrumented',
    }),
    indicator('gas_inventory', 'north', {
      ...unknown,
      healthy: 0,
      limit: 0.03,
      reason: 'learning',
    }),
  ];
  const causes: WatchView['causes'] = degraded
    ? [
        {
          ...{ cause: 'dust_or_fines', subject: 'hot', probability: 0.83 },
          evidence: [
            'For it: heat transfer has fallen.',
            'Against it, so far: pressure drop is as ever.',
          ],
          check: 'filters and screens of the gas loop',
        },
        {
          ...{ cause: 'channelling', subject: 'hot', probability: 0.11 },
          evidence: ['Not explained by it: heat transfer has fallen.'],
          check: 'the level and slope of the rock at the manhole',
        },
      ]
    : [];
  return { time, unit: 'north', indicators, causes };
}

function storeRun(width_m: number): StoreRun {
  return {
    ...{ soc_from: 0.15, soc_to: 0.85, stored_from_MWh_th: 6, stored_to_MWh_th: 35 },
    ...{
      stored_sigma_MWh_th: 0.2,
      carried_MWh_th: 29.4,
      lost_MWh_th: 0.4,
      lost_sigma_MWh_th: null,
    },
    ...{ outlet_from_K: 300, outlet_to_K: 310, hottest_K: 730, coldest_K: 298 },
    ...{ heat_transfer_factor: 0.93, heat_transfer_factor_sigma: 0.03, thermocouples_rejected: 2 },
    flow_factors: { A: 1.02, B: 1, C: 0.99 },
    widths: [0.25, 0.5, 0.75].map((share) => ({
      ...{ place_m: 8 * share, share, width_m: width_m + share, width_sigma_m: 0.05 },
      spread_ratio: 1.1,
    })),
  };
}

function run(no: number, kind: Mode, from: string, to: string, width_m: number): CycleRecord {
  return {
    ...{ unit: 'north', no, kind, from, to, incomplete: [], running_h: 7 },
    ...{ drawn_MWh_el: 14, delivered_MWh_el: 0, power_most_MW_el: 2, flow_mean_kg_s: 12 },
    ...{ soc_from: 0.15, soc_to: 0.85, ambient_mean_K: 283, raised: [], told: null },
    ...{ round_trip: null, round_trip_over: null, indicators: [] },
    stores: { hot: storeRun(width_m), cold: storeRun(width_m) },
  };
}

/** @param ill false: nothing has changed */
export function agedPlant(ill = true): ScriptedPlant {
  const plant = new ScriptedPlant([unitOf('north', 'North unit', [HOT, COLD])]);
  const timeOf = (back_h: number) => plant.time(-Math.round(back_h * 120));
  for (let back_h = HOURS; back_h >= 0; back_h = Math.round((back_h - STEP_H) * 6) / 6) {
    if (!isStored(back_h)) continue;
    plant.scans = -Math.round(back_h * 120);
    plant.moment = momentAt(back_h);
    const { profile, estimate, flow_kg_s, power_MW_el } = plant.now('north')!;
    plant.storedMoments.push({ profile: profile!, estimate, flow_kg_s, power_MW_el });
    plant.storedWatch.push(watchAt(ill ? back_h : HOURS, timeOf(back_h)));
  }
  plant.scans = 0;
  plant.moment = { charged: 0.62, mode: 'discharge' };
  plant.watched = watchAt(ill ? 0 : HOURS, plant.time());
  plant.runs.push(
    run(1, 'charge', timeOf(48), timeOf(41), 0.5),
    run(2, 'discharge', timeOf(36), timeOf(30), 0.6),
    run(3, 'charge', timeOf(24), timeOf(17), 0.8),
  );
  return plant;
}
