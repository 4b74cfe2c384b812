/**
 * Writes a recording of the finer simulated plant and, beside it, the truth.
 *
 *   npx tsx tools/simulate.ts --seed 1 --hours 24 --out run.csv --truth run.truth.jsonl
 *
 * Options: --schedule day|partial|standing, --hours-at 1.6,1 (MW, true hours every --hours-every
 * minutes), --physics nominal|random, --machine known|random, --sensors exact|independent|class,
 * --config plant.yaml (another plant than that of config/demo.yaml; two stores with an argon
 * cycle, or one hot store with air), --meter exact|random, --faults FILE.json (list of faults of test/plant/faults.ts),
 * --changes FILE.json, --scan SECONDS.
 */
import { createWriteStream, readFileSync } from 'node:fs';
import { parseArgs } from 'node:util';
import { loadSite } from '../src/config/load.js';
import { DEMO_GEOMETRY } from '../test/plant/demoGeometry.js';
import type { PlantGeometry } from '../test/plant/geometry.js';
import { headerOf, rowOf, truthLineOf } from '../test/plant/recording.js';
import { scheduleFor } from '../test/plant/schedules.js';
import { createTruth } from '../test/plant/truth.js';
import { geometryOf } from '../test/plantGeometryOf.js';

const { values } = parseArgs({
  options: {
    seed: { type: 'string', default: '1' },
    config: { type: 'string' },
    hours: { type: 'string', default: '24' },
    out: { type: 'string' },
    truth: { type: 'string' },
    schedule: { type: 'string', default: 'day' },
    scan: { type: 'string' },
    'hours-at': { type: 'string', default: '' },
    'hours-every': { type: 'string', default: '30' },
    physics: { type: 'string', default: 'random' },
    machine: { type: 'string', default: 'random' },
    sensors: { type: 'string', default: 'class' },
    meter: { type: 'string', default: 'random' },
    faults: { type: 'string' },
    changes: { type: 'string' },
  },
});

function number(name: string, text: string): number {
  const value = Number(text);
  if (text.trim() === '' || !Number.isFinite(value)) {
    console.error(`--${name} must be a number, got "${text}"`);
    process.exit(2);
  }
  return value;
}

function oneOf<T extends string>(name: string, text: string, allowed: readonly T[]): T {
  const found = allowed.find((a) => a === text);
  if (found !== undefined) return found;
  console.error(`--${name} must be one of ${allowed.join(', ')}, got "${text}"`);
  process.exit(2);
}

if (!values.out) {
  console.error('--out FILE.csv is missing');
  process.exit(2);
}
const list = (file: string | undefined) => (file ? JSON.parse(readFileSync(file, 'utf8')) : []);
/** The first unit of a configuration; its rated flow is taken as two thirds of the greatest. */
function configured(file: string): PlantGeometry {
  const unit = loadSite(file).units[0];
  if (!unit) throw new RangeError(`${file} has no unit`);
  return geometryOf(unit, (2 / 3) * unit.limits.discharge.flow_max_kg_s);
}
const plain = values.config ? configured(values.config) : DEMO_GEOMETRY;
const geometry = values.scan ? { ...plain, scan_period_s: number('scan', values.scan) } : plain;
const plant = createTruth({
  seed: number('seed', values.seed),
  geometry,
  physics: oneOf('physics', values.physics, ['nominal', 'random']),
  machine: oneOf('machine', values.machine, ['known', 'random']),
  sensors: oneOf('sensors', values.sensors, ['exact', 'independent', 'class']),
  meter: oneOf('meter', values.meter, ['exact', 'random']),
  faults: list(values.faults),
  changes: list(values.changes),
});
const powers =
  values['hours-at'] === '' ? [] : values['hours-at'].split(',').map((p) => number('hours-at', p));
const every = Math.max(
  1,
  Math.round((number('hours-every', values['hours-every']) * 60) / geometry.scan_period_s),
);

const recording = createWriteStream(values.out);
const truthFile = values.truth ? createWriteStream(values.truth) : null;
recording.write(`${headerOf(geometry)}\n`);
const started = performance.now();
let scans = 0;
plant.run(
  scheduleFor(values.schedule, geometry, number('hours', values.hours) * 3600),
  (scan, truth, now) => {
    recording.write(`${rowOf(geometry, scan)}\n`);
    scans++;
    if (!truthFile) return;
    const asked = powers.length > 0 && scans % every === 0;
    const hours = asked
      ? Object.fromEntries(powers.map((p) => [String(p), now.hoursAt(p * 1e6)]))
      : undefined;
    truthFile.write(`${truthLineOf(truth, hours)}\n`);
  },
);
recording.end();
truthFile?.end();
console.error(
  `${scans} scans in ${((performance.now() - started) / 1000).toFixed(1)} s to ${values.out}`,
);
