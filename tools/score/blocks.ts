import { figure } from './figure.js';
import { commonFigures } from './figures.js';
import type { Scenario } from './scenario.js';
import { SET_WORDS, unitWith } from './sensorSets.js';
import type { Block } from './table.js';
import type { RowResult } from './tally.js';
import { unsoundFigures } from './unsound.js';
import { type HealthyRun, healthyDays, wrongNames } from './wrongNames.js';

const ERROR_WORDS = { independent: 'independent offsets', class: 'errors of the class' };

/** The table's blocks: one for each row of each scenario, and one over all runs together. */
export function blocksOf(
  scenarios: readonly Scenario[],
  resultsOf: (scenario: Scenario, row: string) => readonly RowResult[],
  fresh: readonly number[],
): Block[] {
  const blocks: Block[] = [];
  const everything: RowResult[] = [];
  const healthy: HealthyRun[] = [];
  for (const scenario of scenarios) {
    for (const row of scenario.rows) {
      const results = resultsOf(scenario, row.id);
      if (results.length === 0) continue;
      everything.push(...results);
      if (scenario.healthy) healthy.push(...results.map((result) => ({ scenario, row, result })));
      const words = row.words === undefined ? scenario.words : `${scenario.words}: ${row.words}`;
      const rated_h = unitWith(row.set, row.errors).rated_hours;
      blocks.push({
        scenario: scenario.id,
        row: row.id,
        title: `${words}; ${SET_WORDS[row.set]}; ${ERROR_WORDS[row.errors]}`,
        seeds: results.length,
        figures: [
          ...scenario.figures(row, results),
          ...commonFigures(scenario, row, results, { rated_h, fresh }),
        ],
      });
    }
  }
  if (blocks.length === 0) return [];
  const broken = everything.reduce((sum, r) => sum + r.not_finite, 0);
  const all = [
    figure('estimates that are not finite', broken, '', { most: 0, each: true }),
    ...unsoundFigures(everything),
  ];
  if (healthy.length > 0) {
    const { days, read } = healthyDays(healthy);
    const named = healthy.reduce((sum, run) => sum + run.result.rejections.length, 0);
    const note = `in ${days.toFixed(0)} unit-days with sound thermocouples; 300 are asked for`;
    all.push(
      figure('sensors wrongly named', named, '', { most: 0 }, note),
      figure('  unit-days as read by all sensor sets', read, 'd'),
      ...wrongNames(healthy),
    );
  }
  blocks.push({ scenario: 'all', row: 'all', title: 'all runs together', seeds: 0, figures: all });
  return blocks;
}
