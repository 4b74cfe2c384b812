/**
 * A year of 30 s scans of the unit of `config/demo.yaml` in a local store, and how soon it opens:
 *
 *   npx tsx tools/year.ts --out FOLDER
 *
 * Rows are written straight into the store, unthinned, with states of charge and outlet temperatures
 * drawn anew; they are rolled up as the daemon does with an older store, and HTTP is asked for the
 * year before and after. Then what a commit costs with roll-ups and without, and what a profile
 * takes. Options: --days N (365), --whole (rows carry the whole estimate, some 5 kB each, instead of
 * none of it), --keep (the store is left there).
 */
import { mkdirSync, rmSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import SQLite from 'better-sqlite3';
import { pino } from 'pino';
import { Estimates } from '../src/adapters/history/estimates.js';
import { History } from '../src/adapters/history/history.js';
import { Layouts } from '../src/adapters/history/layouts.js';
import { Rollups } from '../src/adapters/history/rollups.js';
import { Sequence } from '../src/adapters/history/sequence.js';
import { seriesNames, seriesValues } from '../src/adapters/history/series.js';
import { createHttpServer } from '../src/adapters/http/server.js';
import { loadSite } from '../src/config/load.js';
import type { UnitDefinition } from '../src/core/definitions.js';
import type { Estimate } from '../src/core/estimate.js';
import { advance, startUnit, type UnitStep } from '../src/core/unit.js';
import { DaemonService, type PlantServiceParts } from '../src/daemon/plantService.js';
import type { UnitRunner } from '../src/daemon/unitRunner.js';
import { DEMO_GEOMETRY } from '../test/plant/demoGeometry.js';
import { scheduleFor } from '../test/plant/schedules.js';
import { createTruth } from '../test/plant/truth.js';
import { mulberry } from '../test/support/random.js';
import { helpIfAsked } from './help.js';

helpIfAsked(import.meta.url);

const { values: asked } = parseArgs({
  options: {
    out: { type: 'string' },
    days: { type: 'string', default: '365' },
    whole: { type: 'boolean', default: false },
    keep: { type: 'boolean', default: false },
  },
});
const days = Number(asked.days);
if (asked.out === undefined || !Number.isInteger(days) || days < 1) {
  process.stderr.write('--out FOLDER, and --days a whole number from 1 on; --help tells more\n');
  process.exit(2);
}

const SCAN_MS = 30_000;
const DAY_MS = 86_400_000;
const START_MS = Date.UTC(2025, 0, 1);
const MEASURED = { flow_kg_s: -12.5, power_MW_el: -1.8 };

const folder = asked.out;
mkdirSync(folder, { recursive: true });
const file = join(folder, 'history.sqlite');
for (const suffix of ['', '-wal', '-shm']) rmSync(`${file}${suffix}`, { force: true });

const site = loadSite(new URL('../config/demo.yaml', import.meta.url).pathname);
const unit = site.units[0]!;
const scans = days * (DAY_MS / SCAN_MS);

function line(what: string, value: string): void {
  process.stdout.write(`${what.padEnd(66)} ${value}\n`);
}

const ms = (value: number) => `${value.toFixed(value < 10 ? 2 : 0)} ms`;
const megabytes = (bytes: number) => `${(bytes / 1e6).toFixed(0)} MB`;

/** What an hour of a charge shows at last: rows and profiles are made from it. */
function lastStep(of: UnitDefinition): UnitStep {
  const plant = createTruth({
    ...{ seed: 1, geometry: DEMO_GEOMETRY, physics: 'random', machine: 'random' },
    ...{ sensors: 'class', meter: 'random', changes: [], faults: [] },
  });
  const state = startUnit(of);
  let last: UnitStep | null = null;
  let left = 120;
  plant.run(scheduleFor('day', DEMO_GEOMETRY, 3600), ({ time_s, readings }) => {
    const scan = {
      time_ms: Math.round(1000 * time_s),
      values: Float64Array.from(of.channels, ({ id }) => readings[id] ?? Number.NaN),
      held: new Uint8Array(of.channels.length),
    };
    const hours_at_W = --left === 0 ? of.hours_at_W : [];
    last = advance(of, state, scan, { hours_at_W, profile: true });
  });
  if (last === null) throw new RangeError('the plant must give scans, gave none');
  return last;
}

const step = lastStep(unit);
const names = seriesNames(unit);
const template = seriesValues(unit, step.estimate, MEASURED);
const moving = names.flatMap((name, i) =>
  /(\.soc|_degC|state_of_charge|width_m)$/.test(name) ? [i] : [],
);
const random = mulberry(1);
const at = (time_ms: number): Estimate => ({
  ...step.estimate,
  time: new Date(time_ms).toISOString(),
});

function writeYear(): void {
  const database = new SQLite(file);
  database.pragma('synchronous = OFF');
  const layout = new Layouts(database).numberFor(unit);
  const insert = database.prepare('INSERT INTO estimates VALUES (?, ?, ?, ?, ?, ?)');
  const json = asked.whole ? JSON.stringify(step.estimate) : JSON.stringify({ stores: {} });
  const day = database.transaction((no: number) => {
    const values = Float64Array.from(template);
    const bytes = Buffer.from(values.buffer);
    for (let n = (no * DAY_MS) / SCAN_MS; n < ((no + 1) * DAY_MS) / SCAN_MS; n++) {
      for (const i of moving) values[i] = template[i]! * (1 + 0.1 * random());
      insert.run(n + 1, unit.id, START_MS + n * SCAN_MS, json, layout, bytes);
    }
  });
  for (let no = 0; no < days; no++) day(no);
  database.pragma('wal_checkpoint(TRUNCATE)');
  database.close();
}

interface Asked {
  readonly took_ms: number;
  /** Of this process, client and server together: what another load on the machine does not add to. */
  readonly cpu_ms: number;
  readonly body: string;
}

async function ask(base: string, path: string): Promise<Asked> {
  const from = performance.now();
  const cpu = process.cpuUsage();
  // A connection that is kept alive is ended by the server while this process writes for seconds.
  const answer = await fetch(`${base}api/units/${unit.id}/${path}`, {
    headers: { connection: 'close' },
  });
  const body = await answer.text();
  if (!answer.ok) throw new Error(`${path}: ${answer.status} ${body}`);
  const { user, system } = process.cpuUsage(cpu);
  return { took_ms: performance.now() - from, cpu_ms: (user + system) / 1000, body };
}

async function askAll(base: string, what: string, times: number): Promise<void> {
  const to = new Date(START_MS + scans * SCAN_MS).toISOString();
  const span = `from=${new Date(START_MS).toISOString()}&to=${to}`;
  const five = `series=state_of_charge,hot.soc,hot.width_m,hot.outlet_degC,mode`;
  for (const [label, query] of [
    ['500 points of 5 series', `points=500&${five}`],
    ['1000 points of 5 series', `points=1000&${five}`],
    ['5000 points of 5 series', `points=5000&${five}`],
    [`500 points of all ${names.length} series`, 'points=500'],
  ]) {
    const found: Asked[] = [];
    for (let n = 0; n < times; n++) found.push(await ask(base, `history?${span}&${query}`));
    const first = found[0]!;
    const took = found.map(({ took_ms }) => took_ms).sort((x, y) => x - y);
    const cpu = found.map(({ cpu_ms }) => cpu_ms).sort((x, y) => x - y);
    const middle = times >> 1;
    const told = `first ${ms(first.took_ms)}, then ${ms(took[middle]!)}, CPU ${ms(cpu[middle]!)}`;
    line(`${what}: ${label}`, `${told}; ${(first.body.length / 1e3).toFixed(0)} kB`);
    if (times === 1) return;
  }
}

/** CPU time of a commit of one scan [us], with roll-ups and without. */
function commitCost(isRolled: boolean): number {
  const path = join(folder, 'commit.sqlite');
  for (const suffix of ['', '-wal', '-shm']) rmSync(`${path}${suffix}`, { force: true });
  const made = new History(path, site.store);
  made.start();
  made.stop();
  const database = new SQLite(path);
  database.pragma('synchronous = NORMAL');
  const layouts = new Layouts(database);
  const rollups = new Rollups(database, layouts);
  if (!isRolled) rollups.added = () => undefined;
  const estimates = new Estimates(database, new Sequence(database), layouts, rollups);
  const commit = database.transaction((time_ms: number) => {
    estimates.add(unit, at(time_ms), MEASURED);
  });
  const count = 2880 * 2;
  const cpu = process.cpuUsage();
  for (let n = 0; n < count; n++) commit(START_MS + n * SCAN_MS);
  const { user, system } = process.cpuUsage(cpu);
  const cost_us = (user + system) / count;
  database.close();
  for (const suffix of ['', '-wal', '-shm']) rmSync(`${path}${suffix}`, { force: true });
  return cost_us;
}

const history = new History(file, site.store);
history.start();
history.stop();
const from = performance.now();
writeYear();
line(
  `${scans} rows of ${unit.id}, ${names.length} series, written in`,
  ms(performance.now() - from),
);
const before = statSync(file).size;
line('  size without roll-ups', megabytes(before));

history.start();
const runner = { unit, newest_ms: null, view: { estimate: at(START_MS), measured: MEASURED } };
const service = new DaemonService({
  ...{ siteName: site.name, version: '', history, clock: { now: () => START_MS, speed: 1 } },
  runners: new Map([[unit.id, runner as unknown as UnitRunner]]),
} as unknown as PlantServiceParts);
const server = createHttpServer(
  service,
  { ...site.http, host: '127.0.0.1', port: 0, path_prefix: '' },
  { log: pino({ level: 'silent' }), pageFolder: folder },
);
const { url } = await server.start();
await askAll(url, 'the year over HTTP without roll-ups', 1);

const took: number[] = [];
for (let isDone = false; !isDone; ) {
  const cpu = process.cpuUsage();
  isDone = !history.rollUp();
  const { user, system } = process.cpuUsage(cpu);
  took.push((user + system) / 1000);
}
took.sort((a, b) => a - b);
line(
  'CPU of a day rolled up, median and most',
  `${ms(took[took.length >> 1]!)}, ${ms(took.at(-1)!)}`,
);
await askAll(url, 'the year over HTTP', 5);

const profile = step.profile!;
history.write(() => {
  for (let n = 0; n < 1440; n++) {
    history.profiles.add({ ...profile, time: new Date(START_MS + n * 600_000).toISOString() });
  }
});
const to = new Date(START_MS + 10 * DAY_MS).toISOString();
const span = `from=${new Date(START_MS).toISOString()}&to=${to}`;
for (const query of ['points=60', 'points=60&sigma=no', 'points=200']) {
  const { took_ms, cpu_ms, body } = await ask(url, `profiles?${span}&${query}`);
  line(
    `ten days of profiles over HTTP, ${query}`,
    `${ms(took_ms)}, CPU ${ms(cpu_ms)}; ${(body.length / 1e3).toFixed(0)} kB`,
  );
}
await server.stop();
history.stop();
const database = new SQLite(file);
database.pragma('wal_checkpoint(TRUNCATE)');
const sizeOf = (sql: string) => database.prepare(sql).pluck().get() as number;
const rolled = ['10min', '2h', '1d'].map((level) =>
  sizeOf(`SELECT coalesce(sum(octet_length(content) + 40), 0) FROM rollup_${level}`),
);
line('  roll-ups of 10 min, 2 h and a day', rolled.map(megabytes).join(', '));
const kept = sizeOf('SELECT avg(octet_length(json)) FROM profiles') / 1e3;
line(
  'a profile, as JSON and as kept',
  `${(JSON.stringify(profile).length / 1e3).toFixed(0)} kB, ${kept.toFixed(1)} kB`,
);
line('  profiles of a day', `${((kept * 144) / 1e3).toFixed(2)} MB`);
line('  an estimate as JSON', `${(JSON.stringify(step.estimate).length / 1e3).toFixed(1)} kB`);
line('  size with roll-ups and ten days of profiles', megabytes(statSync(file).size));
database.close();
const [plain, with_] = [commitCost(false), commitCost(true)];
line(
  'CPU of a commit of a scan without and with roll-ups',
  `${plain.toFixed(0)} us, ${with_.toFixed(0)} us`,
);
if (!asked.keep)
  for (const suffix of ['', '-wal', '-shm']) rmSync(`${file}${suffix}`, { force: true });
