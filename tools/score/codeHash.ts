import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { build } from 'vite';
import { root } from './folder.js';

/**
 * Hash of what a module does: its own code and all of the project's that it reaches, bundled, with
 * what is not reached, types, comments and layout taken out. Packages are not part of it.
 * @param module path within the project
 */
export async function codeHash(module: string): Promise<string> {
  const built = await build({
    configFile: false,
    root,
    logLevel: 'error',
    build: { ssr: join(root, module), write: false, minify: true, target: 'node20' },
  });
  if (!('output' in built)) throw new Error(`bundle of ${module}: not a single one`);
  const hash = createHash('sha256');
  for (const part of built.output) hash.update(part.type === 'chunk' ? part.code : part.fileName);
  return hash.digest('hex').slice(0, 12);
}

/** What a truth depends on, its plan aside: the finer plant and what reads it. */
export const truthHash = (): Promise<string> => codeHash('tools/score/makeTruth.ts');

/** What a result depends on: the truth, the estimator, its configuration and the scoring. */
export async function resultHash(): Promise<string> {
  const hash = createHash('sha256');
  for (const module of ['makeTruth', 'job'])
    hash.update(await codeHash(`tools/score/${module}.ts`));
  return hash
    .update(readFileSync(join(root, 'config/demo.yaml')))
    .digest('hex')
    .slice(0, 12);
}
