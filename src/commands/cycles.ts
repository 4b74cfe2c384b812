import type { Command } from 'commander';
import type { Mode } from '../core/definitions.js';
import { advance, startUnit } from '../core/unit.js';
import type { CycleRecord } from '../core/watch/cycleRecord.js';
import { type CycleView, cycleView } from '../core/watch/cycleView.js';
import { RockhourError } from '../errors.js';
import { askAhead } from './aheadState.js';
import { cyclesText } from './cycles/text.js';
import { loadUnit } from './site.js';
import { parsePoint_ms } from './values.js';
import { tellCounts, walkRecording } from './walk.js';

export interface CyclesOptions {
  readonly config?: string;
  readonly recording?: string;
  readonly url?: string;
  readonly unit?: string;
  readonly from?: string;
  readonly to?: string;
  readonly kind?: string;
  readonly json?: boolean;
}

/** The runs of a unit, oldest first. */
interface Cycles {
  readonly unit: string;
  readonly cycles: readonly CycleView[];
  /** There are more in the span: only the newest are here. */
  readonly older_left_out?: boolean;
}

const KINDS: readonly Mode[] = ['charge', 'stand', 'discharge'];

/** @throws RockhourError USAGE where options do not go together */
export function checkCyclesOptions({ url, config, recording, kind }: CyclesOptions): void {
  if (url !== undefined && (recording ?? config) !== undefined) {
    throw new RockhourError(
      'USAGE',
      '--url asks a daemon; --config and --recording do not go with it',
    );
  }
  if (url === undefined && (config === undefined || recording === undefined)) {
    throw new RockhourError('USAGE', 'cycles needs --config and --recording, or --url of a daemon');
  }
  if (kind !== undefined && !KINDS.includes(kind as Mode)) {
    throw new RockhourError(
      'USAGE',
      `--kind is ${JSON.stringify(kind)}; expected ${KINDS.join(', ')}`,
    );
  }
}

async function fromRecording(options: CyclesOptions): Promise<Cycles> {
  const { unit, otherChannels } = loadUnit(options.config as string, options.unit);
  const point = (option: string, text: string | undefined, none: number) =>
    text === undefined ? none : parsePoint_ms(option, text);
  const from_ms = point('--from', options.from, Number.NEGATIVE_INFINITY);
  const to_ms = point('--to', options.to, Number.POSITIVE_INFINITY);
  const state = startUnit(unit);
  const found: CycleRecord[] = [];
  const ask = { hours_at_W: [], profile: false };
  const recording = options.recording as string;
  const reader = await walkRecording(recording, unit, otherChannels, (scan) => {
    const { cycle } = advance(unit, state, scan, ask);
    if (cycle) found.push(cycle);
  });
  for (const line of tellCounts(reader)) process.stderr.write(`${line}\n`);
  const { open, mode } = state.cycle ?? { open: null, mode: 'stand' };
  if (open) {
    const since = new Date(open.start.time_ms).toISOString();
    process.stderr.write(`${mode} since ${since} is not over at the end of the recording\n`);
  }
  const cycles = found.filter(
    ({ kind, from, to }) =>
      (options.kind ?? kind) === kind && Date.parse(to) >= from_ms && Date.parse(from) <= to_ms,
  );
  return { unit: unit.id, cycles: cycles.map(cycleView) };
}

async function cycles(options: CyclesOptions): Promise<void> {
  checkCyclesOptions(options);
  const { from, to, kind } = options;
  const answer =
    options.url === undefined
      ? await fromRecording(options)
      : ((await askAhead(options, 'cycles', { from, to, kind })) as unknown as Cycles);
  const text = options.json ? JSON.stringify(answer) : cyclesText(answer.unit, answer.cycles);
  process.stdout.write(`${text}\n`);
  if (answer.older_left_out && !options.json) {
    process.stderr.write('There are older ones in this span: ask for less time to see them.\n');
  }
}

export function register(program: Command): void {
  program
    .command('cycles')
    .description('every charge, stand and discharge: energies, round trip, losses, widths')
    .option('--config <file>', 'configuration of the site (YAML); with --recording')
    .option('--recording <file>', 'recording whose runs are told')
    .option('--url <address>', 'ask a running daemon instead, such as http://127.0.0.1:8080')
    .option('--unit <id>', 'unit asked for; needed where there are several')
    .option('--from <time>', 'runs that end after it (a daemon: 30 days back unless told)')
    .option('--to <time>', 'runs that begin before it')
    .option('--kind <kind>', 'charge, stand or discharge alone')
    .option('--json', 'answer as one line of JSON')
    .action(cycles);
}
