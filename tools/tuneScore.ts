/**
 * Holds `rockhour tune` against planted values: recordings of the finer plant, two days each, physics,
 * meter, machine and sensors drawn at random by seed. Resumable: runs are kept in .score/tune.
 *
 *   npx tsx tools/tuneScore.ts --runs 40 [--from 1] [--workers 2] [--brief] [--strict]
 *
 * `--from` is the first seed; those from 5000 on are kept for judging, never looked at while building.
 * `--strict` fails where a value lies within two standard errors in fewer than 36 of 40 runs.
 */
import { fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { table } from '../src/commands/table.js';
import { helpIfAsked } from './help.js';
import { type OneRun, oneRun } from './tune/oneRun.js';

helpIfAsked(import.meta.url);

const { values } = parseArgs({
  options: {
    runs: { type: 'string', default: '40' },
    from: { type: 'string', default: '1' },
    workers: { type: 'string', default: '2' },
    brief: { type: 'boolean', default: false },
    strict: { type: 'boolean', default: false },
    worker: { type: 'string' },
  },
});

function whole(name: 'runs' | 'from' | 'workers'): number {
  const value = Number(values[name]);
  if (Number.isInteger(value) && value > 0) return value;
  console.error(`--${name} must be a whole number above 0, got "${values[name]}"`);
  process.exit(2);
}

/** Share of runs that must lie within two standard errors. */
const GOAL = 36 / 40;

if (values.worker !== undefined) {
  for (const seed of values.worker.split(',').map(Number)) {
    const run = oneRun(seed);
    console.error(
      `seed ${seed}: ${run.seconds.toFixed(0)} s${run.converged ? '' : ', not settled'}`,
    );
  }
} else {
  const from = whole('from');
  const seeds = Array.from({ length: whole('runs') }, (_, i) => from + i);
  const workers = whole('workers');
  await Promise.all(
    Array.from({ length: workers }, (_, w) => started(seeds.filter((_, i) => i % workers === w))),
  );
  // All there by now: read from disk.
  report(seeds.map(oneRun));
}

function started(seeds: readonly number[]): Promise<void> {
  if (seeds.length === 0) return Promise.resolve();
  return new Promise((done, fail) => {
    const child = fork(fileURLToPath(import.meta.url), ['--worker', seeds.join(',')], {
      execArgv: process.execArgv,
    });
    child.once('exit', (code) =>
      code === 0 ? done() : fail(new Error(`a worker ended with ${code}`)),
    );
  });
}

function median(sorted: readonly number[]): number {
  return sorted[sorted.length >> 1] ?? Number.NaN;
}

function report(runs: readonly OneRun[]): void {
  const names = [...new Set(runs.flatMap((run) => run.compared.map(({ name }) => name)))];
  let missed = 0;
  const rows = names.map((name) => {
    const all = runs.flatMap((run) => run.compared.filter((one) => one.name === name));
    const told = all.filter(({ determined }) => determined);
    const z = told.map((one) => (one.told - one.planted) / one.sigma);
    const within = z.filter((one) => Math.abs(one) <= 2).length;
    const met = within >= GOAL * told.length;
    if (!met) missed++;
    const allWithin = all.filter((one) => Math.abs(one.told - one.planted) <= 2 * one.sigma).length;
    const rms = Math.sqrt(z.reduce((sum, one) => sum + one * one, 0) / Math.max(1, z.length));
    const sigma = median(all.map((one) => one.sigma).sort((a, b) => a - b));
    const error = Math.sqrt(
      all.reduce((sum, one) => sum + (one.told - one.planted) ** 2, 0) / all.length,
    );
    const spread = Math.sqrt(all.reduce((sum, one) => sum + one.planted ** 2, 0) / all.length);
    return [
      name,
      `${within}/${told.length}`,
      `${allWithin}/${all.length}`,
      all.length - told.length,
      sigma.toFixed(3),
      error.toFixed(3),
      spread.toFixed(3),
      told.length === 0 ? '-' : rms.toFixed(2),
      told.length === 0 || met ? '' : 'missed',
    ];
  });
  console.log(
    table(
      [
        'value',
        'within 2 s.e.',
        'all',
        'undetermined',
        's.e.',
        'error rms',
        'planted rms',
        'error/s.e.',
        '',
      ],
      rows,
    ),
  );
  if (!values.brief) {
    const seconds = runs.map((run) => run.seconds).sort((a, b) => a - b);
    const odd = runs.filter((run) => run.leftOut.length > 0);
    console.log(
      `\n${runs.length} runs, median ${median(seconds).toFixed(0)} s; not settled ${runs.filter((run) => !run.converged).length}; sound thermocouples left out in ${odd.length}`,
    );
    console.log(
      'Factors in ln. within 2 s.e.: of the runs in which the value was called determined;',
    );
    console.log('all: of all runs. Goal: 36 of 40.');
  }
  if (values.strict && missed > 0) process.exitCode = 1;
}
