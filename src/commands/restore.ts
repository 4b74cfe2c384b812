import { readFileSync } from 'node:fs';
import type { Command } from 'commander';
import { fileReasonOf, RockhourError } from '../errors.js';
import { fetchDaemon, jsonOf } from './daemonAnswer.js';

interface RestoreOptions {
  readonly url: string;
  readonly unit: string;
  readonly from: string;
  readonly who?: string;
  readonly json?: boolean;
}

interface Restored {
  readonly state_of: string;
  readonly scans: number;
  readonly revised: number;
  readonly same_shape: boolean;
  readonly reaches: boolean;
  readonly anew: readonly string[];
  readonly lost: readonly string[];
}

/** Two days of scans are made again in less. */
const PATIENCE_MS = 600_000;

function contentOf(file: string): Uint8Array<ArrayBuffer> {
  try {
    return new Uint8Array(readFileSync(file));
  } catch (thrown) {
    throw new RockhourError('USAGE', `cannot read --from ${file}: ${fileReasonOf(thrown)}`, {
      cause: thrown,
    });
  }
}

function wordsOf(unit: string, done: Restored): string {
  const { state_of, scans, revised, same_shape, reaches, anew, lost } = done;
  return [
    `unit ${unit} goes on from its state of ${state_of}; ${scans} scans made again, ${revised} revised`,
    ...(reaches
      ? []
      : ['the journal does not have all readings since: the state was aged instead']),
    ...(same_shape ? [] : ['the definition is another one than then: the state was carried over']),
    ...(anew.length > 0 ? [`begun anew: bed of ${anew.join(', ')}`] : []),
    ...(lost.length > 0 ? [`learned anew as healthy: ${lost.join(', ')}`] : []),
  ].join('\n');
}

async function restore({ url, unit, from, who, json }: RestoreOptions): Promise<string> {
  const query = who === undefined ? '' : `?${new URLSearchParams({ who })}`;
  const answer = await fetchDaemon(url, `/api/units/${encodeURIComponent(unit)}/backup${query}`, {
    method: 'PUT',
    body: contentOf(from),
    headers: { accept: 'application/json', 'content-type': 'application/gzip' },
    patience_ms: PATIENCE_MS,
  });
  const done = jsonOf(url, answer.toString('utf8')) as Restored;
  return json ? JSON.stringify(done) : wordsOf(unit, done);
}

export function register(program: Command): void {
  program
    .command('restore')
    .description('puts a unit of a running daemon back to a backup; the time since is made up for')
    .requiredOption('--url <address>', 'of the daemon, such as http://127.0.0.1:8080')
    .requiredOption('--unit <id>', 'whose state; other units go on')
    .requiredOption('--from <file>', 'as rockhour backup wrote it')
    .option('--who <name>', 'whose word it is: recorded')
    .option('--json', 'answer as one line of JSON')
    .action(async (options: RestoreOptions) => {
      process.stdout.write(`${await restore(options)}\n`);
    });
}
