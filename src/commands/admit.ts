import type { Command } from 'commander';
import { ROLES, type Role } from '../access/role.js';
import { hashOf, makeToken, NAME_PATTERN, NAME_WORDS } from '../access/token.js';
import { RockhourError } from '../errors.js';

interface AdmitOptions {
  readonly name: string;
  readonly role: string;
  readonly json?: boolean;
}

/** A new token of this name, once in the clear, and what of it stands in the configuration. */
function admit({ name, role, json }: AdmitOptions): string {
  if (!NAME_PATTERN.test(name)) {
    throw new RockhourError('USAGE', `--name is ${JSON.stringify(name)}; expected ${NAME_WORDS}`);
  }
  if (!ROLES.includes(role as Role)) {
    throw new RockhourError(
      'USAGE',
      `--role is ${JSON.stringify(role)}; expected one of ${ROLES.join(', ')}`,
    );
  }
  const token = makeToken();
  const hash = hashOf(token);
  if (json) return JSON.stringify({ name, role, token, hash }, null, 2);
  return [
    `Token of ${name}, shown this once; hand it over and keep it nowhere else:`,
    `  ${token}`,
    '',
    'In the configuration, under http.tokens:',
    `  - { name: ${name}, role: ${role}, hash: '${hash}' }`,
    'or as a line of the file that http.tokens_file names:',
    `  ${name} ${role} ${hash}`,
  ].join('\n');
}

/** `rockhour admit`: makes a token; it writes no file. */
export function register(program: Command): void {
  program
    .command('admit')
    .description('makes a token: prints it once, and its line for the configuration')
    .requiredOption('--name <name>', 'whose it is; recorded with what is done')
    .requiredOption('--role <role>', ROLES.join(', '))
    .option('--json', 'the same as JSON on standard output')
    .action((options: AdmitOptions) => {
      process.stdout.write(`${admit(options)}\n`);
    });
}
