import { type Figure, figure } from './figure.js';
import type { RowPlan, Scenario } from './scenario.js';
import type { RowResult } from './tally.js';

/** A run in which nothing is wrong with any thermocouple. */
export interface HealthyRun {
  readonly scenario: Scenario;
  readonly row: RowPlan;
  readonly result: RowResult;
}

/**
 * Unit-days watched: `read` counts every run, `days` each recording once however many rows read it,
 * by the one that followed it longest.
 */
export function healthyDays(runs: readonly HealthyRun[]): { days: number; read: number } {
  const longest = new Map<string, number>();
  let read = 0;
  for (const { scenario, result } of runs) {
    const name = `${scenario.truth.id} ${result.seed}`;
    longest.set(name, Math.max(longest.get(name) ?? 0, result.scored_h));
    read += result.scored_h;
  }
  const hours = [...longest.values()].reduce((a, b) => a + b, 0);
  return { days: hours / 24, read: read / 24 };
}

/** No more lines than this; the rest is counted. */
const LINES = 40;

/** Who was named although sound: seed, sensor and verdict, with when and for how long. */
export function wrongNames(runs: readonly HealthyRun[]): Figure[] {
  const all = runs.flatMap(({ scenario, row, result }) =>
    result.rejections.map((r) => {
      const when = `${r.from_h.toFixed(1)} to ${r.to_h.toFixed(1)} h, ${scenario.id} ${row.id}`;
      const name = `  ${r.sensor} ${r.verdict}, seed ${result.seed}`;
      return figure(name, r.to_h - r.from_h, 'h', null, when);
    }),
  );
  const rest = all.length - LINES;
  return rest > 0 ? [...all.slice(0, LINES), figure('  and others', rest, '')] : all;
}
