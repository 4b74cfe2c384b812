import { setImmediate } from 'node:timers/promises';
import type { History } from '../adapters/history/history.js';
import { wordsOf } from '../adapters/history/series.js';
import type { Mode, UnitDefinition } from '../core/definitions.js';
import type { DoneRow } from '../core/plan/discharges.js';
import { type OfferReport, type PastOffer, reporting } from '../core/plan/offerReport.js';
import { pastOffers } from '../core/plan/offerSummary.js';

/** Most tables of one report; newest first. */
export const MOST_TABLES = 2_000;
/** Tables read in one go, each some kB of JSON. */
const TABLES_AT_ONCE = 50;
/** Longest that this thread is kept from others [ms]. */
const HELD_MS = 25;
/** How long after its asking an offered discharge may still go on. */
const AFTER_MS = 9 * 86_400_000;
/** Stored scans read in one go: a quarter of a day of 30 s scans takes some milliseconds. */
const SLICE_MS = 6 * 3_600_000;

/**
 * Kept offers asked between two times against the stored scans from then on, the newest tables where
 * there are more than `MOST_TABLES`; read and reckoned in slices so that no scan waits for it.
 */
export async function reportOffers(
  history: History,
  unit: UnitDefinition,
  from_ms: number,
  to_ms: number,
  most = MOST_TABLES,
): Promise<OfferReport> {
  const { offers, older_left_out } = await newestOffers(history, unit.id, from_ms, to_ms, most);
  const rows: DoneRow[] = [];
  if (offers.length > 0) {
    const begins = offers.reduce((least, { asked_ms }) => Math.min(least, asked_ms), to_ms);
    const newest = history.estimates.latest(unit.id)?.time;
    const ends = Math.min(to_ms + AFTER_MS, newest === undefined ? begins : Date.parse(newest));
    for (let at = begins; at <= ends; at += SLICE_MS) {
      rows.push(...doneRows(history, unit, at, Math.min(ends, at + SLICE_MS - 1)));
      await setImmediate();
    }
  }
  const run = reporting(unit, offers, rows, older_left_out);
  let turned_ms = performance.now();
  for (let next = run.next(); ; next = run.next()) {
    if (next.done) return next.value;
    if (performance.now() - turned_ms < HELD_MS) continue;
    await setImmediate();
    turned_ms = performance.now();
  }
}

async function newestOffers(
  history: History,
  unit: string,
  from_ms: number,
  to_ms: number,
  most: number,
): Promise<{ offers: PastOffer[]; older_left_out: boolean }> {
  const offers: PastOffer[] = [];
  let below = Number.MAX_SAFE_INTEGER;
  for (let left = most; left > 0; left -= TABLES_AT_ONCE) {
    const count = Math.min(TABLES_AT_ONCE, left);
    const tables = history.offers.between(unit, from_ms, to_ms, count, below);
    for (const { no, asked_ms, asked, offers: own } of tables) {
      offers.push(...pastOffers(no, asked_ms, asked, own));
    }
    below = tables[tables.length - 1]?.no ?? below;
    if (tables.length < count) return { offers, older_left_out: false };
    await setImmediate();
  }
  const older = history.offers.between(unit, from_ms, to_ms, 1, below);
  return { offers, older_left_out: older.length > 0 };
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
