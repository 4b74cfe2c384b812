import { existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { folder } from './folder.js';
import type { Scenario } from './scenario.js';
import { ALL_SCENARIOS } from './scenarios.js';
import type { RowResult } from './tally.js';
import { truthOf } from './truthOf.js';

/** One scenario with one seed and the rows wanted of it: the unit of work. Without rows only its truth is made. */
export interface Job {
  readonly scenario: string;
  readonly seed: number;
  readonly rows: readonly string[];
}

export interface Hashes {
  readonly truth: string;
  /** By the module of a scenario; see Scenario.code. */
  readonly results: Readonly<Record<string, string>>;
}

const fileOf = (scenario: string, row: string, seed: number, hash: string) =>
  join(folder, 'results', hash, `${scenario}.${row}.${seed}.json`);

/** The result of a row with a seed; null where it has not been run with this code. */
export function resultOf(
  scenario: Pick<Scenario, 'id' | 'code'>,
  row: string,
  seed: number,
  hashes: Hashes,
): RowResult | null {
  const file = fileOf(scenario.id, row, seed, hashes.results[scenario.code]!);
  return existsSync(file) ? (JSON.parse(readFileSync(file, 'utf8')) as RowResult) : null;
}

/** Runs a job and keeps its results, one file each: what is there survives an interruption. */
export function runJob(job: Job, hashes: Hashes): void {
  const scenario = ALL_SCENARIOS.find((s) => s.id === job.scenario);
  if (!scenario) throw new RangeError(`no scenario ${job.scenario}`);
  const recording = truthOf(scenario.truth, job.seed, hashes.truth);
  if (job.rows.length === 0) return;
  const rows = scenario.rows.filter((row) => job.rows.includes(row.id));
  const results = scenario.run(recording, job.seed, rows);
  const hash = hashes.results[scenario.code]!;
  mkdirSync(join(folder, 'results', hash), { recursive: true });
  for (const [row, result] of Object.entries(results)) {
    const file = fileOf(scenario.id, row, job.seed, hash);
    writeFileSync(`${file}.part`, JSON.stringify(result));
    renameSync(`${file}.part`, file);
  }
}
