import { execFileSync } from 'node:child_process';
import { writeFileSync } from 'node:fs';
import { basename, join } from 'node:path';
import { temporaryFolder } from './folders.js';
import { requireProgram } from './requirements.js';

/** Files of an authority and of what it has signed, made by openssl for one test file. */
export interface Certificates {
  /** File of the authority. */
  readonly ca: string;
  /**
   * Signs a certificate for these host names and addresses.
   * @param ended its time is over, since 2020
   */
  make(
    name: string,
    hosts: readonly string[],
    ended?: boolean,
  ): { readonly cert: string; readonly key: string };
}

/**
 * An authority of its own, with elliptic keys: made in a few hundredths of a second. Where there is
 * no openssl, names of files that are not there: also a `describe` that is skipped is run through.
 */
export function makeCertificates(openssl = requireProgram('openssl')): Certificates {
  const folder = temporaryFolder('certificates');
  const at = (name: string) => join(folder, name);
  const run = (...args: string[]) => {
    if (openssl !== null) execFileSync(openssl, args, { stdio: 'pipe' });
  };
  const newKey = (file: string) => [
    ...['-newkey', 'ec', '-pkeyopt', 'ec_paramgen_curve:P-256'],
    ...['-nodes', '-keyout', file],
  ];
  const [ca, caKey, settings] = [at('ca.pem'), at('ca.key'), at('ca.cnf')];
  run(
    'req',
    '-x509',
    ...newKey(caKey),
    '-out',
    ca,
    '-days',
    '2',
    '-subj',
    `/CN=${basename(folder)}`,
  );
  writeFileSync(at('index.txt'), '');
  const lines = [
    ...['[ca]', 'default_ca = own', '[own]', `database = ${at('index.txt')}`],
    ...[`new_certs_dir = ${folder}`, 'rand_serial = yes', 'default_md = sha256'],
    ...['unique_subject = no', 'policy = any', '[any]', 'commonName = supplied'],
  ];
  writeFileSync(settings, `${lines.join('\n')}\n`);
  return {
    ca,
    make(name, hosts, ended = false) {
      const [key, request, cert, extra] = [
        at(`${name}.key`),
        at(`${name}.csr`),
        at(`${name}.pem`),
        at(`${name}.ext`),
      ];
      run('req', '-new', ...newKey(key), '-out', request, '-subj', `/CN=${name}`);
      const names = hosts.map((host) => `${/^[\d.]+$/.test(host) ? 'IP' : 'DNS'}:${host}`);
      writeFileSync(extra, names.length > 0 ? `subjectAltName=${names.join(',')}\n` : '\n');
      const times = ended
        ? ['-startdate', '20200101000000Z', '-enddate', '20200102000000Z']
        : ['-days', '1'];
      run(
        ...['ca', '-batch', '-notext', '-config', settings, '-cert', ca, '-keyfile', caKey],
        ...['-in', request, '-out', cert, '-extfile', extra, ...times],
      );
      return { cert, key };
    },
  };
}
