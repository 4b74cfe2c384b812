import { setImmediate } from 'node:timers/promises';
import type { Command } from 'commander';
import type { UnitDefinition } from '../core/definitions.js';
import { courseOf, LEAST_COURSE_S, recordCourse, takeScan } from '../core/worth/recordedCourse.js';
import { dayWeighing, type UnitWorth, type Weighing, weighUnit } from '../core/worth/unitWorth.js';
import { RockhourError } from '../errors.js';
import { Interrupt } from './interrupt.js';
import { startProgress } from './progress.js';
import { sensorsText } from './sensors/text.js';
import { loadUnit } from './site.js';
import { tellCounts, walkRecording } from './walk.js';

interface SensorsOptions {
  readonly config: string;
  readonly recording?: string;
  readonly unit?: string;
  readonly store?: string;
  readonly places: string;
  readonly all?: boolean;
  readonly json?: boolean;
}

/** Parts of the progress bar. */
const PARTS = 1000;
/** Longest time without a turn of the event loop [ms]. */
const TURN_MS = 100;

async function recordingWeighing(
  unit: UnitDefinition,
  recording: string,
  otherChannels: ReadonlySet<string>,
): Promise<Weighing> {
  const recorder = recordCourse(unit);
  const reader = await walkRecording(recording, unit, otherChannels, (scan) => {
    takeScan(recorder, scan);
  });
  for (const line of tellCounts(reader)) process.stderr.write(`${line}\n`);
  const found = courseOf(recorder);
  if (found === null) {
    throw new RockhourError(
      'RECORDING_MALFORMED',
      `${recording} covers less than ${LEAST_COURSE_S / 3600} h since every store had readings`,
      { advice: 'Give a longer recording, best of a whole cycle, or none for a settled day.' },
    );
  }
  const { course, rejected, covered_s } = found;
  return { course, rejected, over: { kind: 'recording', recording, covered_h: covered_s / 3600 } };
}

/** Drains the weighing with a progress bar; a signal stops it. */
async function weigh(
  unit: UnitDefinition,
  weighing: Weighing,
  stores: readonly number[],
  places: number,
): Promise<UnitWorth> {
  const progress = startProgress(unit.id, PARTS);
  const interrupt = new Interrupt();
  interrupt.start();
  try {
    const run = weighUnit(unit, weighing, stores, places);
    let turned_ms = performance.now();
    for (;;) {
      const next = run.next();
      if (next.done) return next.value;
      if (performance.now() - turned_ms < TURN_MS) continue;
      interrupt.check(() => `after ${Math.floor(next.value * 100)} % of the weighing`);
      progress.update(Math.min(PARTS, Math.round(next.value * PARTS)));
      // A turn of the event loop, or an interrupt at the terminal would wait for the end.
      await setImmediate();
      turned_ms = performance.now();
    }
  } finally {
    interrupt.stop();
    progress.stop();
  }
}

function parsePlaces(text: string): number {
  if (/^\d{1,3}$/.test(text) && Number(text) <= 100) return Number(text);
  throw new RockhourError(
    'USAGE',
    `--places is ${JSON.stringify(text)}; expected a whole number from 0 to 100`,
  );
}

/** Indices of the stores that are to be weighed. */
function chooseStores(unit: UnitDefinition, id: string | undefined): number[] {
  const all = unit.stores.map((_, s) => s);
  if (id === undefined) return all;
  const chosen = all.filter((s) => unit.stores[s]?.id === id);
  if (chosen.length > 0) return chosen;
  const ids = unit.stores.map((store) => store.id).join(', ');
  throw new RockhourError('USAGE', `--store is ${JSON.stringify(id)}; unit ${unit.id} has ${ids}`);
}

async function sensors(options: SensorsOptions): Promise<void> {
  const places = parsePlaces(options.places);
  const { unit, otherChannels } = loadUnit(options.config, options.unit);
  const stores = chooseStores(unit, options.store);
  const weighing =
    options.recording === undefined
      ? dayWeighing(unit)
      : await recordingWeighing(unit, options.recording, otherChannels);
  const worth = await weigh(unit, weighing, stores, places);
  const text = options.json ? JSON.stringify(worth) : sensorsText(worth, options.all ?? false);
  process.stdout.write(`${text}\n`);
}

export function register(program: Command): void {
  program
    .command('sensors')
    .description('what losing each thermocouple would do to sigma, and where one more would help')
    .requiredOption('--config <file>', 'configuration of the site (YAML)')
    .option('--recording <file>', 'weigh over this recording (default: a settled day of the model)')
    .option('--unit <id>', 'unit to weigh; needed where the site has several')
    .option('--store <id>', 'only this store')
    .option('--places <number>', 'places along each string at which one more is tried', '10')
    .option('--all', 'list every thermocouple, also those that are hardly missed')
    .option('--json', 'answer as one line of JSON')
    .action(sensors);
}
