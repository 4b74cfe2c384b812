import { writeFileSync } from 'node:fs';
import { resolve } from 'node:path';
import type { Command } from 'commander';
import { fragmentFaults } from '../config/fragment.js';
import { finishThinning, startThinning, thin } from '../core/tune/record.js';
import { tuneUnit } from '../core/tune/tune.js';
import { unitModel } from '../core/unitModel.js';
import { fileReasonOf, RockhourError } from '../errors.js';
import { startProgress } from './progress.js';
import { loadUnit } from './site.js';
import { tuneText } from './tune/print.js';
import { fragmentText, REFUSALS } from './tune/words.js';
import { parsePoint_ms } from './values.js';
import { tellCounts, walkRecording } from './walk.js';

interface TuneOptions {
  readonly config: string;
  readonly recording: string;
  readonly out?: string;
  readonly unit?: string;
  readonly from?: string;
  readonly to?: string;
  readonly json?: boolean;
}

/** Rounds that a store's fit usually takes, for the progress bar. */
const ROUNDS = 12;

async function tune(options: TuneOptions): Promise<void> {
  const { config, recording, out } = options;
  const from_ms = options.from === undefined ? -Infinity : parsePoint_ms('--from', options.from);
  const to_ms = options.to === undefined ? Infinity : parsePoint_ms('--to', options.to);
  if (!(to_ms > from_ms)) {
    throw new RockhourError(
      'USAGE',
      `--to ${options.to} does not come after --from ${options.from}`,
    );
  }
  for (const file of [config, recording]) {
    if (out !== undefined && resolve(out) === resolve(file)) {
      throw new RockhourError('USAGE', `--out would overwrite ${file}`);
    }
  }
  const { unit, otherChannels } = loadUnit(config, options.unit);
  const model = unitModel(unit);
  const thinning = startThinning(model);
  const reader = await walkRecording(recording, unit, otherChannels, (scan) => {
    if (scan.time_ms > to_ms) return false;
    if (scan.time_ms >= from_ms) thin(thinning, scan);
    return true;
  });
  for (const line of tellCounts(reader)) process.stderr.write(`${line}\n`);
  const record = finishThinning(thinning);
  const progress = startProgress('fitting', ROUNDS * unit.stores.length);
  const place = new Map(unit.stores.map((store, s) => [store.id, s]));
  const answer = tuneUnit(model, record, (store, round) => {
    progress.update((place.get(store) ?? 0) * ROUNDS + Math.min(ROUNDS, round));
  });
  progress.stop();
  if ('refusal' in answer) {
    const [message, advice] = REFUSALS[answer.refusal];
    throw new RockhourError('RECORDING_TELLS_NOTHING', `${recording} ${message}`, { advice });
  }
  const { result } = answer;
  const fragment = fragmentText(result, recording);
  const faults = fragmentFaults(config, fragment);
  if (faults.length > 0) {
    const [first] = faults;
    throw new RockhourError(
      'RECORDING_TELLS_NOTHING',
      `${recording} gives ${first?.path} ${first?.found}, expected ${first?.expected}`,
      { advice: 'No plant is like that: check units, positions and the flow channel.' },
    );
  }
  if (out !== undefined) write(out, fragment);
  if (options.json) {
    process.stdout.write(`${JSON.stringify({ ...result, fragment })}\n`);
    return;
  }
  process.stdout.write(`${tuneText(result)}\n`);
  if (out === undefined) process.stdout.write(`\nFor the site file:\n\n${fragment}`);
  else process.stderr.write(`fragment of the site file written to ${out}\n`);
}

function write(path: string, text: string): void {
  try {
    writeFileSync(path, text);
  } catch (error) {
    throw new RockhourError('OUTPUT_UNWRITABLE', `cannot write ${path}: ${fileReasonOf(error)}`, {
      cause: error,
    });
  }
}

export function register(program: Command): void {
  program
    .command('tune')
    .description('fit the factors of a unit to a recording, with standard errors')
    .requiredOption('--config <file>', 'configuration of the site (YAML)')
    .requiredOption('--recording <file>', 'CSV, best two days with full and part load and a rest')
    .option('--unit <id>', 'unit to tune; needed where the site has several')
    .option('--from <time>', 'leave out rows before (ISO 8601 with offset, or seconds)')
    .option('--to <time>', 'leave out rows after')
    .option('--out <file>', 'write the fragment of the site file there')
    .option('--json', 'answer as one line of JSON, correlations and fragment included')
    .action(tune);
}
