import { readFileSync } from 'node:fs';
import { resolve } from 'node:path';
import type { Path } from './faults.js';
import type { SiteBlock } from './schema/site.js';

/** Passwords and keys of signatures, read at a start and never written into a fault, a log or an answer. */
export interface Secrets {
  readonly mqtt: string | null;
  readonly influx: string | null;
  /** By id of the receiver. */
  readonly webhooks: Readonly<Record<string, string | null>>;
}

export interface SecretFault {
  readonly path: Path;
  readonly found: string;
  readonly expected: string;
}

interface Source {
  readonly file: string | undefined;
  readonly env: string | undefined;
}

/** Reads the secrets that the site names; whatever cannot be read is a fault. */
export function readSecrets(
  site: SiteBlock,
  baseFolder: string,
  environment: Readonly<Record<string, string | undefined>>,
): { readonly secrets: Secrets; readonly faults: readonly SecretFault[] } {
  const faults: SecretFault[] = [];
  const read = (path: Path, what: string, word: string, source: Source): string | null => {
    const { file, env } = source;
    if (env !== undefined) {
      const value = environment[env];
      if (value !== undefined && value !== '') return value;
      faults.push({
        path: [...path, `${word}_env`],
        found: value === undefined ? 'a variable that is not set' : 'a variable that is empty',
        expected: `the name of an environment variable that holds the ${what}`,
      });
    }
    if (file !== undefined) {
      try {
        // Editors end a file with a line break; it is not part of the secret.
        const value = readFileSync(resolve(baseFolder, file), 'utf8').replace(/\r?\n$/, '');
        if (value !== '') return value;
        faults.push({
          path: [...path, `${word}_file`],
          found: 'an empty file',
          expected: `a file that holds the ${what}`,
        });
      } catch (error) {
        const code = (error as NodeJS.ErrnoException).code ?? 'unknown error';
        faults.push({
          path: [...path, `${word}_file`],
          found: `no file that can be read (${code})`,
          expected: `a file that holds the ${what}, relative to the configuration`,
        });
      }
    }
    return null;
  };
  const login = (section: 'mqtt' | 'influx'): string | null => {
    const { password_file: file, password_env: env } = site[section] ?? {};
    return read([section], 'password', 'password', { file, env });
  };
  const webhooks = site.notify.webhooks.map(({ id, secret_file: file, secret_env: env }, i) => [
    id,
    read(['notify', 'webhooks', i], 'secret', 'secret', { file, env }),
  ]);
  const secrets = {
    mqtt: login('mqtt'),
    influx: login('influx'),
    webhooks: Object.fromEntries(webhooks) as Record<string, string | null>,
  };
  return { secrets, faults };
}
