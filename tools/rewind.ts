/**
 * How long a rewind takes: the unit of `config/demo.yaml` with its simulated plant, one string of the
 * hot store behind a gateway that delivers all of its readings hours late:
 *
 *   npx tsx tools/rewind.ts
 *
 * Runs journal, pipeline and history of the daemon in a folder of their own, twice: with the string
 * late and with all in time, and holds both states against each other to the bit. Options: --hours N
 * (24), --scan S (60, seconds), --unit-file FILE (config/demo.yaml).
 */
import { mkdtempSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { serialize } from 'node:v8';
import SQLite from 'better-sqlite3';
import type { JournalReading } from '../src/adapters/history/journal.js';
import { loadSite } from '../src/config/load.js';
import type { UnitDefinition } from '../src/core/definitions.js';
import { rawToSi } from '../src/core/scan/convert.js';
import { realCore } from '../src/daemon.js';
import { createDemoPlant } from '../src/plant/demoPlant.js';
import { Rig } from '../test/daemon/rewind/rig.js';
import { helpIfAsked } from './help.js';

helpIfAsked(import.meta.url);

const { values: asked } = parseArgs({
  options: {
    hours: { type: 'string', default: '24' },
    scan: { type: 'string', default: '60' },
    'unit-file': { type: 'string', default: 'config/demo.yaml' },
  },
});
const scan_period_s = Number(asked.scan);
const [configured] = loadSite(asked['unit-file']).units as [UnitDefinition];
const unit: UnitDefinition = { ...configured, scan_period_s };
const period_ms = scan_period_s * 1000;
const start_ms = Math.floor((Date.now() - Number(asked.hours) * 3_600_000) / period_ms) * period_ms;
const scans = Math.round((Number(asked.hours) * 3600) / scan_period_s);

const MODES = ['discharge', 'stand', 'charge'];
const plant = createDemoPlant(unit, { start_ms, incidents: false });
const course: JournalReading[][] = Array.from({ length: scans }, () => {
  const { time_ms, values } = plant.step();
  return unit.channels.flatMap((channel) => {
    const raw = values[channel.id];
    if (raw === undefined || raw === null) return [];
    const value = typeof raw === 'string' ? MODES.indexOf(raw) - 1 : rawToSi(channel)(raw);
    const one = { unit: unit.id, channel: channel.id, time_ms, arrival_ms: time_ms, value };
    return [{ ...one, quality: 'good' }];
  });
});
const behind = new Set(unit.stores[0]!.strings[0]!.thermocouples.map(({ id }) => id));

const folders: string[] = [];
async function opened(): Promise<Rig> {
  const folder = mkdtempSync(join(tmpdir(), 'rockhour-rewind-'));
  folders.push(folder);
  return new Rig({ folder, core: realCore, units: [unit] }).start();
}

async function run(rig: Rig, readings: readonly JournalReading[][]): Promise<number> {
  const begun = performance.now();
  for (let at = 0; at < readings.length; at += 60)
    await rig.take(readings.slice(at, at + 60).flat());
  return (performance.now() - begun) / 1000;
}

const inTime = await opened();
const live_s = await run(inTime, course);
const late = await opened();
// The first minutes come in time: no state is from before a unit's first scan.
const held = (scan: JournalReading[], i: number) =>
  i < 5 ? [] : scan.filter(({ channel }) => behind.has(channel));
const sent = course.map((scan, i) => {
  const gone = new Set(held(scan, i));
  return scan.filter((one) => !gone.has(one));
});
await run(late, sent);
const delivery = course.flatMap(held);
const now_ms = course.at(-1)![0]!.time_ms;
await late.take(delivery.map((one) => ({ ...one, arrival_ms: now_ms + 1000 })));

let longest_ms = 0;
let ticked = performance.now();
const ticker = setInterval(() => {
  longest_ms = Math.max(longest_ms, performance.now() - ticked);
  ticked = performance.now();
}, 1);
const [begun, cpu] = [performance.now(), process.cpuUsage()];
await late.settle(unit.id, 3_600_000);
const took_s = (performance.now() - begun) / 1000;
const used = process.cpuUsage(cpu);
clearInterval(ticker);

const same = (rig: Rig) => serialize(rig.runner.snapshot());
const record = late.history.rewinds.latest(unit.id);
const bare = (rig: Rig) =>
  JSON.stringify(rig.estimates(unit.id).map(({ revision: _, dispatch: __, ...rest }) => rest));
const database = new SQLite(join(late.folder, 'history.sqlite'), { readonly: true });
const [points, bytes] = database
  .prepare('SELECT count(*), sum(octet_length(image)) FROM rewind_points')
  .raw()
  .get() as [number, number];
database.close();
console.log(`${scans} scans of ${unit.channels.length} channels live: ${live_s.toFixed(1)} s`);
console.log(
  `${delivery.length} late readings: ${took_s.toFixed(1)} s by the clock, ` +
    `${((used.user + used.system) / 1e6).toFixed(1)} s of CPU, loop held at most ${longest_ms.toFixed(0)} ms`,
);
console.log(`record: ${JSON.stringify({ ...record, differences: record?.differences.length })}`);
console.log(
  `state to the bit as in time: ${same(late).equals(same(inTime))}; estimates: ${bare(late) === bare(inTime)}`,
);
const mean = bytes / points;
console.log(
  `${points} states of ${(mean / 1000).toFixed(0)} kB; 48 h of them: ${((192 * mean) / 1e6).toFixed(0)} MB`,
);
console.log(`history ${(statSync(join(late.folder, 'history.sqlite')).size / 1e6).toFixed(0)} MB`);
for (const rig of [inTime, late]) rig.stop();
for (const folder of folders) rmSync(folder, { recursive: true });
