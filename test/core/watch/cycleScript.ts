import type { Mode } from '../../../src/core/definitions.js';
import type { CycleScan, CycleStoreScan } from '../../../src/core/watch/cycle/cycleScan.js';
import {
  type CycleLogState,
  cycleRules,
  startCycleLog,
  stepCycleLog,
} from '../../../src/core/watch/cycleLog.js';
import type { CycleRecord } from '../../../src/core/watch/cycleRecord.js';
import { unitOf } from './units.js';

/** Length of the scripted stores [m], and heat between their references [MWh_th]. */
export const LENGTH_M = 8;
export const CAPACITY_MWh = 20;
/** Stored heat per electricity, charging and discharging. */
export const HEAT_PER_DRAWN = 1.5;
export const HEAT_PER_GIVEN = 2.4;

/** What the unit does for some scans. */
export interface Part {
  readonly mode: Mode;
  readonly scans: number;
  /** Power's size [MW]; changes within a run are part loads. */
  readonly power_MW?: number;
}

export interface ScriptOptions {
  readonly scan_period_s?: number;
  readonly soc?: number;
  /** Changes a scan: what is missing, flickers or is noisy. */
  change?(scan: CycleScan, index: number): CycleScan;
}

const START_MS = Date.UTC(2026, 4, 1);

/** Scans of a unit with two stores that follow its power exactly: a scan's values hold since the last. */
export function script(parts: readonly Part[], options: ScriptOptions = {}): CycleScan[] {
  const { scan_period_s = 60, soc = 0.1, change } = options;
  const scans: CycleScan[] = [];
  let charge = soc;
  let time_ms = START_MS;
  for (const { mode, scans: many, power_MW = mode === 'stand' ? 0 : 2 } of parts) {
    for (let i = 0; i < many; i++) {
      const hours = scan_period_s / 3600;
      const sense = mode === 'charge' ? 1 : mode === 'discharge' ? -1 : 0;
      const heat_MW =
        mode === 'charge'
          ? power_MW * HEAT_PER_DRAWN
          : -Math.abs(sense) * power_MW * HEAT_PER_GIVEN;
      time_ms += scan_period_s * 1000;
      charge += (heat_MW * hours) / CAPACITY_MWh;
      const store = (id: string): CycleStoreScan => ({
        id,
        length_m: LENGTH_M,
        soc: charge,
        capacity_MWh_th: CAPACITY_MWh,
        stored_sigma_MWh_th: 0.1,
        soc_lasting: 9e-6 + charge * 1e-6,
        soc_passing: 1e-6,
        carried_MW: heat_MW,
        position_m: charge * LENGTH_M,
        width_m: 0.5 + charge,
        width_sigma_m: 0.02,
        spread_ratio: 1 + charge / 10,
        outlet_K: sense === 0 ? null : 300 + 100 * charge,
        hottest_K: 700 + charge,
        coldest_K: 300 - charge,
        heat_transfer_factor: 1,
        heat_transfer_factor_sigma: 0.1,
        flow_factors: { a: 1 },
        thermocouples_rejected: 0,
      });
      const scan: CycleScan = {
        time_ms,
        mode,
        ...{ read: true, bedRead: true, modeRead: true, flowKnown: true },
        flow_kg_s: sense * 10 * power_MW,
        power_MW: mode === 'stand' ? 0.01 : sense * power_MW,
        ambient_K: 290,
        soc: charge,
        stores: [store('hot'), store('cold')],
        raised: [],
        told: null,
      };
      scans.push(change ? change(scan, scans.length) : scan);
    }
  }
  return scans;
}

export function rulesOf(scan_period_s = 60) {
  return cycleRules(unitOf({ scan_period_s }));
}

/** Records of all runs that are over, and the state after the last scan. */
export function run(
  scans: readonly CycleScan[],
  scan_period_s = 60,
  state: CycleLogState = startCycleLog(),
): { records: CycleRecord[]; state: CycleLogState } {
  const rules = rulesOf(scan_period_s);
  const records: CycleRecord[] = [];
  for (const scan of scans) {
    const record = stepCycleLog(rules, state, scan, []);
    if (record !== null) records.push(record);
  }
  return { records, state };
}

/** A scan in which nothing was read; what the estimator holds stays. */
export function unread(scan: CycleScan): CycleScan {
  return { ...scan, read: false, bedRead: false, modeRead: false, power_MW: Number.NaN };
}
