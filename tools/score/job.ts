import { existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { folder } from './folder.js';
import { SCENARIOS } from './scenarios.js';
import { unitWith } from './sensorSets.js';
import { runSeries } from './series.js';
import { type RowResult, tally } from './tally.js';
import { truthOf } from './truthOf.js';

/** One scenario with one seed: the unit of work, and of what survives an interruption. */
export interface Job {
  readonly scenario: string;
  readonly seed: number;
}

export type JobResult = Readonly<Record<string, RowResult>>;

export interface Hashes {
  readonly truth: string;
  readonly result: string;
}

const fileOf = ({ scenario, seed }: Job, hash: string) =>
  join(folder, 'results', hash, `${scenario}-${seed}.json`);

export function resultOf(job: Job, hash: string): JobResult | null {
  const file = fileOf(job, hash);
  return existsSync(file) ? (JSON.parse(readFileSync(file, 'utf8')) as JobResult) : null;
}

export function runJob(job: Job, hashes: Hashes): void {
  const scenario = SCENARIOS.find((s) => s.id === job.scenario);
  if (!scenario) throw new RangeError(`no scenario ${job.scenario}`);
  const recording = truthOf(scenario.truth, job.seed, hashes.truth);
  const result: Record<string, RowResult> = {};
  for (const row of scenario.rows) {
    const unit = unitWith(row.set, row.errors);
    const series = runSeries(unit, recording, { errors: row.errors, hours: scenario.hours });
    result[row.id] = tally(series, job.seed);
  }
  const file = fileOf(job, hashes.result);
  mkdirSync(join(folder, 'results', hashes.result), { recursive: true });
  writeFileSync(`${file}.part`, JSON.stringify(result));
  renameSync(`${file}.part`, file);
}
