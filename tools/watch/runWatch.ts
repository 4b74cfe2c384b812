import { createHash } from 'node:crypto';
import { mkdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { unitModel } from '../../src/core/unitModel.js';
import { codeHash } from '../score/codeHash.js';
import { folder, keepFolders, root } from '../score/folder.js';
import { runJobs } from '../score/pool.js';
import type { Block } from '../score/table.js';
import { BRANCHES, HEALTHY, strongest } from './branches.js';
import { type HealthyJudged, type Judged, judge, judgeHealthy } from './judge.js';
import { falseAlerts, faultTable, watchBlocks } from './report.js';
import { trulyApart } from './trueMismatch.js';
import {
  isDone,
  type WatchCost,
  type WatchHashes,
  type WatchJob,
  watchResult,
} from './watchJob.js';
import { keptStretch, TRUTH_CODE } from './watchTruth.js';
import { watchedUnit } from './watchUnit.js';
import { WEEKS_SEED } from './weeks.js';
import type { WatchAnswer } from './worker.js';

/** Seeds from here on are kept for judging; 1, 2, ... are for building. */
export const WATCH_FROM = 30_000;
/** Plants with faults, and as many with healthy weeks, of a whole run. */
export const WATCH_SEEDS = 20;

/** What of the watch is scored: branches by their ids, and healthy weeks. */
export interface WatchParts {
  readonly ids: readonly string[];
  readonly weeks: boolean;
}

const EVERY = [...BRANCHES, HEALTHY].map(({ id }) => id);
export const ALL_PARTS: WatchParts = { ids: EVERY, weeks: true };
/** Words that stand for parts. */
export const PART_WORDS: readonly string[] = ['branches', 'strongest', 'weeks', ...EVERY];

/** Parts by their words. */
export function partsOf(words: readonly string[]): WatchParts {
  const top = BRANCHES.filter(strongest).map(({ id }) => id);
  const named = words.flatMap((word) =>
    word === 'branches' ? EVERY : word === 'strongest' ? [...top, HEALTHY.id] : [word],
  );
  return { ids: EVERY.filter((id) => named.includes(id)), weeks: words.includes('weeks') };
}

export interface WatchOptions {
  readonly from: number;
  readonly seeds: number;
  readonly parts: WatchParts;
  readonly workers: number;
  /** Only truths are made. */
  readonly truths: boolean;
  /** Told after each job. */
  readonly progress: (line: string) => void;
}

export interface WatchScore {
  readonly text: string;
  readonly blocks: readonly Block[];
  readonly failures: readonly { readonly job: WatchJob; readonly error: string }[];
}

/** Hashes of what truths and results depend on. */
export async function watchHashes(): Promise<WatchHashes> {
  const truth = await codeHash(TRUTH_CODE);
  const code = await codeHash('tools/watch/watchJob.ts');
  const config = readFileSync(join(root, 'config/demo.yaml'), 'utf8');
  const result = createHash('sha256').update(truth).update(code).update(config).digest('hex');
  return { truth, result: result.slice(0, 12) };
}

/** Runs what is missing and judges what is there. */
export async function scoreWatch(options: WatchOptions): Promise<WatchScore> {
  const hashes = await watchHashes();
  mkdirSync(join(folder, 'watch'), { recursive: true });
  keepFolders('watch', [`truth-${hashes.truth}`, `results-${hashes.result}`], 8);
  const seeds = Array.from({ length: options.seeds }, (_, i) => options.from + i);
  // Seed by seed, so that a run that is stopped has both of some seeds.
  const { ids, weeks } = options.parts;
  const { truths } = options;
  const jobs = seeds.flatMap((seed): WatchJob[] => [
    ...(ids.length > 0 ? [{ kind: 'branches', seed, ids, truths } as const] : []),
    ...(weeks ? [{ kind: 'weeks', seed: seed + WEEKS_SEED, ids: [], truths } as const] : []),
  ]);
  const missing = jobs.filter((job) => options.truths || !isDone(job, hashes));
  const cost = { truth_s: 0, truth_d: 0, run_s: 0, run_d: 0 };
  const started = performance.now();
  let done = 0;
  const file = new URL('worker.ts', import.meta.url);
  const failures = await runJobs(
    missing,
    hashes,
    options.workers,
    (job, _cpu, answer) => {
      done++;
      add(cost, (answer as WatchAnswer).cost);
      const spent_min = (performance.now() - started) / 60_000;
      const left_min = (spent_min / done) * (missing.length - done);
      const what = `${job.kind} of seed ${job.seed}`;
      const left = `about ${left_min.toFixed(0)} min to go`;
      options.progress(
        `${done} of ${missing.length} (${what}) in ${spent_min.toFixed(1)} min, ${left}`,
      );
    },
    file,
  );
  const judged = judgedFaults(ids, seeds, hashes);
  const healthy = judgedHealthy(jobs, hashes);
  const blocks = watchBlocks(judged, healthy);
  const lines = [costLine(cost)];
  if (judged.size > 0) lines.push('', faultTable(judged));
  if (healthy.length > 0) lines.push('', 'false degradation alerts:', ...falseAlerts(healthy));
  return { text: `${lines.join('\n')}\n`, blocks, failures };
}

function add(sum: Record<keyof WatchCost, number>, cost: WatchCost | undefined): void {
  if (cost === undefined) return;
  for (const key of Object.keys(sum) as (keyof WatchCost)[]) sum[key] += cost[key];
}

function costLine({ truth_s, truth_d, run_s, run_d }: WatchCost): string {
  const each = (s: number, d: number) =>
    d > 0 ? ` at ${(s / d).toFixed(1)} s of computing each` : '';
  const truth = `${truth_d.toFixed(0)} days of the finer plant${each(truth_s, truth_d)}`;
  return `anew: ${truth}, ${run_d.toFixed(0)} of the estimator${each(run_s, run_d)}`;
}

function judgedFaults(
  ids: readonly string[],
  seeds: readonly number[],
  { result }: WatchHashes,
): Map<string, Judged[]> {
  const judged = new Map<string, Judged[]>();
  for (const branch of BRANCHES.filter(({ id }) => ids.includes(id))) {
    const own = seeds.flatMap((seed) => {
      const run = watchResult(seed, branch.id, result);
      return run === null ? [] : [judge(branch, seed, run)];
    });
    if (own.length > 0) judged.set(branch.id, own);
  }
  return judged;
}

/** Healthy stretches of each plant; a recording that two units read counts once. */
function judgedHealthy(jobs: readonly WatchJob[], { result, truth }: WatchHashes): HealthyJudged[] {
  const { fullHours, unit } = unitModel(watchedUnit('demo'));
  return jobs.flatMap(({ kind, seed }) => {
    const names = kind === 'weeks' ? ['weeks'] : ['lead', 'way', HEALTHY.id];
    const runs = names.flatMap((name) => {
      const run = watchResult(seed, name, result);
      return run === null ? [] : [[name, run] as const];
    });
    const truly = (stretch: string, t_h: number): number | null => {
      const recording = keptStretch(seed, stretch, truth);
      const apart = recording === null ? null : trulyApart(recording, t_h);
      return apart === null ? null : (apart * fullHours()) / unit.rated_hours;
    };
    return runs.length === 0 ? [] : [judgeHealthy(seed, new Map(runs), truly)];
  });
}
