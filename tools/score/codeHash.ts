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

/**
 * What the results of scenarios depend on, by their module in own/: the estimator, the scoring, the
 * scenarios of that module, the truth and the configuration. Other scenarios are no part of it.
 */
export async function resultHashes(modules: Iterable<string>): Promise<Record<string, string>> {
  const common = (await truthHash()) + readFileSync(join(root, 'config/demo.yaml'), 'utf8');
  const found: Record<string, string> = {};
  for (const module of new Set(modules)) {
    const own = await codeHash(`tools/score/own/${module}.ts`);
    found[module] = createHash('sha256').update(common).update(own).digest('hex').slice(0, 12);
  }
  return found;
}
