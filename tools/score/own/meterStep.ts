import { type Figure, figure, ownValues, rms, worst } from '../figure.js';
import type { Runner } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries, type Series } from '../series.js';
import { type RowResult, tally } from '../tally.js';

const FACTOR = 0.93;
/** While standing after the first charge of the day [h]. */
const STEP_H = 7;
/** The last hour of the charge before, and of the one after a full cycle [h]. */
const BEFORE_H = [5, 6] as const;
const AFTER_H = [15, 16] as const;

/** The flow meter reads 7 % less from one moment on. */
export const runMeterStep: Runner = (recording, seed, rows) =>
  Object.fromEntries(
    rows.map((row) => {
      const unit = unitWith(row.set, row.errors);
      const series = runSeries(unit, recording, {
        errors: row.errors,
        hours: true,
        faults: [{ kind: 'meter_step', at_s: STEP_H * 3600, factor: FACTOR }],
      });
      const own: Record<string, number> = {};
      for (const store of unit.stores) {
        own[`step ${store.id}`] = 100 * (foundStep(series, store.id) / (1 / FACTOR) - 1);
      }
      return [row.id, tally(series, seed, own)];
    }),
  );

/**
 * By how much the store's flow factor rose from before the step to one cycle after it. The meter's own
 * error changes with load, so each mean is taken of the factor times what the sound meter reads.
 */
function foundStep(series: Series, id: string): number {
  const mean = ([from, to]: readonly [number, number]) => {
    const values: number[] = [];
    for (let n = from * 60; n < to * 60; n++) {
      values.push(meanFlow(series, id, n) * series.recording.truth('meter_factor', n));
    }
    return values.reduce((a, b) => a + b, 0) / values.length;
  };
  return mean(AFTER_H) / mean(BEFORE_H);
}

/** Area-weighted mean of the flow factors of a store. */
export function meanFlow(series: Series, id: string, n: number): number {
  const store = series.unit.stores.find((s) => s.id === id)!;
  const { flow } = series.stores[id]!;
  return store.strings.reduce((sum, string, k) => sum + string.area_share * flow[k]![n]!, 0);
}

export function meterStepFigures(results: readonly RowResult[]): Figure[] {
  const errors = ['hot', 'cold'].flatMap((id) => ownValues(results, `step ${id}`));
  return [
    figure('step found after one cycle, worst error', worst(errors), '%', {
      most: 1.5,
      each: true,
    }),
    figure('  the same, rms', rms(errors), '%'),
  ];
}
