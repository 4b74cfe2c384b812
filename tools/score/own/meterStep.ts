import { base, day, row } from '../base.js';
import { type Figure, figure, ownValues, rms, worst } from '../figure.js';
import type { Runner, Scenario } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries, type Series } from '../series.js';
import { type RowResult, tally } from '../tally.js';
import { meanFlow } from './meanFlow.js';

const FACTOR = 0.93;
/** While standing after the first charge of the day [h]. */
const STEP_H = 7;
/** The last hour of the charge before, and of the one after a full cycle [h]. */
const BEFORE_H = [5, 6] as const;
const AFTER_H = [15, 16] as const;

/** The flow meter reads 7 % less from one moment on. */
const runMeterStep: Runner = (recording, seed, rows) =>
  Object.fromEntries(
    rows.map((plan) => {
      const unit = unitWith(plan.set, plan.errors);
      const series = runSeries(unit, recording, {
        errors: plan.errors,
        hours: true,
        // A third of what the day's own rows answer: no goal hangs on them.
        hours_every: 3,
        faults: [{ kind: 'meter_step', at_s: STEP_H * 3600, factor: FACTOR }],
      });
      const own: Record<string, number> = {};
      for (const store of unit.stores) {
        own[`step ${store.id}`] = 100 * (foundStep(series, store.id) / (1 / FACTOR) - 1);
      }
      return [plan.id, tally(series, seed, own)];
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

function meterStepFigures(results: readonly RowResult[]): Figure[] {
  const errors = ['hot', 'cold'].flatMap((id) => ownValues(results, `step ${id}`));
  return [
    figure('step found after one cycle, worst error', worst(errors), '%', {
      most: 1.5,
      each: true,
    }),
    figure('  the same, rms', rms(errors), '%'),
  ];
}

export const METER_STEP: Scenario = {
  ...base,
  id: 'meter-step',
  code: 'meterStep',
  words: 'flow meter -7 % from 7 h on',
  truth: day('random'),
  rows: [row('all', 'class'), row('five', 'class')],
  run: runMeterStep,
  figures: (_, results) => meterStepFigures(results),
  goals: 'none',
};
