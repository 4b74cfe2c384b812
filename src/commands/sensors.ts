import { setImmediate } from 'node:timers/promises';
import type { Command } from 'commander';
import type { UnitDefinition } from '../core/definitions.js';
import type { StoreModel } from '../core/track/storeTracker.js';
import { type UnitModel, unitModel } from '../core/unitModel.js';
import { type Course, cycleCourse } from '../core/worth/course.js';
import { courseOf, LEAST_COURSE_S, recordCourse, takeScan } from '../core/worth/recordedCourse.js';
import { type StoreWorth, weighSensors } from '../core/worth/sensorWorth.js';
import { RockhourError } from '../errors.js';
import { Interrupt } from './interrupt.js';
import { startProgress } from './progress.js';
import { type SensorsAnswer, sensorsText } from './sensors/text.js';
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

type Weighed = Pick<SensorsAnswer, 'over' | 'rejected'> & { readonly course: Course };

function overCycle(model: UnitModel): Weighed {
  const { course, cycle } = cycleCourse(model);
  let day_h = 0;
  for (const step of course.steps.slice(course.weigh_from)) {
    day_h += (step.drives[0]?.dt_s ?? 0) / 3600;
  }
  const charge_h = cycle.charge.hours;
  const discharge_h = cycle.discharge.hours;
  const stand_h = day_h - charge_h - discharge_h;
  return { course, over: { kind: 'cycle', charge_h, discharge_h, stand_h }, rejected: [] };
}

async function overRecording(
  unit: UnitDefinition,
  recording: string,
  otherChannels: ReadonlySet<string>,
): Promise<Weighed> {
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
      { advice: 'Give a longer recording, best of a whole cycle, or none for a settled cycle.' },
    );
  }
  const { course, rejected, covered_s } = found;
  return { course, over: { kind: 'recording', recording, covered_h: covered_s / 3600 }, rejected };
}

/** Drains a store's weighing with a progress bar; a signal stops it. */
async function weigh(
  model: UnitModel,
  s: number,
  { course, rejected }: Weighed,
  places: number,
): Promise<StoreWorth> {
  const out_of_use = new Set(rejected.map(({ id }) => id));
  const id = model.unit.stores[s]?.id ?? '';
  const steps = 1000;
  const progress = startProgress(id, steps);
  const interrupt = new Interrupt();
  interrupt.start();
  try {
    const run = weighSensors(model.stores[s] as StoreModel, s, course, { places, out_of_use });
    let turned_ms = performance.now();
    for (;;) {
      const next = run.next();
      if (next.done) return next.value;
      if (performance.now() - turned_ms < 100) continue;
      interrupt.check(() => `${Math.floor(next.value * 100)} % through store ${id}`);
      progress.update(Math.min(steps, Math.round(next.value * steps)));
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

async function sensors(options: SensorsOptions): Promise<void> {
  const places = parsePlaces(options.places);
  const { unit, otherChannels } = loadUnit(options.config, options.unit);
  const ids = unit.stores.map(({ id }) => id);
  const chosen = options.store === undefined ? ids : ids.filter((id) => id === options.store);
  if (chosen.length === 0) {
    throw new RockhourError(
      'USAGE',
      `--store is ${JSON.stringify(options.store)}; unit ${unit.id} has ${ids.join(', ')}`,
    );
  }
  const model = unitModel(unit);
  const weighed =
    options.recording === undefined
      ? overCycle(model)
      : await overRecording(unit, options.recording, otherChannels);
  const stores: StoreWorth[] = [];
  for (const id of chosen) stores.push(await weigh(model, ids.indexOf(id), weighed, places));
  const { over, rejected } = weighed;
  const answer: SensorsAnswer = {
    unit: unit.id,
    over,
    full_hours: model.fullHours,
    rejected,
    stores,
  };
  const text = options.json ? JSON.stringify(answer) : sensorsText(answer, options.all ?? false);
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
