/**
 * Lets the estimator watch the finer plant for a while and keeps all in a local store, as the daemon
 * would, so that a report can be made from it:
 *
 *   npx tsx tools/month.ts --out FOLDER --days 30 --seed 1
 *   npx tsx src/main.ts report --config FOLDER/plant.yaml --from 2025-01-01T00:00:00Z --out month.html
 *
 * Options: --scan SECONDS (60), --schedule day|partial (partial), --sound (nothing goes wrong). Unless
 * told, dust settles in the cold store from two fifths of the time on, over a fifth of it, and one
 * thermocouple of the hot store drifts from half of it on.
 */
import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { History } from '../src/adapters/history/history.js';
import { loadSite } from '../src/config/load.js';
import { advance, startUnit } from '../src/core/unit.js';
import { measuredIn } from '../src/daemon/measured.js';
import { DEMO_GEOMETRY } from '../test/plant/demoGeometry.js';
import type { PlantChange, SensorFault } from '../test/plant/faults.js';
import { scheduleFor } from '../test/plant/schedules.js';
import { createTruth } from '../test/plant/truth.js';

const DAY_S = 86_400;

const { values } = parseArgs({
  options: {
    out: { type: 'string' },
    days: { type: 'string', default: '30' },
    seed: { type: 'string', default: '1' },
    scan: { type: 'string', default: '60' },
    schedule: { type: 'string', default: 'partial' },
    sound: { type: 'boolean', default: false },
    help: { type: 'boolean', default: false },
  },
});
if (values.help || values.out === undefined) {
  const text = readFileSync(new URL(import.meta.url), 'utf8');
  process.stdout.write(
    `${text
      .slice(0, text.indexOf('*/'))
      .replace(/^\/?\s?\*+ ?/gm, '')
      .trim()}\n`,
  );
  process.exit(values.help ? 0 : 2);
}

function positive(name: 'days' | 'seed' | 'scan'): number {
  const value = Number(values[name]);
  if (value > 0 && Number.isFinite(value)) return value;
  process.stderr.write(`--${name} must be a number above 0, got "${values[name]}"\n`);
  process.exit(2);
}

const [days, seed, scan_s] = [positive('days'), positive('seed'), positive('scan')];
const folder = values.out;
mkdirSync(folder, { recursive: true });
const demo = readFileSync(new URL('../config/demo.yaml', import.meta.url), 'utf8');
const file = join(folder, 'plant.yaml');
writeFileSync(
  file,
  demo
    .replace(/^( *)scan_period_s:.*$/m, `$1scan_period_s: ${scan_s}`)
    .replace(/^( *)folder: .*$/m, '$1folder: ./store'),
);
const site = loadSite(file);
const unit = site.units[0]!;
const geometry = { ...DEMO_GEOMETRY, scan_period_s: scan_s };
const length_s = days * DAY_S;
const changes: PlantChange[] = values.sound
  ? []
  : [
      {
        kind: 'heat_transfer',
        at_s: 0.4 * length_s,
        store: 'cold',
        factor: 0.3,
        ramp_s: 0.2 * length_s,
      },
    ];
const faults: SensorFault[] = values.sound
  ? []
  : [{ kind: 'drift', at_s: 0.5 * length_s, channel: 'hot_middle_05', rate_K_h: 0.5 }];
const plant = createTruth({
  ...{ seed, geometry, physics: 'random', machine: 'random', sensors: 'class', meter: 'random' },
  ...{ changes, faults },
});
const history = new History(join(site.store.folder, 'history.sqlite'), site.store);
history.start();
const state = startUnit(unit);
const started = performance.now();
let scans = 0;
plant.run(scheduleFor(values.schedule, geometry, length_s), ({ time_s, readings }) => {
  const scan = {
    time_ms: Math.round(1000 * time_s),
    values: Float64Array.from(unit.channels, ({ id }) => readings[id] ?? Number.NaN),
    held: new Uint8Array(unit.channels.length),
  };
  const ask = { hours_at_W: scans % 30 === 0 ? unit.hours_at_W : [], profile: true };
  const step = advance(unit, state, scan, ask);
  history.write(() => {
    history.estimates.add(unit, step.estimate, measuredIn(unit, scan, step.estimate));
    if (step.profile) history.profiles.add(step.profile);
    for (const event of step.events) history.events.add(event);
    if (step.cycle) history.cycles.add(step.cycle);
    if (step.watch) history.watch.add(step.watch);
  });
  scans++;
  if (scans % 1440 === 0) {
    const spent_s = (performance.now() - started) / 1000;
    const share = (scans * scan_s) / length_s;
    process.stderr.write(
      `${((scans * scan_s) / DAY_S).toFixed(1)} of ${days} days, ${spent_s.toFixed(0)} s, ${(spent_s / share - spent_s).toFixed(0)} s to go\n`,
    );
  }
});
history.stop();
process.stdout.write(`${scans} scans in ${join(folder, 'store')}; configuration ${file}\n`);
