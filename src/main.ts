import { Command, CommanderError } from 'commander';
import { register as registerAlarms } from './commands/alarms.js';
import { register as registerBalance } from './commands/balance.js';
import { register as registerCapability } from './commands/capability.js';
import { register as registerCheck } from './commands/check.js';
import { register as registerCycles } from './commands/cycles.js';
import { register as registerDemo } from './commands/demo.js';
import { register as registerHeadroom } from './commands/headroom.js';
import { closingHelp } from './commands/help.js';
import { register as registerHours } from './commands/hours.js';
import { register as registerOffers } from './commands/offers.js';
import { register as registerReplay } from './commands/replay.js';
import { register as registerReport } from './commands/report.js';
import { packageVersion, register as registerRun } from './commands/run.js';
import { register as registerSchedule } from './commands/schedule.js';
import { register as registerSensors } from './commands/sensors.js';
import { register as registerTune } from './commands/tune.js';
import { EXIT_CODES, exitCodeOf, explain, RockhourError } from './errors.js';

/** In the order of the help. */
const COMMANDS = [
  registerRun,
  registerDemo,
  registerReplay,
  registerHours,
  registerHeadroom,
  registerOffers,
  registerSchedule,
  registerCapability,
  registerBalance,
  registerCycles,
  registerReport,
  registerAlarms,
  registerTune,
  registerSensors,
  registerCheck,
];

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

function createProgram(): Command {
  const program = new Command('rockhour')
    .description('Front positions, stored energy and remaining hours of packed-bed thermal stores')
    .version(packageVersion())
    .addHelpText('after', closingHelp())
    .showSuggestionAfterError()
    // What is wrong with a command line is said by `fail`, as everything that is wrong.
    .configureOutput({ outputError: () => undefined })
    .exitOverride();
  for (const register of COMMANDS) register(program);
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
  await createProgram().parseAsync();
} catch (thrown) {
  if (thrown instanceof CommanderError) commandLineFailed(thrown);
  else fail(thrown);
  // What was interrupted may still be at work.
  if (thrown instanceof RockhourError && thrown.code === 'INTERRUPTED') process.exit();
}
