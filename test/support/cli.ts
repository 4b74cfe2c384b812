import { type ChildProcess, spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';

const root = fileURLToPath(new URL('../..', import.meta.url));

/** Arguments of node for a rockhour command: what was built under `npm test`, else the sources. */
function nodeArguments(args: readonly string[]): string[] {
  return process.env.ROCKHOUR_TEST_BUILT
    ? ['dist/main.js', ...args]
    : ['--import', 'tsx', 'src/main.ts', ...args];
}

/**
 * Starts `rockhour ARGS` in the checkout, as a user would; the caller ends it.
 *
 * @param through a program and its arguments that run it, such as strace
 */
export function startRockhour(
  args: readonly string[],
  env: Readonly<Record<string, string>> = {},
  through: readonly string[] = [],
): ChildProcess {
  const [program, ...rest] = [...through, process.execPath, ...nodeArguments(args)];
  return spawn(program!, rest, {
    cwd: root,
    stdio: ['ignore', 'pipe', 'pipe'],
    env: { ...process.env, ...env },
  });
}

export interface Finished {
  readonly code: number | null;
  readonly stdout: string;
  readonly stderr: string;
}

/** Runs `rockhour ARGS` to its end. */
export function rockhour(
  args: readonly string[],
  env: Readonly<Record<string, string>> = {},
): Promise<Finished> {
  return new Promise((resolve, reject) => {
    const child = startRockhour(args, env);
    let stdout = '';
    let stderr = '';
    child.stdout?.on('data', (chunk: Buffer) => {
      stdout += chunk.toString();
    });
    child.stderr?.on('data', (chunk: Buffer) => {
      stderr += chunk.toString();
    });
    child.once('error', reject);
    child.once('close', (code) => resolve({ code, stdout, stderr }));
  });
}
