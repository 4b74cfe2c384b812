import { Command, CommanderError } from 'commander';
import { closingHelp } from './commands/help.js';
import { packageVersion } from './commands/version.js';
import { EXIT_CODES, exitCodeOf, explain, RockhourError } from './errors.js';

/** In the order of the help; each is loaded only where it, or all, may be meant. */
const COMMANDS: Readonly<Record<string, () => Promise<{ register(program: Command): void }>>> = {
  run: () => import('./commands/run.js'),
  demo: () => import('./commands/demo.js'),
  replay: () => import('./commands/replay.js'),
  hours: () => import('./commands/hours.js'),
  headroom: () => import('./commands/headroom.js'),
  offers: () => import('./commands/offers.js'),
  schedule: () => import('./commands/schedule.js'),
  capability: () => import('./commands/capability.js'),
  balance: () => import('./commands/balance.js'),
  cycles: () => import('./commands/cycles.js'),
  report: () => import('./commands/report.js'),
  alarms: () => import('./commands/alarms.js'),
  tune: () => import('./commands/tune.js'),
  sensors: () => import('./commands/sensors.js'),
  check: () => import('./commands/check.js'),
  backup: () => import('./commands/backup.js'),
  restore: () => import('./commands/restore.js'),
  admit: () => import('./commands/admit.js'),
};

function fail(thrown: unknown): void {
  process.stderr.write(`${explain(thrown)}\n`);
  if (process.env.ROCKHOUR_DEBUG === '1') console.error(thrown);
  process.exitCode = exitCodeOf(thrown);
}

/** commander prints help and version itself, also where a command is missing. */
function commandLineFailed({ code, exitCode, message }: CommanderError): void {
  if (exitCode === 0) return;
  if (code === 'commander.help') process.exitCode = EXIT_CODES.usage.code;
  else fail(new RockhourError('USAGE', message.replace(/^error: /, '').replace('\n', ' ')));
}

async function createProgram(asked: string | undefined): Promise<Command> {
  const program = new Command('rockhour')
    .description('Front positions, stored energy and remaining hours of packed-bed thermal stores')
    .version(packageVersion())
    .addHelpText('after', closingHelp())
    .showSuggestionAfterError()
    // What is wrong with a command line is said by `fail`, as everything that is wrong.
    .configureOutput({ outputError: () => undefined })
    .exitOverride();
  const one = Object.entries(COMMANDS).filter(([name]) => name === asked);
  // Help, and what is advised instead of a command that there is not, need all of them.
  for (const [, load] of one.length > 0 ? one : Object.entries(COMMANDS)) {
    (await load()).register(program);
  }
  return program;
}

// A reader that has seen enough, as in `rockhour replay --out - | head`, is no fault.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(EXIT_CODES.ok.code);
  fail(error);
  process.exit();
});
// Whoever read the messages is gone; the work goes on.
process.stderr.on('error', () => undefined);
// After these nothing can be relied on: say it and end, so that a supervisor starts afresh.
for (const event of ['uncaughtException', 'unhandledRejection'] as const) {
  process.on(event, (thrown: unknown) => {
    fail(thrown);
    process.exit(EXIT_CODES.internal.code);
  });
}

try {
  await (await createProgram(process.argv[2])).parseAsync();
} catch (thrown) {
  if (thrown instanceof CommanderError) commandLineFailed(thrown);
  else fail(thrown);
  // What was interrupted may still be at work.
  if (thrown instanceof RockhourError && thrown.code === 'INTERRUPTED') process.exit();
}
