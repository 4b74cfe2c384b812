/**
 * npm run score:watch: the watch of a unit against the finer plant. Graded faults that set in after a
 * healthy lead (a day with part loads, a charge, 36 h of rest), one plant, machine, meter and set of
 * sensors per seed; and healthy days of cycling at changing power and weather.
 *
 *   npm run score:watch -- [--seeds 20] [--from SEED] [--tuning] [--only strongest,weeks] [--strict]
 *     [--workers 2] [--truths-only]
 *   npx tsx tools/watchScore.ts --trace SEED BRANCH [--kinds heat_transfer,string_flow] [--every 1]
 *     [--before]
 *
 * Seeds are from 30000 on, kept for judging and never looked at while building; --tuning takes 1, 2,
 * ... instead, --from others. Healthy weeks take plants of their own, 500 seeds on. Truths and results
 * are kept in .score/watch: a run that was stopped goes on where it was, and a run after a change of the
 * estimator needs no new truths. --only takes `weeks`, `branches`, `strongest` (grades, and no fault)
 * or single branches. --strict ends with code 1 where a goal is missed.
 *
 * --trace runs one branch of one seed with the code as it is, and writes hour by hour (--every, in
 * hours) what has changed of each indicator (value, sigma, healthy, limit, score, state), and at once
 * what is raised, returned or held for the cause. BRANCH is transfer-70, -50, -30, -16, channel-5, -10,
 * -22, meter-7, drop-1.2, drop-1.5, settled-150, insulation-2, leak-0.5, healthy, lead or weeks;
 * --before shows the healthy lead hour by hour, too; its alerts are always shown.
 */
import { parseArgs } from 'node:util';
import { helpIfAsked } from './help.js';
import { codeHash } from './score/codeHash.js';
import { tableText } from './score/table.js';
import {
  ALL_PARTS,
  PART_WORDS,
  partsOf,
  scoreWatch,
  WATCH_FROM,
  WATCH_SEEDS,
} from './watch/runWatch.js';
import { trace } from './watch/trace.js';
import { branchOf } from './watch/watchJob.js';
import { TRUTH_CODE } from './watch/watchTruth.js';

helpIfAsked(import.meta.url);

const { values, positionals } = parseArgs({
  allowPositionals: true,
  options: {
    seeds: { type: 'string', default: String(WATCH_SEEDS) },
    from: { type: 'string' },
    tuning: { type: 'boolean', default: false },
    only: { type: 'string' },
    workers: { type: 'string', default: '2' },
    strict: { type: 'boolean', default: false },
    'truths-only': { type: 'boolean', default: false },
    trace: { type: 'string' },
    kinds: { type: 'string', default: '' },
    every: { type: 'string', default: '1' },
    before: { type: 'boolean', default: false },
  },
});

function refuse(text: string): never {
  console.error(text);
  process.exit(2);
}

function above(name: string, text: string, whole = true): number {
  const value = Number(text);
  if (value > 0 && (!whole || Number.isInteger(value))) return value;
  return refuse(`--${name} must be a ${whole ? 'whole number' : 'number'} above 0, got "${text}"`);
}

if (values.trace !== undefined) {
  const branch = positionals[0] ?? refuse('--trace SEED BRANCH: BRANCH is missing');
  if (branchOf(branch) === undefined && branch !== 'lead' && branch !== 'weeks')
    refuse(`no branch "${branch}"; --help names them`);
  const options = {
    seed: above('trace', values.trace),
    branch,
    only: values.kinds.split(',').filter((kind) => kind !== ''),
    every_h: above('every', values.every, false),
    before: values.before,
    write: (line: string) => console.log(line),
  };
  trace(options, await codeHash(TRUTH_CODE));
  process.exit(0);
}

const words = values.only?.split(',') ?? [];
const unknown = words.filter((word) => !PART_WORDS.includes(word));
if (unknown.length > 0) {
  refuse(`--only must be of ${PART_WORDS.join(', ')}; got ${unknown.join(', ')}`);
}
const { text, blocks, failures } = await scoreWatch({
  from: above('from', values.from ?? String(values.tuning ? 1 : WATCH_FROM)),
  seeds: above('seeds', values.seeds),
  parts: words.length > 0 ? partsOf(words) : ALL_PARTS,
  workers: above('workers', values.workers),
  truths: values['truths-only'],
  progress: (line) => console.error(line),
});
for (const { job, error } of failures) {
  console.error(`${job.kind} with seed ${job.seed} failed: ${error}`);
}
console.log(text);
process.stdout.write(tableText(blocks));
const missed = blocks.flatMap((block) => block.figures.filter((f) => f.met === false));
process.exit(failures.length > 0 || (values.strict && missed.length > 0) ? 1 : 0);
