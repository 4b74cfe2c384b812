import type { PlantChange } from '../../../test/plant/faults.js';
import { RandomStream } from '../../../test/plant/random.js';
import { base, cycle, H, row } from '../base.js';
import { type Figure, figure, median, ownValues, worst } from '../figure.js';
import type { Runner, Scenario } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries, type Series } from '../series.js';
import { type RowResult, tally } from '../tally.js';

/** When the rock is found to have sunk [h]: during the first charge. */
const AT_H = 2;

const settledOf = (seed: number) => ({
  store: seed % 2 === 0 ? 'hot' : 'cold',
  // One thermocouple of each string, or two: they hang at 0.45 and 1.09 m, placed to 20 mm.
  depth_m: new RandomStream(seed, 'score settled').uniform() < 0.5 ? 0.75 : 1.4,
});

const settled = (seed: number): PlantChange[] => [
  { kind: 'settled', at_s: AT_H * H, ...settledOf(seed) },
];

/** Thermocouples that hang in gas. */
function barePlaces(series: Series, seed: number): Set<string> {
  const { store, depth_m } = settledOf(seed);
  const { bed, strings } = series.unit.stores.find((s) => s.id === store)!;
  // Warm ends are up: the charge inlet of the hot store, the other one of the cold.
  const depth = (x: number) => (store === 'hot' ? x : bed.length_m - x);
  const all = strings.flatMap((s) => s.thermocouples);
  return new Set(all.filter((t) => depth(t.position_m) < depth_m).map((t) => t.id));
}

const runSettled: Runner = (recording, seed, rows) =>
  Object.fromEntries(
    rows.map((plan) => {
      const unit = unitWith(plan.set, plan.errors);
      const series = runSeries(unit, recording, { errors: plan.errors, hours: false });
      const bare = barePlaces(series, seed);
      const first = (verdict: string | null) =>
        [...bare].map((sensor) =>
          series.rejections
            .filter((r) => r.sensor === sensor && (verdict === null || r.verdict === verdict))
            .filter((r) => r.from >= AT_H * 60)
            .reduce((least, r) => Math.min(least, r.from), Number.POSITIVE_INFINITY),
        );
      const named = first('uncovered').filter(Number.isFinite);
      const others = series.rejections.filter((r) => !bare.has(r.sensor)).map((r) => r.sensor);
      const own = {
        bare: bare.size,
        named: named.length,
        'left out': first(null).filter(Number.isFinite).length,
        'delay h': named.length === 0 ? null : Math.min(...named) / 60 - AT_H,
        'wrongly named': new Set(others).size,
      };
      return [plan.id, tally(series, seed, own)];
    }),
  );

function settledFigures(results: readonly RowResult[]): Figure[] {
  const sum = (name: string) => ownValues(results, name).reduce((a, b) => a + b, 0);
  const bare = sum('bare');
  const part = (name: string) => (bare === 0 ? null : (100 * sum(name)) / bare);
  return [
    figure('bare thermocouples named uncovered', part('named'), '%', null, `${bare} in all`),
    figure('  left out by whatever name', part('left out'), '%'),
    figure('  first named after, median', median(ownValues(results, 'delay h')), 'h'),
    figure('others wrongly named', sum('wrongly named'), '', { most: 0, each: true }),
    figure('  most in one run', worst(ownValues(results, 'wrongly named')), ''),
  ];
}

export const SETTLED: Scenario = {
  ...base,
  id: 'settled',
  code: 'settled',
  words: 'rock sunk away from the top thermocouples of a store from 2 h on',
  truth: {
    id: 'settled',
    machine: 'random',
    segments: cycle,
    changes: settled,
    hours_every_min: null,
  },
  rows: [row('all', 'class')],
  run: runSettled,
  figures: (_, results) => settledFigures(results),
  hours: false,
  healthy: false,
  goals: 'none',
};
