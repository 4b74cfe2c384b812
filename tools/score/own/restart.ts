import { base, day } from '../base.js';
import { type Figure, figure, median, ownValues, worst } from '../figure.js';
import type { RowPlan, Runner, Scenario } from '../scenario.js';
import { type SensorSet, unitWith } from '../sensorSets.js';
import { runSeries } from '../series.js';
import { type RowResult, tally } from '../tally.js';

/**
 * A start from the state of another moment, taken for that of a scan ago: the plant moved unseen, or
 * an old file was restored. Hours of the day: the first charge lasts to 6.5 h, the discharge from 8.5
 * to 12.5 h.
 */
const STARTS = [
  { id: 'moved', words: 'while charging, state 3 h old', state_h: 3, start_h: 6 },
  { id: 'ahead', words: 'while charging, state of 3 h later', state_h: 6, start_h: 3 },
  {
    id: 'empty',
    words: 'at rest after a discharge, state of the full store',
    state_h: 7,
    start_h: 13,
  },
] as const;

/** What follows the start [h]. */
const FOLLOWED_H = 3;
const TENTH = 9;
/** An estimate that is lost is found to be so by the third scan. */
const THIRD = 2;
const NEAR = 0.005;
const SCANS_PER_H = 60;

const rowsOf = (set: SensorSet, ids: readonly string[]): RowPlan[] =>
  STARTS.filter((s) => ids.includes(s.id)).map((s) => ({
    id: `${set}-${s.id}`,
    set,
    errors: 'independent',
    words: s.words,
  }));

const runRestart: Runner = (recording, seed, rows) => {
  const results: Record<string, RowResult> = {};
  for (const set of new Set(rows.map((r) => r.set))) {
    const unit = unitWith(set, 'independent');
    const wanted = rows.filter((r) => r.set === set);
    const starts = wanted.map((r) => STARTS.find((s) => r.id.endsWith(`-${s.id}`))!);
    const keep = starts.map((s) => s.state_h * SCANS_PER_H);
    const common = { errors: 'independent', hours: false } as const;
    const { snapshots } = runSeries(unit, recording, {
      ...common,
      keep,
      to: Math.max(...keep) + 1,
    });
    wanted.forEach((plan, i) => {
      const start = starts[i]!;
      const [kept, scan] = [start.state_h, start.start_h].map((h) => h * SCANS_PER_H) as [
        number,
        number,
      ];
      const series = runSeries(unit, recording, {
        ...common,
        from: { scan, snapshot: snapshots.get(kept)! },
        to: scan + FOLLOWED_H * SCANS_PER_H,
        shift_ms: recording.time_ms(kept) - recording.time_ms(scan),
      });
      const own: Record<string, number> = {};
      for (const [id, store] of Object.entries(series.stores)) {
        const errors: number[] = [];
        const sigmas: number[] = [];
        for (let n = series.from; n < series.to; n++) {
          errors.push(store.soc[n]! - recording.truth(`${id}.soc`, n));
          sigmas.push(Math.abs(errors.at(-1)! / store.soc_sigma[n]!));
        }
        own[`first ${id}`] = 100 * errors[0]!;
        own[`tenth ${id}`] = 100 * errors[TENTH]!;
        own[`sigmas ${id}`] = Math.max(...sigmas.slice(THIRD));
        const back = errors.findLastIndex((e) => Math.abs(e) >= NEAR) + 1;
        own[`scans to 0.5 % ${id}`] = back;
      }
      // Scored as after any start: from one hour after it.
      results[plan.id] = tally({ ...series, from: scan + SCANS_PER_H }, seed, own);
    });
  }
  return results;
};

function restartFigures(results: readonly RowResult[]): Figure[] {
  const all = (name: string) =>
    ['hot', 'cold'].flatMap((id) => ownValues(results, `${name} ${id}`));
  return [
    figure('error with the first scan, worst', worst(all('first')), '%'),
    figure('  ten scans on, worst', worst(all('tenth')), '%', { most: 0.5, each: true }),
    figure('  scans until it stays below 0.5 %, median', median(all('scans to 0.5 %')), ''),
    figure('  the same, worst', worst(all('scans to 0.5 %')), ''),
    figure('error over sigma from the third scan on, greatest', worst(all('sigmas')), '', {
      most: 3,
      each: true,
    }),
  ];
}

export const RESTART: Scenario = {
  ...base,
  id: 'restart',
  code: 'restart',
  words: 'start from a wrong state',
  truth: day('random'),
  rows: [...rowsOf('all', ['moved', 'ahead', 'empty']), ...rowsOf('five', ['moved'])],
  run: runRestart,
  figures: (_, results) => restartFigures(results),
  hours: false,
  goals: 'none',
};
