import { expect } from 'vitest';
import { ERRORS, type ErrorCode, EXIT_CODES } from '../../src/errors.js';
import { type Finished, rockhour } from '../support/cli.js';

/**
 * Runs a command that must be refused, and holds its answer against what every refusal is: one
 * message on standard error that names what is wrong and ends with advice and code, no stack,
 * nothing on standard output, and the exit code of the catalogue.
 */
export async function refused(
  args: readonly string[],
  code: ErrorCode,
  ...parts: readonly (string | RegExp)[]
): Promise<Finished> {
  const finished = await rockhour(args);
  expectRefusal(finished, code, ...parts);
  expect(finished.stdout).toBe('');
  return finished;
}

export function expectRefusal(
  { code: exit, stderr }: Finished,
  code: ErrorCode,
  ...parts: readonly (string | RegExp)[]
): void {
  for (const part of parts) expect(stderr).toMatch(part);
  expect(stderr.match(/^rockhour: /gm), stderr).toHaveLength(1);
  expect(stderr.match(/\[[A-Z]+(_[A-Z]+)*\]$/gm)).toEqual([`[${code}]`]);
  expect(stderr).not.toMatch(/^\s+at |undefined|\bE[A-Z]{3,}:/m);
  expect(exit).toBe(EXIT_CODES[ERRORS[code].exit].code);
}
