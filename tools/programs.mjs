import { spawn } from 'node:child_process';
import { accessSync, closeSync, constants, openSync } from 'node:fs';
import { delimiter, join } from 'node:path';
import { fileURLToPath } from 'node:url';

/** Top of the checkout. */
export const root = fileURLToPath(new URL('..', import.meta.url));

const plain = new URL('plain.mjs', import.meta.url).href;

/** Whether a program is on the PATH. */
export function onPath(name) {
  return (process.env.PATH || '').split(delimiter).some((folder) => {
    try {
      accessSync(join(folder, name), constants.X_OK);
      return true;
    } catch {
      return false;
    }
  });
}

/**
 * Runs a program in the checkout and gives its exit code (128 + n after a signal). Its output goes
 * to the terminal, or to `log` where one is named; `env` adds to the environment.
 */
export function run(command, args, { log, env } = {}) {
  const out = log ? openSync(log, 'w') : 'inherit';
  return new Promise((resolve, reject) => {
    const child = spawn(command, args, {
      cwd: root,
      stdio: ['ignore', out, out],
      env: { ...process.env, ...env },
    });
    // An interrupt at the terminal reaches the child as well: wait for it to end in its own way.
    const pass = (signal) => child.kill(signal);
    const signals = ['SIGTERM', 'SIGINT', 'SIGHUP'];
    for (const signal of signals) process.on(signal, pass);
    const done = () => {
      for (const signal of signals) process.off(signal, pass);
      if (log) closeSync(out);
    };
    child.once('error', (error) => {
      done();
      reject(error);
    });
    child.once('exit', (code, signal) => {
      done();
      resolve(signal ? 128 + (signal === 'SIGINT' ? 2 : 15) : code);
    });
  });
}

/** Runs the program of an installed package by its path inside node_modules. */
export function runPackage(path, args, options) {
  return run(process.execPath, [join(root, 'node_modules', path), ...args], options);
}

/** Runs a source of TypeScript in a Node of its own, as fast as it runs when built. */
export function runPlain(path, args, options) {
  return run(process.execPath, ['--import', plain, join(root, path), ...args], options);
}
