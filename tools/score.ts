/**
 * npm run score: the estimator against the finer plant, over scenarios and seeds, beside straight
 * lines between the thermocouples on the same recordings.
 *
 *   npm run score -- [--seeds 30] [--fresh 5] [--only nominal,gap] [--tuning] [--quick] [--strict]
 *
 * Truths and results are kept in .score: a run that was stopped goes on where it was, and a run
 * after a change of the estimator needs no new truths. --tuning takes seeds 1, 2, ... instead of
 * those for scoring and no fresh ones. --strict ends with code 1 where a goal is missed. All figures
 * also stand in .score/latest.json.
 */
import { mkdirSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import cliProgress from 'cli-progress';
import { commonFigures } from './score/figures.js';
import { folder, resultHash, truthHash } from './score/folder.js';
import { type Job, resultOf } from './score/job.js';
import { runJobs } from './score/pool.js';
import { SCENARIOS } from './score/scenarios.js';
import { FIXED_FROM, freshSeeds, seedsDone } from './score/seeds.js';
import { SET_WORDS, unitWith } from './score/sensorSets.js';
import { type Block, tableText } from './score/table.js';

const { values } = parseArgs({
  options: {
    seeds: { type: 'string', default: '30' },
    fresh: { type: 'string', default: '5' },
    only: { type: 'string' },
    tuning: { type: 'boolean', default: false },
    strict: { type: 'boolean', default: false },
  },
});

function count(name: string, text: string, least: number): number {
  const value = Number(text);
  if (text.trim() !== '' && Number.isInteger(value) && value >= least) return value;
  console.error(`--${name} must be a whole number of at least ${least}, got "${text}"`);
  process.exit(2);
}

const names = values.only?.split(',') ?? SCENARIOS.map((s) => s.id);
const unknown = names.filter((name) => !SCENARIOS.some((s) => s.id === name));
if (unknown.length > 0) {
  const all = SCENARIOS.map((s) => s.id).join(', ');
  console.error(`--only must name scenarios of ${all}; got ${unknown.join(', ')}`);
  process.exit(2);
}
const seeds = count('seeds', values.seeds, 1);
const fixed = Array.from({ length: seeds }, (_, i) => (values.tuning ? 1 : FIXED_FROM) + i);
const freshCount = values.tuning ? 0 : count('fresh', values.fresh, 0);
const fresh = freshCount > 0 ? freshSeeds(freshCount, Date.now()) : [];
if (fresh.length > 0) console.log(`fresh seeds of this run: ${fresh.join(', ')}`);

const started = performance.now();
const hashes = { truth: truthHash(), result: resultHash() };
const chosen = SCENARIOS.filter((s) => names.includes(s.id));
const jobs = chosen.flatMap((scenario): Job[] =>
  [...fixed, ...fresh]
    .filter((_, i) => i % scenario.every === 0)
    .map((seed) => ({ scenario: scenario.id, seed })),
);
// Seed by seed, so that a run that is stopped has all scenarios of some seeds.
const order = new Map([...fixed, ...fresh].map((seed, i) => [seed, i]));
const waiting = jobs
  .filter((job) => resultOf(job, hashes.result) === null)
  .sort((a, b) => order.get(a.seed)! - order.get(b.seed)!);

prune('results', hashes.result, 4);
prune('truth', hashes.truth, 1);
const bar = process.stderr.isTTY
  ? new cliProgress.SingleBar({ format: 'score {bar} {percentage} %, {eta_formatted} to go' })
  : null;
bar?.start(jobs.length, jobs.length - waiting.length);
const failures = await runJobs(waiting, hashes, () => bar?.increment());
bar?.stop();
for (const { job, error } of failures) {
  console.error(`${job.scenario} with seed ${job.seed} failed: ${error}`);
}

const blocks: Block[] = chosen.flatMap((scenario) => {
  const results = jobs
    .filter((job) => job.scenario === scenario.id)
    .map((job) => resultOf(job, hashes.result))
    .filter((result) => result !== null);
  if (results.length === 0) return [];
  return scenario.rows.map((row) => {
    const runs = results.flatMap((result) => result[row.id] ?? []);
    const errors = row.errors === 'class' ? 'errors of the class' : 'independent offsets';
    const rated = { hours: unitWith(row.set, row.errors).rated_hours };
    return {
      scenario: scenario.id,
      row: row.id,
      title: `${scenario.words}; ${SET_WORDS[row.set]}; ${errors}`,
      seeds: runs.length,
      figures: commonFigures(scenario, row, runs, rated),
    };
  });
});
process.stdout.write(tableText(blocks));
const marks = blocks.flatMap((b) => b.figures.map((f) => f.met));
const missed = marks.filter((met) => met === false).length;
const seconds = Math.round((performance.now() - started) / 1000);
console.log(
  `\n${marks.filter((met) => met).length} goals met, ${missed} missed; ${waiting.length} of ${jobs.length} runs anew, ${seconds} s`,
);
mkdirSync(folder, { recursive: true });
writeFileSync(
  join(folder, 'latest.json'),
  `${JSON.stringify({ time: new Date().toISOString(), fixed, fresh, seconds, failures, blocks }, null, 1)}\n`,
);
if (fresh.length > 0 && failures.length === 0) seedsDone();
process.exit(failures.length > 0 || (values.strict && missed > 0) ? 1 : 0);

/** Keeps the newest folders of truths or results, this run's among them. */
function prune(kind: string, mine: string, keep: number): void {
  const path = join(folder, kind);
  mkdirSync(join(path, mine), { recursive: true });
  const others = readdirSync(path, { withFileTypes: true })
    .filter((entry) => entry.isDirectory() && entry.name !== mine)
    .map((entry) => entry.name);
  for (const name of others.slice(0, Math.max(0, others.length - keep))) {
    rmSync(join(path, name), { recursive: true, force: true });
  }
}
