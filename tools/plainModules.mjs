import { existsSync } from 'node:fs';
import { readFile } from 'node:fs/promises';
import { fileURLToPath } from 'node:url';
import { transformWithOxc } from 'vite';

/** A hook of node:module: what is imported as .js and stands there as .ts is that. */
export function resolve(specifier, context, next) {
  if (specifier.startsWith('.') && specifier.endsWith('.js') && context.parentURL !== undefined) {
    const url = new URL(`${specifier.slice(0, -3)}.ts`, context.parentURL);
    if (existsSync(fileURLToPath(url))) return next(url.href, context);
  }
  return next(specifier, context);
}

/** A hook of node:module: TypeScript without its types. */
export async function load(url, context, next) {
  if (!url.startsWith('file:') || !new URL(url).pathname.endsWith('.ts')) return next(url, context);
  const file = fileURLToPath(url);
  const { code, map } = await transformWithOxc(await readFile(file, 'utf8'), file, {
    target: 'node20',
    sourcemap: true,
  });
  const inline = Buffer.from(JSON.stringify(map)).toString('base64');
  const source = `${code}\n//# sourceMappingURL=data:application/json;base64,${inline}\n`;
  return { format: 'module', source, shortCircuit: true };
}
