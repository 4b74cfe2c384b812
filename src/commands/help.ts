import { EXIT_CODES } from '../errors.js';
import { table } from './table.js';

/** What `rockhour --help` says after the commands. */
export function closingHelp(): string {
  const rows = Object.values(EXIT_CODES).map(({ code, meaning }) => [code, meaning]);
  return [
    '',
    'Exit codes:',
    ...table(['code', 'meaning'], rows)
      .split('\n')
      .map((line) => `  ${line}`),
    '',
    'Answers go to standard output, everything else to standard error.',
    'ROCKHOUR_DEBUG=1 adds to an error where in the program it arose.',
    'rockhour advises: it trips nothing and writes nothing to the control system.',
  ].join('\n');
}
