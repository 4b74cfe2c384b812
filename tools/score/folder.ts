import { createHash } from 'node:crypto';
import { readdirSync, readFileSync, statSync } from 'node:fs';
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

/** What a truth depends on: the finer plant, the sensor sets and the schedules. */
export const truthHash = (): string =>
  hashOf([
    'test/plant',
    'tools/score/sensorSets.ts',
    'tools/score/truthPlant.ts',
    'tools/score/truthColumns.ts',
    'tools/score/recording.ts',
    'tools/score/truthOf.ts',
  ]);

/** What a result depends on: the truth, the estimator, its configuration and the scoring. */
export const resultHash = (): string =>
  hashOf(['test/plant', 'test/score', 'tools/score', 'src/core', 'src/config', 'config/demo.yaml']);
