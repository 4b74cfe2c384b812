import { accessSync, appendFileSync, constants } from 'node:fs';
import { delimiter, join } from 'node:path';

/**
 * Programs from outside that some tests run for real. `npm test` prints at its end, by name, the
 * ones that this machine lacks; with CI=true a lacking one fails the run.
 */
export const PROGRAMS = {
  mosquitto: { names: ['mosquitto'], package: 'mosquitto' },
  influxd: { names: ['influxd'], package: 'influxdb' },
  systemdAnalyze: { names: ['systemd-analyze'], package: 'systemd' },
  strace: { names: ['strace'], package: 'strace' },
  openssl: { names: ['openssl'], package: 'openssl' },
  chromium: { names: ['chromium', 'chromium-browser'], package: 'chromium' },
} as const;
export type ProgramName = keyof typeof PROGRAMS;

// Debian keeps servers in sbin, which is not on an ordinary user's PATH.
const EXTRA_FOLDERS = ['/usr/local/sbin', '/usr/sbin', '/usr/bin'];

function runnable(path: string): boolean {
  try {
    accessSync(path, constants.X_OK);
    return true;
  } catch {
    return false;
  }
}

/** Full path of a program by any of its names, or null where this machine has none. */
export function findProgram(names: readonly string[]): string | null {
  const folders = [...(process.env.PATH ?? '').split(delimiter).filter(Boolean), ...EXTRA_FOLDERS];
  for (const name of names) {
    for (const folder of folders) {
      const path = join(folder, name);
      if (runnable(path)) return path;
    }
  }
  return null;
}

/**
 * Full path of the program, or null, which is entered in the register that `npm test` prints:
 *
 *     const mosquitto = requireProgram('mosquitto');
 *     describe.skipIf(!mosquitto)('against a real broker', () => { ... });
 */
export function requireProgram(name: ProgramName): string | null {
  const path = findProgram(PROGRAMS[name].names);
  if (path !== null) return path;
  // One file for all worker processes: an append of one short line is not torn.
  const register = process.env.ROCKHOUR_TEST_REGISTER;
  if (register) appendFileSync(register, `${name} (package ${PROGRAMS[name].package})\n`);
  return null;
}
