import { readFileSync } from 'node:fs';
import { resolve } from 'node:path';
import type { Path } from './faults.js';
import type { SiteBlock } from './schema/site.js';

/** Passwords, read at a start and never written into a fault, a log or an answer. */
export interface Secrets {
  readonly mqtt: string | null;
  readonly influx: string | null;
}

export interface SecretFault {
  readonly path: Path;
  readonly found: string;
  readonly expected: string;
}

type Login = {
  readonly password_file?: string | undefined;
  readonly password_env?: string | undefined;
};

/** Reads the passwords that the site names; whatever cannot be read is a fault. */
export function readSecrets(
  site: SiteBlock,
  baseFolder: string,
  environment: Readonly<Record<string, string | undefined>>,
): { readonly secrets: Secrets; readonly faults: readonly SecretFault[] } {
  const faults: SecretFault[] = [];
  const read = (section: string, login: Login | undefined): string | null => {
    if (login?.password_env !== undefined) {
      const value = environment[login.password_env];
      if (value !== undefined && value !== '') return value;
      faults.push({
        path: [section, 'password_env'],
        found: value === undefined ? 'a variable that is not set' : 'a variable that is empty',
        expected: 'the name of an environment variable that holds the password',
      });
    }
    if (login?.password_file !== undefined) {
      try {
        // Editors end a file with a line break; it is not part of the password.
        const value = readFileSync(resolve(baseFolder, login.password_file), 'utf8').replace(
          /\r?\n$/,
          '',
        );
        if (value !== '') return value;
        faults.push({
          path: [section, 'password_file'],
          found: 'an empty file',
          expected: 'a file that holds the password',
        });
      } catch (error) {
        const code = (error as NodeJS.ErrnoException).code ?? 'unknown error';
        faults.push({
          path: [section, 'password_file'],
          found: `no file that can be read (${code})`,
          expected: 'a file that holds the password, relative to the configuration',
        });
      }
    }
    return null;
  };
  const secrets = { mqtt: read('mqtt', site.mqtt), influx: read('influx', site.influx) };
  return { secrets, faults };
}
