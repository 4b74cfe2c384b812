import './node-version.mjs';
import { spawnSync } from 'node:child_process';
import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { buildIfOlder } from './build.mjs';
import { onPath, root, run } from './programs.mjs';

function packages(path) {
  try {
    return JSON.parse(readFileSync(join(root, path), 'utf8')).packages;
  } catch {
    return null;
  }
}

/** What of package-lock.json is not installed in node_modules; null where all of it is. */
function missingPackage() {
  const wanted = packages('package-lock.json');
  const installed = packages('node_modules/.package-lock.json');
  if (installed === null) return 'node_modules';
  for (const [path, entry] of Object.entries(wanted)) {
    // Optional packages are those of other platforms.
    if (path === '' || entry.optional || entry.devOptional) continue;
    const found = installed[path];
    if (!found || found.version !== entry.version) return `${path}@${entry.version}`;
    if (!existsSync(join(root, path))) return path;
  }
  return null;
}

/** Whether the one compiled module loads in this very Node; a child, as a bad one can crash. */
function sqliteLoads() {
  const program = "new (require('better-sqlite3'))(':memory:').close()";
  return spawnSync(process.execPath, ['-e', program], { cwd: root }).status === 0;
}

/** Headers beside this Node spare node-gyp their download, if they are of the same version. */
function headers() {
  const prefix = dirname(dirname(process.execPath));
  const file = join(prefix, 'include', 'node', 'node_version.h');
  if (process.env.npm_config_nodedir || !existsSync(file)) return {};
  const text = readFileSync(file, 'utf8');
  const number = (name) => new RegExp(`#define NODE_${name}_VERSION (\\d+)`).exec(text)?.[1];
  const version = ['MAJOR', 'MINOR', 'PATCH'].map(number).join('.');
  return version === process.versions.node ? { npm_config_nodedir: prefix } : {};
}

/** One sentence for why an npm command failed. */
function reason(output) {
  const tools = ['python3', 'make', 'g++'].filter((name) => !onPath(name));
  if (/node-gyp|gyp ERR/.test(output)) {
    if (tools.length > 0) {
      return (
        `better-sqlite3 has to be compiled here and ${tools.join(', ')} ` +
        `${tools.length > 1 ? 'are' : 'is'} missing; on Debian or Ubuntu: ` +
        `apt-get install ${tools.join(' ')}`
      );
    }
    if (/ENOTFOUND|EAI_AGAIN|ECONNREFUSED|ETIMEDOUT/.test(output)) {
      return 'better-sqlite3 has to be compiled here and the headers of Node could not be downloaded: no network';
    }
    return 'compiling better-sqlite3 failed';
  }
  if (/ENOTFOUND|EAI_AGAIN|ECONNREFUSED|ETIMEDOUT|ECONNRESET|ENETUNREACH/.test(output)) {
    return 'the package registry cannot be reached: no network, or a proxy is needed';
  }
  if (/ENOSPC/.test(output)) return 'the disk is full';
  if (/EACCES|EPERM|EROFS/.test(output)) return 'this user may not write in the checkout';
  return 'npm failed';
}

async function npm(args, what) {
  const folder = mkdtempSync(join(tmpdir(), 'rockhour-setup-'));
  const log = join(folder, 'npm.log');
  console.error(`Set-up: ${what} ...`);
  const started = Date.now();
  const beat = setInterval(() => {
    console.error(`Set-up: still at it after ${Math.round((Date.now() - started) / 1000)} s`);
  }, 20_000);
  // npm names itself to its scripts; run by hand it is on the PATH.
  const self = process.env.npm_execpath;
  try {
    const code = self
      ? await run(process.execPath, [self, ...args], { log, env: headers() })
      : await run('npm', args, { log, env: headers() });
    if (code === 0) {
      rmSync(folder, { recursive: true, force: true });
      return;
    }
  } catch (error) {
    console.error(
      `Set-up failed: npm cannot be started (${error.code}). Install npm and try again.`,
    );
    process.exit(1);
  } finally {
    clearInterval(beat);
  }
  const output = readFileSync(log, 'utf8');
  console.error(`Set-up failed: ${reason(output)}. What npm said is in ${log}`);
  process.exit(1);
}

/** Installs what package-lock.json names where it is not there yet, and builds where needed. */
export async function setUp({ build }) {
  if (missingPackage() !== null) {
    // Two short retries: without a network the answer comes in half a minute instead of two.
    const patience = ['--fetch-retry-mintimeout=3000', '--fetch-retry-maxtimeout=10000'];
    const args = ['ci', '--no-audit', '--no-fund', ...patience];
    await npm(args, 'installing packages (a minute or two, once)');
  }
  if (!sqliteLoads()) {
    await npm(['rebuild', 'better-sqlite3'], 'compiling better-sqlite3 for this Node');
    if (!sqliteLoads()) {
      console.error('Set-up failed: better-sqlite3 was installed but does not load in this Node.');
      process.exit(1);
    }
  }
  if (build && !(await buildIfOlder())) process.exit(1);
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await setUp({ build: true });
