import type { Command } from 'commander';
import { loadSite } from '../config/load.js';
import type { SiteConfig } from '../config/site.js';
import type { Daemon, DaemonPlaces } from '../daemon.js';
import { RockhourError } from '../errors.js';
import { createLog, LOG_LEVELS, type LogLevel } from '../log.js';
import { packageVersion } from './version.js';

interface RunOptions {
  readonly config: string;
  readonly logLevel: string;
}

/** A stop takes no longer than this [ms]; what hangs is left behind. */
const STOP_MS = 5000;

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

/** Resolves at the first SIGTERM or SIGINT; a second one ends the process at once. */
export function askedToStop(): Promise<NodeJS.Signals> {
  return new Promise((resolve) => {
    let isAsked = false;
    for (const signal of ['SIGTERM', 'SIGINT'] as const) {
      process.on(signal, () => {
        if (isAsked) process.exit(130);
        isAsked = true;
        resolve(signal);
      });
    }
  });
}

/** Stops within five seconds, whatever hangs. */
export async function stopInTime(daemon: Daemon): Promise<void> {
  let timer: NodeJS.Timeout | undefined;
  const limit = new Promise<void>((resolve) => {
    timer = setTimeout(resolve, STOP_MS - 500);
  });
  await Promise.race([daemon.stop(), limit]);
  clearTimeout(timer);
}

async function run(options: RunOptions): Promise<void> {
  const site = loadSite(options.config);
  const log = createLog({ level: logLevel(options.logLevel) });
  // Servers and clients take half a second to load, which a refusal above need not wait for.
  const { createDaemon } = await import('../daemon.js');
  const daemon = createDaemon(site, {
    log,
    version: packageVersion(),
    configPath: options.config,
  });
  const asked = askedToStop();
  const places = await Promise.race([daemon.start(), asked]);
  if (typeof places !== 'string') {
    process.stdout.write(`${readyLine(site, places)}\n`);
    log.info(`${await asked}: stops`);
  }
  await stopInTime(daemon);
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
        'The log goes to standard error. SIGTERM or SIGINT stop it cleanly within 5 s.',
      ].join('\n'),
    )
    .action(run);
}
