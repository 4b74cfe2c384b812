import { createHash } from 'node:crypto';
import { mkdirSync, readdirSync, readFileSync, rmSync, statSync, utimesSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

export const root = fileURLToPath(new URL('../..', import.meta.url));
/** Truths, results and remembered seeds; not part of the project. */
export const folder = join(root, '.score');

/** Files below some paths of the project, sorted. */
function filesOf(path: string): string[] {
  if (!statSync(path).isDirectory()) return [path];
  return readdirSync(path)
    .sort()
    .flatMap((name) => filesOf(join(path, name)));
}

function hashOf(paths: readonly string[]): string {
  const hash = createHash('sha256');
  for (const file of paths.flatMap((p) => filesOf(join(root, p)))) {
    hash.update(file.slice(root.length)).update('\0').update(readFileSync(file)).update('\0');
  }
  return hash.digest('hex').slice(0, 12);
}

const own = (...names: string[]) => names.map((name) => `tools/score/${name}.ts`);
const TRUTH = [
  'test/plant',
  ...own('sensorSets', 'truthPlant', 'truthColumns', 'recording', 'truthOf'),
];

/** What a truth depends on, its plan aside: the finer plant and what reads it. */
export const truthHash = (): string => hashOf(TRUTH);

/** What a result depends on: the truth, the estimator, its configuration and the scoring. */
export const resultHash = (): string =>
  hashOf([
    ...TRUTH,
    ...own('scenarios', 'series', 'tally', 'job'),
    'tools/score/own',
    'test/score/straightLines.ts',
    'src/core',
    'src/config',
    'config/demo.yaml',
  ]);

/** Makes the folder of a kind and keeps the last few others of that kind that were used. */
export function keepFolders(kind: 'truth' | 'results', mine: string, others: number): void {
  const path = join(folder, kind);
  mkdirSync(join(path, mine), { recursive: true });
  const now = new Date();
  utimesSync(join(path, mine), now, now);
  const rest = readdirSync(path, { withFileTypes: true })
    .filter((entry) => entry.isDirectory() && entry.name !== mine)
    .map((entry) => ({ name: entry.name, used: statSync(join(path, entry.name)).mtimeMs }))
    .sort((a, b) => b.used - a.used);
  for (const { name } of rest.slice(others)) {
    rmSync(join(path, name), { recursive: true, force: true });
  }
}
