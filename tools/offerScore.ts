/**
 * Holds offers against the finer plant: one case per seed, machine, physics, meter and sensors drawn
 * at random, one cycle behind it, 40, 70 or 100 % power after 0, 4 or 12 h. Resumable: truths and
 * results are kept in .score/offers.
 *
 *   npm run score:offers -- [--cases 216] [--from 20000] [--workers 2] [--truths-only]
 *
 * `--from` is the first seed; those from 20000 on are kept for judging, never looked at while
 * building (1, 2, ... are for that). Zero-hour cases do not count as hits.
 */
import { fork } from 'node:child_process';
import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { table } from '../src/commands/table.js';
import { type OfferHashes, type OfferResult, offerResults, SETS } from './offers/offerEstimate.js';
import { offerTruth, PREPARATIONS, SHARES, WAITS_H } from './offers/offerTruth.js';
import { codeHash } from './score/codeHash.js';
import { root } from './score/folder.js';
import { unitWith } from './score/sensorSets.js';
import { bestShiftedPinball, binomialInterval, pinball } from './score/statistics.js';

const { values } = parseArgs({
  options: {
    cases: { type: 'string', default: '216' },
    from: { type: 'string', default: '20000' },
    workers: { type: 'string', default: '2' },
    seeds: { type: 'string' },
    hashes: { type: 'string' },
    'truths-only': { type: 'boolean', default: false },
    help: { type: 'boolean', default: false },
  },
});

if (values.help) {
  const text = readFileSync(fileURLToPath(import.meta.url), 'utf8');
  console.log(text.slice(4, text.indexOf('*/')).replace(/^ \* ?/gm, ''));
  process.exit(0);
}

function whole(name: 'cases' | 'from' | 'workers'): number {
  const value = Number(values[name]);
  if (Number.isInteger(value) && value > 0) return value;
  console.error(`--${name} must be a whole number above 0, got "${values[name]}"`);
  process.exit(2);
}

if (values.seeds !== undefined) {
  const hashes = JSON.parse(values.hashes as string) as OfferHashes;
  for (const seed of values.seeds.split(',').map(Number)) {
    if (values['truths-only']) offerTruth(seed, hashes.truth);
    else offerResults(seed, hashes);
  }
} else {
  const hashes = await hashesNow();
  const from = whole('from');
  const seeds = Array.from({ length: whole('cases') }, (_, i) => from + i);
  const workers = whole('workers');
  const started = performance.now();
  await Promise.all(
    Array.from({ length: workers }, (_, w) =>
      run(
        seeds.filter((_, i) => i % workers === w),
        hashes,
      ),
    ),
  );
  console.log(`${seeds.length} cases in ${((performance.now() - started) / 1000).toFixed(0)} s`);
  if (values['truths-only']) process.exit(0);
  const all = seeds.flatMap((seed) => offerResults(seed, hashes));
  for (const set of SETS) report(all.filter((one) => one.set === set));
}

async function hashesNow(): Promise<OfferHashes> {
  const truth = await codeHash('tools/offers/offerTruth.ts');
  const code = await codeHash('tools/offers/offerEstimate.ts');
  const config = readFileSync(join(root, 'config/demo.yaml'), 'utf8');
  const result = createHash('sha256').update(truth).update(code).update(config).digest('hex');
  return { truth, result: result.slice(0, 12) };
}

function run(seeds: readonly number[], hashes: OfferHashes): Promise<void> {
  if (seeds.length === 0) return Promise.resolve();
  return new Promise((done, fail) => {
    const own = ['--seeds', seeds.join(','), '--hashes', JSON.stringify(hashes)];
    if (values['truths-only']) own.push('--truths-only');
    const child = fork(fileURLToPath(import.meta.url), own, { execArgv: process.execArgv });
    child.once('exit', (code) =>
      code === 0 ? done() : fail(new Error(`a worker ended with ${code}`)),
    );
  });
}

function report(results: readonly OfferResult[]): void {
  const set = results[0]?.set;
  if (set === undefined) return;
  const rated_h = unitWith(set, 'class').rated_hours;
  const groups: [string, OfferResult[]][] = [
    ['all', [...results]],
    ...SHARES.map((share): [string, OfferResult[]] => [
      `${100 * share} %`,
      results.filter((one) => one.share === share),
    ]),
    ...WAITS_H.map((wait): [string, OfferResult[]] => [
      `after ${wait} h`,
      results.filter((one) => one.wait_h === wait),
    ]),
    ...PREPARATIONS.map((name): [string, OfferResult[]] => [
      name,
      results.filter((one) => one.preparation === name),
    ]),
  ];
  const rows = groups.filter(([, own]) => own.length > 0).map(([name, own]) => line(name, own));
  const head = ['', 'cases', 'rms h', 'mean h', 'truth/sigma', '< p90', '90 %', '< p50', '50 %'];
  console.log(`\nsensors: ${set}; asked: rms at most ${(0.02 * rated_h).toFixed(2)} h`);
  console.log(table([...head, 'pinball p90', 'lines', 'p50', 'lines '], rows));

  function line(name: string, own: readonly OfferResult[]): string[] {
    const n = own.length;
    const errors = own.map((one) => one.p50 - one.truth_h);
    const rms = Math.sqrt(errors.reduce((sum, e) => sum + e * e, 0) / n);
    const mean = errors.reduce((sum, e) => sum + e, 0) / n;
    const z = own.flatMap((one) => {
      const sigma = (one.p10 - one.p90) / (2 * 1.2815515655446004);
      return sigma > 0 ? [((one.p50 - one.truth_h) / sigma) ** 2] : [];
    });
    const ratio = Math.sqrt(z.reduce((sum, v) => sum + v, 0) / z.length);
    const counted = own.filter((one) => one.truth_h > 0 || one.p10 > 0);
    const below = (of: (one: OfferResult) => number, p: number): string[] => {
      const shares = counted.map((one) => ({ hits: one.truth_h < of(one) ? 1 : 0, cases: 1 }));
      const { low, high, share } = binomialInterval(p, shares);
      const met = share >= low && share <= high;
      return [
        `${(100 * share).toFixed(1)} %${met ? '' : ' MISSED'}`,
        `${(100 * low).toFixed(0)}-${(100 * high).toFixed(0)}`,
      ];
    };
    const loss = (tau: number, of: (one: OfferResult) => number): string[] => {
      const mine = own.map((one) => ({ truth: one.truth_h, quantile: of(one) }));
      const lines = own.map((one) => ({ truth: one.truth_h, forecast: one.line_h }));
      return [pinball(tau, mine).toFixed(4), bestShiftedPinball(tau, lines).loss.toFixed(4)];
    };
    return [
      name,
      String(n),
      `${rms.toFixed(3)}${rms <= 0.02 * rated_h ? '' : ' MISSED'}`,
      mean.toFixed(3),
      ratio.toFixed(2),
      ...below((one) => one.p90, 0.1),
      ...below((one) => one.p50, 0.5),
      ...loss(0.1, (one) => one.p90),
      ...loss(0.5, (one) => one.p50),
    ];
  }
}
