import type { Command } from 'commander';
import { faultsAsText } from '../config/faults.js';
import { readSource, runnableSiteOf } from '../config/load.js';
import type { SiteConfig } from '../config/site.js';
import type { DaemonPlaces } from '../daemon.js';
import { RockhourError } from '../errors.js';
import { createLog, LOG_LEVELS, type LogLevel } from '../log.js';
import { siteNotes } from './check/siteNotes.js';
import { Reloading } from './reload.js';
import { askedToStop, stopInTime } from './stopping.js';
import { packageVersion } from './version.js';

interface RunOptions {
  readonly config: string;
  readonly logLevel: string;
}

export function logLevel(text: string): LogLevel {
  const level = LOG_LEVELS.find((one) => one === text);
  if (level) return level;
  throw new RockhourError(
    'USAGE',
    `--log-level is ${JSON.stringify(text)}; expected one of ${LOG_LEVELS.join(', ')}`,
  );
}

/**
 * The one line on standard output that says that all is up, for people and for scripts:
 *
 *     ready page=URL broker=URL database=FOLDER units=ID,ID
 *
 * Values have no spaces but for the folder, which is therefore written as a JSON string.
 */
export function readyLine(site: SiteConfig, places: DaemonPlaces): string {
  const units = site.units.map((unit) => unit.id).join(',');
  const { url, broker, folder } = places;
  return `ready page=${url ?? 'none'} broker=${broker} database=${JSON.stringify(folder)} units=${units}`;
}

async function run(options: RunOptions): Promise<void> {
  const source = readSource(options.config);
  const site = runnableSiteOf(source);
  const log = createLog({ level: logLevel(options.logLevel) });
  for (const { id, faults } of site.left_out ?? []) {
    log.error(
      { unit: id, faults },
      `unit ${id} is left out, its readings are not taken in: ${faultsAsText(source.path, faults)}`,
    );
  }
  for (const note of siteNotes(site)) log.warn(note);
  // What it writes is for its own user, and for its group where that is meant.
  process.umask(process.umask() | 0o007);
  // Servers and clients take half a second to load, which a refusal above need not wait for.
  const { createDaemon } = await import('../daemon.js');
  let lose: (thrown: unknown) => void = () => undefined;
  const lost = new Promise<never>((_, reject) => {
    lose = reject;
  });
  // While it starts nobody looks at it yet.
  lost.catch(() => undefined);
  const ids = site.units.map((unit) => unit.id).join(', ');
  log.info(
    `rockhour ${packageVersion()} starts: ${site.name}, ${ids}; store in ${site.store.folder}`,
  );
  const reloading = new Reloading({
    log,
    lost: (thrown) => lose(thrown),
    create: (next) =>
      createDaemon(next.site, { log, version: packageVersion(), configPath: next.source }),
    up: (next, places) => process.stdout.write(`${readyLine(next, places)}\n`),
  });
  const asked = askedToStop();
  // Before the start: a signal without a handler would end the process.
  process.on('SIGHUP', () => void reloading.reload(options.config));
  await Promise.race([reloading.start({ source, site }), asked]);
  log.info(`${await Promise.race([asked, lost])}: stops`);
  if (!(await stopInTime(reloading))) log.warn('what did not end within 4.5 s is left behind');
  log.info('stopped');
  // Sockets of a service that hangs would keep the process.
  process.exit();
}

export function register(program: Command): void {
  program
    .command('run')
    .description('run the daemon: readings in over MQTT; estimates, hours and alarms out')
    .requiredOption('--config <file>', 'configuration of the site (YAML)')
    .option('--log-level <level>', LOG_LEVELS.join(', '), 'info')
    .addHelpText(
      'after',
      [
        '',
        'When all is up, one line goes to standard output:',
        '  ready page=URL broker=URL database="FOLDER" units=ID,ID',
        'A unit whose part of the configuration has faults is left out, and told in the log and on the',
        'page; the others run. Faults elsewhere refuse the file, as check does with all of them.',
        'The log goes to standard error. SIGTERM or SIGINT stop it cleanly within 5 s. SIGHUP reads',
        'the configuration again and goes on by it with the state kept; one with faults changes nothing.',
      ].join('\n'),
    )
    .action(run);
}
