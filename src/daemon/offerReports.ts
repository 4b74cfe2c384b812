import { setImmediate } from 'node:timers/promises';
import type { History } from '../adapters/history/history.js';
import { wordsOf } from '../adapters/history/series.js';
import type { Mode, UnitDefinition } from '../core/definitions.js';
import type { DoneRow } from '../core/plan/discharges.js';
import { type OfferReport, offerReport } from '../core/plan/offerReport.js';
import { pastOffers } from '../core/plan/offerSummary.js';

/** Most tables of one report; newest first. */
const MOST_TABLES = 2_000;
/** How long after its asking an offered discharge may still go on. */
const AFTER_MS = 9 * 86_400_000;
/** Stored scans read in one go: a quarter of a day of 30 s scans takes some milliseconds. */
const SLICE_MS = 6 * 3_600_000;

/**
 * Kept offers asked between two times against the stored scans from then on, read in slices so that
 * no scan waits for it.
 */
export async function reportOffers(
  history: History,
  unit: UnitDefinition,
  from_ms: number,
  to_ms: number,
): Promise<OfferReport> {
  const tables = history.offers.between(unit.id, from_ms, to_ms, MOST_TABLES);
  const offers = tables.flatMap((table) =>
    pastOffers(table.no, table.asked_ms, table.asked, table.offers),
  );
  const rows: DoneRow[] = [];
  if (tables.length > 0) {
    const begins = Math.min(...tables.map((table) => table.asked_ms));
    const newest = history.estimates.latest(unit.id)?.time;
    const ends = Math.min(to_ms + AFTER_MS, newest === undefined ? begins : Date.parse(newest));
    for (let at = begins; at <= ends; at += SLICE_MS) {
      rows.push(...doneRows(history, unit, at, Math.min(ends, at + SLICE_MS - 1)));
      await setImmediate();
    }
  }
  return offerReport(unit, offers, rows);
}

function doneRows(
  history: History,
  unit: UnitDefinition,
  from_ms: number,
  to_ms: number,
): DoneRow[] {
  const outlet = (kind: string): string =>
    `${unit.stores.find((store) => store.kind === kind)?.id ?? ''}.outlet_degC`;
  const names = ['mode', 'power_MW_el', 'flow_kg_s', outlet('hot'), outlet('cold')];
  const modes = wordsOf('mode') ?? [];
  return [...history.estimates.rows(unit.id, from_ms, to_ms, names)].map(({ time_ms, values }) => {
    const [mode, power, flow_kg_s, hot_degC, cold_degC] = values as [
      number,
      number,
      number,
      number,
      number,
    ];
    return {
      time_ms,
      mode: (modes[mode] as Mode | undefined) ?? null,
      // Stored as measured: + = drawn.
      given_MW_el: -power,
      ...{ flow_kg_s, hot_degC, cold_degC },
    };
  });
}
