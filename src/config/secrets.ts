import { readFileSync } from 'node:fs';
import { resolve } from 'node:path';
import { type AccessToken, repeatedToken } from '../access/token.js';
import { LINE_WORDS, readTokens } from '../access/tokensFile.js';
import { type Path, pathText } from './faults.js';
import type { SiteBlock } from './schema/site.js';
import type { ClientTls, SecretFile, ServerTls } from './site.js';
import { TlsFiles } from './tlsFiles.js';

/** Passwords and keys of signatures, read at a start and never written into a fault, a log or an answer. */
export interface Secrets {
  readonly mqtt: string | null;
  readonly influx: string | null;
  /** By id of the receiver. */
  readonly webhooks: Readonly<Record<string, string | null>>;
  readonly webhooks_tls: Readonly<Record<string, ClientTls | null>>;
  /** Tokens of http.tokens_file. */
  readonly tokens: readonly AccessToken[];
  readonly mqtt_tls: ClientTls | null;
  readonly influx_tls: ClientTls | null;
  readonly embedded_tls: ServerTls | null;
  readonly http_tls: ServerTls | null;
  /** Files that hold secrets. */
  readonly files: readonly SecretFile[];
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
  const files: SecretFile[] = [];
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
      files.push({ path: pathText([...path, `${word}_file`]), file: resolve(baseFolder, file) });
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
  const tls = new TlsFiles(baseFolder, faults, files);
  const secrets = {
    tokens: tokensOf(site, baseFolder, faults),
    mqtt_tls: tls.client(['mqtt', 'tls'], site.mqtt.tls),
    influx_tls: tls.client(['influx', 'tls'], site.influx?.tls),
    http_tls: tls.server(['http', 'tls'], site.http.tls),
    embedded_tls: tls.server(['mqtt', 'embedded_tls'], site.mqtt.embedded_tls),
    files,
    mqtt: login('mqtt'),
    influx: login('influx'),
    webhooks: Object.fromEntries(webhooks) as Record<string, string | null>,
    webhooks_tls: Object.fromEntries(
      site.notify.webhooks.map(({ id, tls: block }, i) => [
        id,
        tls.client(['notify', 'webhooks', i, 'tls'], block),
      ]),
    ),
  };
  return { secrets, faults };
}

/** Tokens of the file beside the configuration; a name or hash that stands in both is a fault. */
function tokensOf(
  site: SiteBlock,
  baseFolder: string,
  faults: SecretFault[],
): readonly AccessToken[] {
  const { tokens, tokens_file: file } = site.http;
  if (file === undefined) return [];
  const path = ['http', 'tokens_file'];
  let text: string;
  try {
    text = readFileSync(resolve(baseFolder, file), 'utf8');
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? 'unknown error';
    const expected = `a file of ${LINE_WORDS}, relative to the configuration`;
    faults.push({ path, found: `no file that can be read (${code})`, expected });
    return [];
  }
  const read = readTokens(text);
  if ('fault' in read) {
    faults.push({ path, found: `a file with ${read.fault}`, expected: LINE_WORDS });
    return [];
  }
  const twice = repeatedToken([...tokens, ...read]);
  if (twice !== null && twice.index >= tokens.length) {
    const found = `a file with a ${twice.what} that http.tokens has as well`;
    faults.push({ path, found, expected: 'each token in one place' });
  }
  return read;
}
