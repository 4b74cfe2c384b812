/**
 * npm run score: the estimator against the finer plant, over scenarios and seeds, beside straight
 * lines between the thermocouples on the same recordings.
 *
 *   npm run score -- [--seeds 30] [--fresh 5] [--only nominal,gap] [--rows all-class] [--tuning]
 *     [--strict] [--quick] [--brief] [--truths-only] [--workers 2]
 *
 * Truths and results are kept in .score: a run that was stopped goes on where it was, and a run
 * after a change of the estimator needs no new truths. --tuning takes seeds 1, 2, ... instead of
 * those for scoring and no fresh ones. --strict ends with code 1 where a goal is missed. --quick takes
 * two tuning seeds and short scenarios, and ends with code 1 where a goal for each single run is missed that
 * is not among the known ones, or beyond what is known of it; --brief leaves the table out. All figures also stand in .score/latest.json.
 * `watch` among --only stands for the watch's own score (npm run score:watch), which comes last, with
 * at most 20 seeds.
 */
import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import cliProgress from 'cli-progress';
import { helpIfAsked } from './help.js';
import { blocksOf } from './score/blocks.js';
import { resultHashes, truthHash } from './score/codeHash.js';
import { folder, keepFolders } from './score/folder.js';
import { type Job, resultOf } from './score/job.js';
import { missesOf } from './score/known.js';
import { Refusal, scoreOptions } from './score/options.js';
import { runJobs } from './score/pool.js';
import { freshSeeds, seedsDone } from './score/seeds.js';
import { tableText } from './score/table.js';
import { truthIsKept } from './score/truthOf.js';
import {
  ALL_PARTS,
  scoreWatch,
  WATCH_FROM,
  WATCH_SEEDS,
  type WatchScore,
} from './watch/runWatch.js';

helpIfAsked(import.meta.url);

function readOptions(): ReturnType<typeof scoreOptions> {
  try {
    return scoreOptions(process.argv.slice(2));
  } catch (thrown) {
    if (!(thrown instanceof Refusal)) throw thrown;
    console.error(thrown.message);
    return process.exit(2);
  }
}

const { values, list, only, scenarios, fixed, workers, freshCount } = readOptions();
const fresh = freshCount > 0 ? freshSeeds(freshCount, Date.now()) : [];
if (fresh.length > 0) console.log(`fresh seeds of this run: ${fresh.join(', ')}`);

const started = performance.now();
const firstLine = (text: string): string => text.split('\n', 1)[0]!;
const hashes = {
  truth: await truthHash(),
  results: await resultHashes(scenarios.map((s) => s.code)),
};
keepFolders('truth', [hashes.truth], 1);
// Eight versions of all modules.
keepFolders('results', Object.values(hashes.results), 8 * new Set(list.map((s) => s.code)).size);

/** The watch's own score, where it is asked for: it has no rows of sensors. */
async function watchScore(): Promise<WatchScore | null> {
  if (!only.has('watch') || values.rows !== undefined) return null;
  const watched = await scoreWatch({
    from: values.tuning ? 1 : WATCH_FROM,
    seeds: Math.min(WATCH_SEEDS, fixed.length),
    parts: ALL_PARTS,
    workers,
    truths: values['truths-only'],
    progress: (line) => console.error(`watch: ${line}`),
  });
  for (const { job, error } of watched.failures) {
    console.error(`watch, ${job.kind} with seed ${job.seed} failed: ${error}`);
  }
  return watched;
}

/** Makes the truths that are missing, one job for each, and ends. */
async function onlyTruths(): Promise<never> {
  const missing = new Map<string, Job>();
  for (const { scenario, seed } of all) {
    if (truthIsKept(scenario.truth, seed, hashes.truth)) continue;
    missing.set(`${scenario.truth.id} ${seed}`, { scenario: scenario.id, seed, rows: [] });
  }
  const lost = await runJobs([...missing.values()], hashes, workers, () => undefined);
  for (const { job, error } of lost) console.error(`${job.scenario} ${job.seed}: ${error}`);
  const seconds = ((performance.now() - started) / 1000).toFixed(0);
  console.log(`${missing.size - lost.length} truths made in ${seconds} s`);
  const watched = await watchScore();
  process.exit(lost.length + (watched?.failures.length ?? 0) > 0 ? 1 : 0);
}

const all = scenarios.flatMap((scenario) =>
  [...fixed, ...fresh]
    .map((seed, place) => ({ scenario, seed, place }))
    .filter(({ place }) => place % scenario.every === 0),
);
if (values['truths-only']) await onlyTruths();
// Seed by seed, so that a run that is stopped has all scenarios of some seeds.
const jobs = [...all]
  .sort((a, b) => a.place - b.place)
  .map(({ scenario, seed }): Job => {
    const missing = scenario.rows.filter(
      (row) => resultOf(scenario, row.id, seed, hashes) === null,
    );
    return { scenario: scenario.id, seed, rows: missing.map((row) => row.id) };
  })
  .filter((job) => job.rows.length > 0);
const bar = process.stderr.isTTY
  ? new cliProgress.SingleBar({
      format: 'score {bar} {value} of {total} runs, {eta_formatted} to go',
      etaBuffer: 40,
    })
  : null;
bar?.start(all.length, all.length - jobs.length);
/** Computing time by scenario [s]. */
const cpu_s: Record<string, number> = {};
const failures = await runJobs(jobs, hashes, workers, (job, spent_s) => {
  cpu_s[job.scenario] = (cpu_s[job.scenario] ?? 0) + spent_s;
  bar?.increment();
});
bar?.stop();
for (const { job, error } of failures) {
  console.error(`${job.scenario} with seed ${job.seed} failed: ${error}`);
}

const watched = await watchScore();
const estimated = blocksOf(
  scenarios,
  (scenario, row) =>
    all
      .filter((run) => run.scenario === scenario)
      .map(({ seed }) => resultOf(scenario, row, seed, hashes))
      .filter((result) => result !== null),
  fresh,
);
const blocks = [...(scenarios.length > 0 ? estimated : []), ...(watched?.blocks ?? [])];
if (!values.brief) process.stdout.write(tableText(blocks));
if (!values.brief && watched !== null) console.log(`\n${watched.text}`);
const broken = failures.length + (watched?.failures.length ?? 0);
const marked = blocks.flatMap((block) => block.figures.filter((f) => f.met !== null));
const missed = marked.filter((f) => f.met === false);
const seconds = Math.round((performance.now() - started) / 1000);
console.log(
  `\n${marked.length - missed.length} goals met, ${missed.length} missed` +
    `${broken > 0 ? `, and ${broken} runs that ended by an error, which miss all of theirs` : ''}; ` +
    `${jobs.length} of ${all.length} runs anew in ${seconds} s, ` +
    `${Object.values(cpu_s)
      .reduce((a, b) => a + b, 0)
      .toFixed(0)} s of computing`,
);
const record = {
  time: new Date().toISOString(),
  hashes,
  fixed,
  fresh,
  seconds,
  cpu_s,
  failures,
  blocks,
};
writeFileSync(
  join(folder, values.quick ? 'quick.json' : 'latest.json'),
  `${JSON.stringify(record, null, 1)}\n`,
);
if (fresh.length > 0 && failures.length === 0) seedsDone();
for (const { job, error } of failures) {
  console.log(`FAILED: ${job.scenario} with seed ${job.seed}: ${firstLine(error)}`);
}
for (const { job, error } of watched?.failures ?? []) {
  console.log(`FAILED: watch, ${job.kind} with seed ${job.seed}: ${firstLine(error)}`);
}
let failed = broken > 0 || (values.strict && missed.length > 0);
if (values.quick) {
  const misses = missesOf(blocks);
  for (const words of misses.known) console.log(`known miss: ${words}`);
  for (const words of misses.met) console.log(`no longer missed, take it off known.ts: ${words}`);
  for (const words of misses.unknown) console.log(`MISSED: ${words}`);
  failed ||= misses.unknown.length > 0;
}
process.exit(failed ? 1 : 0);
