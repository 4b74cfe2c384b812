import { setImmediate } from 'node:timers/promises';
import type { Command } from 'commander';
import type { UnitDefinition } from '../core/definitions.js';
import { courseOf, LEAST_COURSE_S, recordCourse, takeScan } from '../core/worth/recordedCourse.js';
import { dayWeighing, type UnitWorth, type Weighing, weighUnit } from '../core/worth/unitWorth.js';
import { RockhourError } from '../errors.js';
import { onlyUnitOf } from './aheadState.js';
import { askDaemon } from './daemonAnswer.js';
import { Interrupt } from './interrupt.js';
import { startProgress } from './progress.js';
import { sensorsText } from './sensors/text.js';
import { loadUnit } from './site.js';
import { tellCounts, walkRecording } from './walk.js';

interface SensorsOptions {
  readonly config?: string;
  readonly recording?: string;
  readonly url?: string;
  readonly unit?: string;
  readonly store?: string;
  readonly places?: string;
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

function parsePlaces(text = '10'): number {
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
  throw noStore(
    unit.id,
    id,
    unit.stores.map((store) => store.id),
  );
}

function noStore(unit: string, id: string, known: readonly string[]): RockhourError {
  const text = `--store is ${JSON.stringify(id)}; unit ${unit} has ${known.join(', ')}`;
  return new RockhourError('USAGE', text);
}

async function fromConfig(options: SensorsOptions): Promise<UnitWorth> {
  const { config, recording } = options;
  if (config === undefined) {
    throw new RockhourError('USAGE', 'sensors needs --config, or --url of a daemon');
  }
  const places = parsePlaces(options.places);
  const { unit, otherChannels } = loadUnit(config, options.unit);
  const stores = chooseStores(unit, options.store);
  const weighing =
    recording === undefined
      ? dayWeighing(unit)
      : await recordingWeighing(unit, recording, otherChannels);
  return weigh(unit, weighing, stores, places);
}

/** Over the hours ahead of the state that a daemon holds now. */
async function fromDaemon(url: string, options: SensorsOptions): Promise<UnitWorth> {
  const { config, recording, places, store } = options;
  if ((config ?? recording ?? places) !== undefined) {
    throw new RockhourError(
      'USAGE',
      '--url asks a daemon; --config, --recording and --places do not go with it',
    );
  }
  const unit = options.unit ?? (await onlyUnitOf(url));
  const path = `/api/units/${encodeURIComponent(unit)}/sensors`;
  const worth = (await askDaemon(url, path)) as UnitWorth;
  if (store === undefined) return worth;
  const stores = worth.stores.filter((one) => one.store === store);
  if (stores.length > 0) return { ...worth, stores };
  throw noStore(
    unit,
    store,
    worth.stores.map((one) => one.store),
  );
}

async function sensors(options: SensorsOptions): Promise<void> {
  const worth =
    options.url === undefined ? await fromConfig(options) : await fromDaemon(options.url, options);
  const text = options.json ? JSON.stringify(worth) : sensorsText(worth, options.all ?? false);
  process.stdout.write(`${text}\n`);
}

export function register(program: Command): void {
  program
    .command('sensors')
    .description('what losing each thermocouple would do to sigma, and where one more would help')
    .option('--config <file>', 'configuration of the site (YAML)')
    .option('--recording <file>', 'weigh over this recording (default: a settled day of the model)')
    .option('--url <address>', 'ask a running daemon: over the hours ahead of the state it holds')
    .option('--unit <id>', 'unit to weigh; needed where the site has several')
    .option('--store <id>', 'only this store')
    .option('--places <number>', 'places along each string where one more is tried (default: 10)')
    .option('--all', 'list every thermocouple, also those that are hardly missed')
    .option('--json', 'answer as one line of JSON')
    .action(sensors);
}
