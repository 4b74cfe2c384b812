/**
 * npm run bench: what a scan, answers, the page and a week cost on this machine. Ratios are taken
 * within one run; absolute times are of this machine at this moment. The week's recording is made
 * once and kept in .bench, so a run that was stopped goes on from there.
 */
import { execFileSync } from 'node:child_process';
import { existsSync, mkdirSync, renameSync, rmSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import cliProgress from 'cli-progress';
import { History } from '../src/adapters/history/history.js';
import { RecordingReader } from '../src/adapters/recording/reader.js';
import { RecordingWriter } from '../src/adapters/recording/writer.js';
import { loadSite } from '../src/config/load.js';
import { createBedWork, stepBed } from '../src/core/bed/kernel.js';
import { enthalpyAt } from '../src/core/bed/tables.js';
import type { UnitDefinition } from '../src/core/definitions.js';
import { advance, hoursAt, startUnit } from '../src/core/unit.js';
import { unitModel } from '../src/core/unitModel.js';
import { createDemoPlant } from '../src/plant/demoPlant.js';
import { benchAhead } from './bench/ahead.js';
import { benchAsking } from './bench/asking.js';
import { benchPage } from './bench/page.js';
import { helpIfAsked } from './help.js';

helpIfAsked(import.meta.url);

const root = fileURLToPath(new URL('..', import.meta.url));
const folder = `${root}.bench`;
const WEEK_SCANS = (7 * 86400) / 30;
const NOTHING = { hours_at_W: [], profile: false };

function bar(label: string, total: number): { step(done: number): void; stop(): void } {
  if (!process.stderr.isTTY) return { step: () => undefined, stop: () => undefined };
  const shown = new cliProgress.SingleBar({
    format: `${label} {bar} {percentage} %, {eta_formatted} to go`,
  });
  shown.start(total, 0);
  return { step: (done) => shown.update(done), stop: () => shown.stop() };
}

function line(what: string, value: string): void {
  console.log(`${what.padEnd(58)} ${value}`);
}

async function recordWeek(unit: UnitDefinition, file: string): Promise<void> {
  if (existsSync(file)) return;
  const progress = bar('recording of a week', WEEK_SCANS);
  const plant = createDemoPlant(unit, { seed: 1 });
  const columns = unit.channels.map((channel) => channel.id);
  const writer = await RecordingWriter.open(`${file}.part`, columns);
  for (let n = 0; n < WEEK_SCANS; n++) {
    const { time_ms, values } = plant.step();
    await writer.write(
      time_ms,
      columns.map((id) => values[id] ?? null),
    );
    progress.step(n + 1);
  }
  await writer.close();
  progress.stop();
  renameSync(`${file}.part`, file);
}

/** ns per cell and step of the kernel, and of the same loop in C where there is a compiler. */
function benchKernel(unit: UnitDefinition): void {
  const model = unitModel(unit).stores[0];
  if (model === undefined) return;
  const cells = 100;
  const bed = new Float64Array(cells).fill(enthalpyAt(model.tables, 320));
  const work = createBedWork(cells);
  const run = (steps: number): number => {
    const from = performance.now();
    for (let n = 0; n < steps; n++) {
      stepBed(
        model.tables,
        bed,
        {
          massFlux_kg_m2s: 0.65,
          inlet_K: n % 700 < 350 ? 733 : 300,
          ambient_K: 283,
          dt_s: 60,
          heatTransferFactor: 1,
          wallLoss_W_m3K: 1e-4,
        },
        work,
      );
    }
    return ((performance.now() - from) * 1e6) / (steps * cells);
  };
  run(5000);
  const own = run(40_000);
  line('bed kernel, per cell and step', `${own.toFixed(1)} ns`);
  try {
    const binary = `${folder}/kernel`;
    execFileSync('cc', [
      '-O3',
      '-march=native',
      '-o',
      binary,
      `${root}tools/bench/kernel.c`,
      '-lm',
    ]);
    const c = Number(execFileSync(binary, ['40000'], { encoding: 'utf8' }).split(' ')[0]);
    line('  the same loop in C (-O3)', `${c.toFixed(1)} ns: ${(own / c).toFixed(2)} times as long`);
  } catch {
    line('  the same loop in C', 'skipped: no C compiler');
  }
}

const median = (values: number[]): number =>
  values.sort((a, b) => a - b)[values.length >> 1] ?? Number.NaN;

async function benchScans(unit: UnitDefinition, file: string): Promise<void> {
  const state = startUnit(unit);
  const scans: number[] = [];
  const answers: number[] = [];
  const reader = new RecordingReader(file, unit, { otherChannels: new Set() });
  for await (const batch of reader.batches()) {
    for (const scan of batch) {
      const from = performance.now();
      advance(unit, state, scan, NOTHING);
      scans.push(performance.now() - from);
      if (scans.length % 150 === 0) {
        const asked = performance.now();
        hoursAt(unit, state, [unit.rated_power_W]);
        answers.push(performance.now() - asked);
      }
    }
    if (scans.length >= 3000) break;
  }
  const thermocouples = unitModel(unit).thermocouples.length;
  line(
    `one scan, ${thermocouples} thermocouples, median of ${scans.length}`,
    `${median(scans).toFixed(2)} ms`,
  );
  line(
    `hours at one power with quantiles, median of ${answers.length}`,
    `${median(answers).toFixed(0)} ms`,
  );
}

async function benchWeek(unit: UnitDefinition, file: string): Promise<void> {
  const database = `${folder}/week.sqlite`;
  for (const suffix of ['', '-wal', '-shm']) rmSync(`${database}${suffix}`, { force: true });
  const history = new History(database, {
    folder,
    keep_readings_days: 30,
    keep_estimates_days: 365,
    thin_after_days: 30,
    thin_to_s: 600,
    checkpoint_every_s: 600,
  });
  history.start();
  const state = startUnit(unit);
  const progress = bar('a week of scans', WEEK_SCANS);
  const reader = new RecordingReader(file, unit, { otherChannels: new Set() });
  const from = performance.now();
  let done = 0;
  let events = 0;
  const memory: number[] = [];
  for await (const batch of reader.batches()) {
    const steps = batch.map((scan) => {
      const hours_at_W = done % 60 === 0 ? [unit.rated_power_W] : [];
      if (++done % 2880 === 0) memory.push(process.memoryUsage().rss / 2 ** 20);
      return advance(unit, state, scan, { hours_at_W, profile: false });
    });
    history.write(() => {
      for (const step of steps) {
        history.estimates.add(unit, step.estimate, { flow_kg_s: null, power_MW_el: null });
        for (const event of step.events) history.events.add(event);
        events += step.events.length;
      }
    });
    progress.step(done);
  }
  progress.stop();
  history.stop();
  const seconds = (performance.now() - from) / 1000;
  line(
    `a week: ${done} scans of 30 s, hours every 30 min, ${events} events, SQLite`,
    `${seconds.toFixed(1)} s (to stay under 180 s)`,
  );
  line('  resident memory after each day', `${memory.map((m) => m.toFixed(0)).join(', ')} MB`);
}

mkdirSync(folder, { recursive: true });
const unit = loadSite(`${root}config/demo.yaml`).units[0];
if (unit === undefined) throw new Error('config/demo.yaml has no unit');
const week = `${folder}/week.csv`;
await recordWeek(unit, week);
benchKernel(unit);
await benchScans(unit, week);
await benchAhead(unit, week, line);
await benchAsking(`${root}config/demo.yaml`, line);
await benchPage(`${root}config/demo.yaml`, line);
await benchWeek(unit, week);
