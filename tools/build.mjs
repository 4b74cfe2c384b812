import './node-version.mjs';
import { existsSync, readdirSync, renameSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { root, runPackage } from './programs.mjs';

const page = join(root, 'src', 'adapters', 'page', 'vite.config.ts');

/** Newest change below a path; folders count too, as a removed file changes its folder. */
function newest(path) {
  const { mtimeMs } = statSync(path);
  if (!statSync(path).isDirectory()) return mtimeMs;
  return readdirSync(path).reduce(
    (most, name) => Math.max(most, newest(join(path, name))),
    mtimeMs,
  );
}

function isOlder() {
  const stamp = join(root, 'dist', '.built');
  if (!existsSync(stamp)) return true;
  const built = statSync(stamp).mtimeMs;
  return ['src', 'tsconfig.json', 'package-lock.json'].some(
    (path) => newest(join(root, path)) > built,
  );
}

/**
 * Compiles into a folder of its own and then puts it in the place of dist, so that a failed build
 * leaves the last good one, and a removed source leaves nothing behind. True when it succeeded.
 */
export async function build() {
  const fresh = join(root, `dist.${process.pid}`);
  const started = new Date();
  try {
    const compiled = await runPackage('typescript/bin/tsc', [
      '-p',
      'tsconfig.json',
      '--outDir',
      fresh,
    ]);
    if (compiled !== 0) return false;
    if (existsSync(page)) {
      const args = ['build', '--config', page, '--outDir', join(fresh, 'page')];
      args.push('--emptyOutDir', '--logLevel', 'warn');
      if ((await runPackage('vite/bin/vite.js', args)) !== 0) return false;
    }
    writeFileSync(join(fresh, '.built'), `${started.toISOString()}\n`);
    rmSync(join(root, 'dist'), { recursive: true, force: true });
    renameSync(fresh, join(root, 'dist'));
    return true;
  } finally {
    rmSync(fresh, { recursive: true, force: true });
  }
}

/** Builds where dist is missing or older than the sources. False when the build failed. */
export async function buildIfOlder() {
  if (!isOlder()) return true;
  console.error('Set-up: building ...');
  const ok = await build();
  if (!ok) console.error('Set-up failed: the build failed; what the compiler said stands above.');
  return ok;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) process.exit((await build()) ? 0 : 1);
