import { renameSync, rmSync, writeFileSync } from 'node:fs';
import type { Command } from 'commander';
import { copyStore } from '../adapters/history/copyStore.js';
import { readSource, siteOf } from '../config/load.js';
import { fileReasonOf, RockhourError } from '../errors.js';
import { fetchDaemon } from './daemonAnswer.js';

interface BackupOptions {
  readonly url?: string;
  readonly unit?: string;
  readonly config?: string;
  readonly out: string;
}

/** Whole or not at all: a file of before stays until the new one is there. */
export function writeWhole(file: string, content: Uint8Array): void {
  const half = `${file}.part`;
  try {
    // Made anew: a link that somebody put there is not followed.
    rmSync(half, { force: true });
    writeFileSync(half, content, { mode: 0o600, flag: 'wx' });
    renameSync(half, file);
  } catch (thrown) {
    throw new RockhourError('OUTPUT_UNWRITABLE', `cannot write ${file}: ${fileReasonOf(thrown)}`, {
      cause: thrown,
    });
  }
}

async function backup({ url, unit, config, out }: BackupOptions): Promise<string> {
  if ((url === undefined) === (config === undefined)) {
    throw new RockhourError(
      'USAGE',
      'backup needs --url and --unit for the state of a unit, or --config for all of the store',
    );
  }
  if (url !== undefined) {
    if (unit === undefined) throw new RockhourError('USAGE', '--url needs --unit: whose state');
    const path = `/api/units/${encodeURIComponent(unit)}/backup`;
    const file = await fetchDaemon(url, path, { headers: { accept: 'application/gzip' } });
    writeWhole(out, file);
    return `state of unit ${unit} in ${out}, ${file.length} bytes`;
  }
  if (unit !== undefined) throw new RockhourError('USAGE', '--unit goes with --url');
  const { folder } = siteOf(readSource(config!)).store;
  const files = await copyStore(folder, out);
  return [
    ...files.map(({ file, bytes }) => `${file}, ${bytes} bytes`),
    `To put them back: stop the daemon, move all files of ${folder} away, copy these there, start it.`,
  ].join('\n');
}

export function register(program: Command): void {
  program
    .command('backup')
    .description("a unit's state out of a running daemon, or a copy of all of the local store")
    .option('--url <address>', 'of the daemon, such as http://127.0.0.1:8080')
    .option('--unit <id>', 'with --url: whose state')
    .option('--config <file>', 'configuration of the site: copies its store, the daemon may run')
    .requiredOption(
      '--out <path>',
      'file for the state; folder for the copies, none is overwritten',
    )
    .action(async (options: BackupOptions) => {
      process.stdout.write(`${await backup(options)}\n`);
    });
}
