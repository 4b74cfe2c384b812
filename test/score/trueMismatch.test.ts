import { describe, expect, it } from 'vitest';
import { Recording } from '../../tools/score/recording.js';
import { judgeHealthy } from '../../tools/watch/judge.js';
import { falseAlerts } from '../../tools/watch/report.js';
import { trulyApart } from '../../tools/watch/trueMismatch.js';
import type { Told, WatchRun } from '../../tools/watch/watchRun.js';

const PERIOD_S = 600;

/** Runs of an hour each with a scan of rest behind: direction, and states of charge of hot and cold at the end. */
function recordingOf(runs: readonly (readonly [1 | -1, number, number])[]): Recording {
  const rows = runs.flatMap(([mode, hot, cold]) =>
    [mode, mode, mode, mode, mode, mode, 0].map((m) => ({ mode: m, truth: [hot, cold] })),
  );
  return Recording.make(
    rows.map(({ mode }) => ({ readings: { mode } }) as never),
    rows.map(({ truth }) => truth),
    {
      ...{ start_s: 0, period_s: PERIOD_S, truths: ['hot.soc', 'cold.soc'], hours: [] },
      ...{ temperatures: [], others: ['mode'] },
    },
  );
}

const CYCLES = recordingOf([
  [1, 0.6, 0.6],
  [-1, 0.3, 0.32],
  [1, 0.61, 0.65],
  [-1, 0.3, 0.4],
]);

describe('stores that have truly walked apart', () => {
  it('are told by ends of runs in one direction, as of a time', () => {
    expect(trulyApart(CYCLES, 2)).toBeNull();
    expect(trulyApart(CYCLES, 4)).toBeCloseTo(-0.04, 6);
    expect(trulyApart(CYCLES, 5)).toBeCloseTo(-0.08, 6);
  });

  it('stand beside a false alert of theirs, and beside no other', () => {
    const told = (kind: Told['kind']): Told => ({
      ...{ t_h: 5, kind, class: 'alert', subject: 'u', transition: 'raised' },
      ...{ value: null, message: 'Told.' },
    });
    const run = (kind: Told['kind']): WatchRun => ({
      ...{ hours: 6, events: [told(kind)], causes: [], views: [], cpu_s: 0 },
    });
    const truly = (_: string, t_h: number) => trulyApart(CYCLES, t_h);
    const judged = judgeHealthy(
      501,
      new Map([
        ['weeks', run('stores_mismatched')],
        ['lead', run('standing_loss_high')],
      ]),
      truly,
    );
    const [mismatch, loss] = falseAlerts([judged]);
    expect(mismatch).toMatch(
      /Told\. In truth the stores had walked 8\.0 % of the rated energy apart/,
    );
    expect(loss).toMatch(/Told\.$/);
  });
});
