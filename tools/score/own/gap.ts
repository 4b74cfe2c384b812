import type { PlantGeometry } from '../../../test/plant/geometry.js';
import type { Segment } from '../../../test/plant/truth.js';
import { base, H, row } from '../base.js';
import { type Figure, figure, median, ownValues, worst } from '../figure.js';
import type { Runner, Scenario } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries } from '../series.js';
import { type RowResult, tally } from '../tally.js';

/** Nothing arrives between these hours; see the schedule for what happens meanwhile. */
const GAP_H = [3, 6.5] as const;
const SCANS_AFTER = 10;
const NEAR = 0.005;

/** All channels silent for 3.5 h that begin while charging and hide a change of mode. */
const runGap: Runner = (recording, seed, rows) =>
  Object.fromEntries(
    rows.map((plan) => {
      const unit = unitWith(plan.set, plan.errors);
      // Scan n is read at (n + 1) min: the first that is missing, and the first that is there again.
      const [from, to] = GAP_H.map((h) => h * 60 - 1) as [number, number];
      const tenth = to + SCANS_AFTER - 1;
      const gap = { kind: 'gap', at_s: GAP_H[0] * 3600, until_s: GAP_H[1] * 3600 } as const;
      const series = runSeries(unit, recording, {
        errors: plan.errors,
        hours: false,
        faults: [gap],
      });
      const own: Record<string, number> = {};
      for (const [id, store] of Object.entries(series.stores)) {
        const error = (n: number) => store.soc[n]! - recording.truth(`${id}.soc`, n);
        let covered = 0;
        for (let n = from; n <= tenth; n++) {
          covered = Math.max(covered, Math.abs(error(n) / store.soc_sigma[n]!));
        }
        own[`sigmas ${id}`] = covered;
        own[`sigma at the end ${id}`] = 100 * store.soc_sigma[to - 1]!;
        own[`worst in the gap ${id}`] =
          100 * Math.max(...range(from, to).map((n) => Math.abs(error(n))));
        own[`error after ${id}`] = 100 * error(tenth);
        const back = range(to, series.to).find((n) => Math.abs(error(n)) < NEAR);
        own[`scans to 0.5 % ${id}`] = (back ?? series.to) - to + 1;
      }
      return [plan.id, tally(series, seed, own)];
    }),
  );

const range = (from: number, to: number): number[] =>
  Array.from({ length: to - from }, (_, i) => from + i);

function gapFigures(independent: boolean, results: readonly RowResult[]): Figure[] {
  const all = (name: string) =>
    ['hot', 'cold'].flatMap((id) => ownValues(results, `${name} ${id}`));
  const after = all('error after');
  return [
    figure('error over sigma from the gap on, greatest', worst(all('sigmas')), '', {
      most: 3,
      each: true,
    }),
    figure('  median sigma at its end', median(all('sigma at the end')), '%'),
    figure('  error within it, worst', worst(all('worst in the gap')), '%'),
    figure(
      'error ten scans after it, worst',
      worst(after),
      '%',
      // Errors of the class alone may exceed it.
      independent ? { most: 0.5, each: true } : null,
    ),
    figure('  scans until below 0.5 %, worst', worst(all('scans to 0.5 %')), ''),
  ];
}

/**
 * Four hours of charge, of which the last is unseen, and an unseen discharge; the gap ends while the
 * unit stands with even seeds and while it still discharges with odd ones.
 */
const gap = ({ rated_power_W: P }: PlantGeometry, seed: number): Segment[] => {
  const discharge_h = seed % 2 === 0 ? 2 : 3;
  return [
    { mode: 'charge', power_W: 1.5 * P, duration_s: 4 * H },
    { mode: 'discharge', power_W: P, duration_s: discharge_h * H },
    { mode: 'stand', duration_s: (3 - discharge_h + 0.5) * H },
    { mode: 'charge', power_W: 1.3 * P, duration_s: 2.5 * H },
  ];
};

export const GAP: Scenario = {
  ...base,
  id: 'gap',
  code: 'gap',
  words: 'gap of 3.5 h, unseen change of mode',
  truth: { id: 'gap', machine: 'random', segments: gap, hours_every_min: null },
  rows: [row('all', 'independent'), row('five', 'independent'), row('all', 'class')],
  run: runGap,
  figures: ({ errors }, results) => gapFigures(errors === 'independent', results),
  hours: false,
  goals: 'none',
};
