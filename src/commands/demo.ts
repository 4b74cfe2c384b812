import { fileURLToPath } from 'node:url';
import type { Command } from 'commander';
import { loadSite } from '../config/load.js';
import type { SiteConfig } from '../config/site.js';
import type { DemoCheck, DemoOptions } from '../daemon.js';
import { RockhourError } from '../errors.js';
import { createLog } from '../log.js';
import { Interrupt, interrupted } from './interrupt.js';
import { startProgress } from './progress.js';
import { logLevel, readyLine } from './run.js';
import { askedToStop } from './stopping.js';
import { table } from './table.js';
import { packageVersion } from './version.js';

interface DemoCommandOptions {
  readonly config: string;
  readonly speed: string;
  readonly httpPort?: string;
  readonly mqttPort?: string;
  readonly keep?: boolean;
  readonly incidents: boolean;
  readonly seed: string;
  readonly checkHours?: string;
  readonly json?: boolean;
  readonly logLevel: string;
}

/** A day in under five minutes. */
const SPEED = 300;

function numberIn(name: string, text: string, least: number, most: number): number {
  const value = Number(text);
  if (text.trim() !== '' && value >= least && value <= most) return value;
  throw new RockhourError(
    'USAGE',
    `${name} is ${JSON.stringify(text)}; expected a number from ${least} to ${most}`,
  );
}

function port(name: string, text: string | undefined): number | null {
  if (text === undefined) return null;
  const value = numberIn(name, text, 0, 65535);
  if (Number.isInteger(value)) return value;
  throw new RockhourError('USAGE', `${name} is ${JSON.stringify(text)}; expected a whole number`);
}

async function demo(options: DemoCommandOptions): Promise<void> {
  if (options.json && options.checkHours === undefined) {
    throw new RockhourError('USAGE', '--json goes with --check-hours only');
  }
  const speed = numberIn('--speed', options.speed, 1, 2000);
  const configured = loadSite(options.config);
  const places = {
    http_port: port('--http-port', options.httpPort),
    mqtt_port: port('--mqtt-port', options.mqttPort),
    keep: options.keep === true,
  };
  const common: DemoOptions = {
    log: createLog({ level: logLevel(options.logLevel) }),
    version: packageVersion(),
    configPath: options.config,
    speed,
    seed: numberIn('--seed', options.seed, 0, 2 ** 31),
    incidents: options.incidents,
  };
  // Servers and clients take half a second to load, which a refusal above need not wait for.
  const { demoSite } = await import('../daemon.js');
  const { site, remove } = await demoSite(configured, places);
  try {
    if (options.checkHours === undefined) await live(site, common, options);
    else await check(site, common, options);
  } finally {
    remove();
  }
  process.exit();
}

async function live(
  site: SiteConfig,
  common: DemoOptions,
  options: DemoCommandOptions,
): Promise<void> {
  const asked = askedToStop();
  const { runDemo } = await import('../daemon.js');
  const running = await runDemo(site, common);
  process.stdout.write(
    [
      readyLine(site, running.places),
      `Simulated plant at ${common.speed} times its real speed: a day passes in ${(1440 / common.speed).toFixed(1)} min.`,
      `Page: ${running.places.url}`,
      ...(options.keep ? [`Database files: ${site.store.folder}`] : []),
      'Ctrl-C ends it.',
      '',
    ].join('\n'),
  );
  await asked;
  await running.stop();
}

async function check(
  site: SiteConfig,
  common: DemoOptions,
  options: DemoCommandOptions,
): Promise<void> {
  const hours = numberIn('--check-hours', options.checkHours!, 0.1, 10_000);
  const progress = startProgress('simulated hours', hours);
  const quiet = { ...site, mqtt: { ...site.mqtt, embedded_port: 0 } };
  let checks: DemoCheck[];
  let reached = 0;
  const { runDemoCheck } = await import('../daemon.js');
  const interrupt = new Interrupt();
  interrupt.start();
  try {
    const run = runDemoCheck(quiet, common, hours, (done) => {
      reached = done;
      progress.update(done);
    });
    const ended = await Promise.race([run, interrupt.asked]);
    if (typeof ended === 'string') {
      throw interrupted(ended, `after ${reached.toFixed(1)} of ${hours} simulated hours`);
    }
    checks = ended;
  } finally {
    interrupt.stop();
    progress.stop();
  }
  for (const one of checks) {
    process.stdout.write(options.json ? `${JSON.stringify(one)}\n` : `${checkText(one)}\n`);
  }
}

function checkText(one: DemoCheck): string {
  const rows = one.scores.map((score) => {
    const digits = 3;
    const worst_h = (Date.parse(score.worst_time) - Date.UTC(2026, 0, 1)) / 3_600_000;
    return [
      score.what,
      score.unit,
      score.count,
      score.rms.toFixed(digits),
      score.worst.toFixed(digits),
      worst_h.toFixed(1),
    ];
  });
  const firm =
    one.firmShare === null
      ? []
      : [
          `The firm figure (p90) was kept in ${(100 * one.firmShare).toFixed(0)} % of the answers; 90 % is right.`,
        ];
  return [
    `${one.unit}: estimates against the simulated truth, ${one.hours} h in ${one.scans} scans, ${one.seconds.toFixed(1)} s`,
    table(['figure', 'in', 'count', 'rms', 'worst', 'at hour'], rows),
    ...firm,
    `Gone wrong in the plant: ${one.incidents.join('; ') || 'nothing'}`,
    `Raised: ${[...new Set(one.raised)].join('; ') || 'nothing'}`,
  ].join('\n');
}

export function register(program: Command): void {
  program
    .command('demo')
    .description('the daemon with its own broker and a simulated plant: live, or scored')
    .option(
      '--config <file>',
      'configuration of the site (YAML)',
      fileURLToPath(new URL('../../config/demo.yaml', import.meta.url)),
    )
    .option('--speed <times>', 'how much faster than real the plant runs', String(SPEED))
    .option('--http-port <port>', 'port of page and API (default: as configured, else a free one)')
    .option('--mqtt-port <port>', 'port of the broker (default: as configured, else a free one)')
    .option('--keep', 'keep the folder with the database files')
    .option('--no-incidents', 'nothing goes wrong in the plant')
    .option('--seed <number>', 'seed of the plant: same seed, same readings', '1')
    .option(
      '--check-hours <hours>',
      'no page: run so many simulated hours as fast as possible and print the deviation from the truth',
    )
    .option('--json', 'with --check-hours: one line of JSON per unit')
    .option('--log-level <level>', 'silent, error, warn, info, debug or trace', 'warn')
    .action(demo);
}
