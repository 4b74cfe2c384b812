import { existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { restoreUnit, saveUnit, startUnit } from '../../src/core/unit.js';
import { folder } from '../score/folder.js';
import type { Recording } from '../score/recording.js';
import { BRANCHES, type Branch, HEALTHY, type UnitKind } from './branches.js';
import { type WatchRun, watchRecording } from './watchRun.js';
import { keptStretch, makeBranches, makeWeeks, prepareTruths, type Stretch } from './watchTruth.js';
import { watchedUnit } from './watchUnit.js';

/** A plant with its faults, or its healthy weeks: the unit of work. */
export interface WatchJob {
  readonly kind: 'branches' | 'weeks';
  readonly seed: number;
  /** Branches wanted, by their ids; none of weeks. */
  readonly ids: readonly string[];
  /** Only the truths. */
  readonly truths: boolean;
}

export interface WatchHashes {
  readonly truth: string;
  readonly result: string;
}

/** Computing time of a job. */
export interface WatchCost {
  readonly truth_s: number;
  readonly truth_d: number;
  readonly run_s: number;
  readonly run_d: number;
}

const fileOf = (seed: number, name: string, hash: string): string =>
  join(folder, 'watch', `results-${hash}`, `${seed}-${name}.json`);

/** Kept result; null where it has not been run with this code. `lead-top` and `way` are stretches too. */
export function watchResult(seed: number, name: Stretch, hash: string): WatchRun | null {
  const file = fileOf(seed, name, hash);
  return existsSync(file) ? (JSON.parse(readFileSync(file, 'utf8')) as WatchRun) : null;
}

function keepResult(seed: number, name: string, hash: string, run: WatchRun): void {
  mkdirSync(join(folder, 'watch', `results-${hash}`), { recursive: true });
  const file = fileOf(seed, name, hash);
  writeFileSync(`${file}.part`, JSON.stringify(run));
  renameSync(`${file}.part`, file);
}

export const isDone = ({ kind, seed, ids }: WatchJob, { result }: WatchHashes): boolean =>
  (kind === 'weeks' ? ['weeks'] : ids).every((name) => existsSync(fileOf(seed, name, result)));

/** Runs a job; what has been kept of it is not run again, but for the way to an onset. */
export function runWatchJob(job: WatchJob, hashes: WatchHashes): WatchCost {
  prepareTruths(hashes.truth);
  const before = process.cpuUsage();
  const truth_d =
    job.kind === 'weeks'
      ? makeWeeks(job.seed, hashes.truth)
      : makeBranches(job.seed, hashes.truth, job.ids);
  const { user, system } = process.cpuUsage(before);
  const truth_s = (user + system) / 1e6;
  const cost = { truth_s, truth_d, run_s: 0, run_d: 0 };
  if (job.truths || isDone(job, hashes)) return cost;
  const add = ({ cpu_s, hours }: WatchRun): void => {
    cost.run_s += cpu_s;
    cost.run_d += hours / 24;
  };
  if (job.kind === 'weeks') {
    const unit = watchedUnit('demo');
    const run = watchRecording(unit, startUnit(unit), stretch(job.seed, 'weeks', hashes));
    add(run);
    keepResult(job.seed, 'weeks', hashes.result, run);
    return cost;
  }
  for (const kind of ['demo', 'top'] as const) runUnit(kind, job, hashes, add);
  return cost;
}

/** Lead and way once, with the faults that set in at the end of each on copies of the state. */
function runUnit(
  kind: UnitKind,
  { seed, ids }: WatchJob,
  hashes: WatchHashes,
  add: (run: WatchRun) => void,
): void {
  const missing = [...BRANCHES, HEALTHY].filter(
    ({ id, unit }) =>
      unit === kind && ids.includes(id) && watchResult(seed, id, hashes.result) === null,
  );
  if (missing.length === 0) return;
  const unit = watchedUnit(kind);
  const state = startUnit(unit);
  const suffix = kind === 'demo' ? '' : `-${kind}`;
  for (const onset of ['lead', 'way'] as const) {
    if (onset === 'way' && missing.every((one) => one.onset === 'lead')) return;
    const lead = watchRecording(unit, state, stretch(seed, onset, hashes));
    add(lead);
    keepResult(seed, `${onset}${suffix}`, hashes.result, lead);
    const there = saveUnit(state);
    for (const branch of missing.filter((one) => one.onset === onset)) {
      const own = restoreUnit(unit, there);
      const run = watchRecording(unit, own, stretch(seed, branch.id, hashes));
      add(run);
      keepResult(seed, branch.id, hashes.result, run);
    }
  }
}

/** Recording of a stretch that has been made. */
export function stretch(
  seed: number,
  name: Stretch,
  hashes: Pick<WatchHashes, 'truth'>,
): Recording {
  const found = keptStretch(seed, name, hashes.truth);
  if (found === null) throw new Error(`truth of ${name} with seed ${seed} is not there`);
  return found;
}

export const branchOf = (id: string): Branch | undefined =>
  [...BRANCHES, HEALTHY].find((one) => one.id === id);
