/**
 * What the daemon carries: a real daemon and mosquitto, units like that of config/demo.yaml, the
 * environment of config/rockhour.service.
 *
 *   npm run load -- [--only ingest,units,one,week] [--messages 200000] [--rounds 3] [--units 200]
 *                   [--minutes 20] [--scan 10] [--payload array|value] [--burst] [--days 7]
 *                   [--protocol 5|4]
 *
 * ingest: messages a second at QoS 1, one value each, from the first to the last in the journal, beside
 * a bare MQTT.js subscriber on the same queue, in turn; readings each 1 s (a scan is 30 s: ingest is
 * nearly all) and each 30 s (each set of readings is a scan of the estimator, in the same thread).
 * units: 200 in real time, spread over the scan period or, with --burst, all at once; how late their
 * scans are taken in after the first two minutes, in which all units are new at once and which are told
 * apart, and the resident memory, from the start on. one: memory of one unit, for a tenth
 * of the time. week: one unit over simulated days, slope of its resident memory after the first.
 * Ends with 1 where a goal is missed: ratio 0.6, p99 1 s, 1000 MB and 200 MB, 1 MB a day.
 */
import { existsSync, mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { table } from '../src/commands/table.js';
import { findProgram, PROGRAMS } from '../test/support/requirements.js';
import { helpIfAsked } from './help.js';
import { ingest } from './load/ingest.js';
import { manyUnits } from './load/units.js';
import { week } from './load/week.js';

helpIfAsked(import.meta.url);

const PARTS = ['ingest', 'units', 'one', 'week'] as const;
const { values } = parseArgs({
  options: {
    only: { type: 'string', default: PARTS.join(',') },
    messages: { type: 'string', default: '200000' },
    rounds: { type: 'string', default: '3' },
    units: { type: 'string', default: '200' },
    minutes: { type: 'string', default: '20' },
    scan: { type: 'string', default: '10' },
    protocol: { type: 'string', default: '5' },
    payload: { type: 'string', default: 'array' },
    burst: { type: 'boolean', default: false },
    days: { type: 'string', default: '7' },
  },
});

function refuse(text: string): never {
  console.error(text);
  process.exit(2);
}

function positive(name: 'messages' | 'rounds' | 'units' | 'minutes' | 'scan' | 'days'): number {
  const value = Number(values[name]);
  return value > 0 ? value : refuse(`--${name} must be a number above 0, got "${values[name]}"`);
}

const chosen = values.only.split(',').map((name) => {
  const part = PARTS.find((one) => one === name);
  return part ?? refuse(`--only has "${name}"; known are ${PARTS.join(', ')}`);
});
const payload: 'array' | 'value' =
  values.payload === 'array' || values.payload === 'value'
    ? values.payload
    : refuse('--payload must be array or value');
const mosquitto =
  findProgram(PROGRAMS.mosquitto.names) ?? refuse('mosquitto is not on this machine');
if (existsSync(fileURLToPath(new URL('../dist/main.js', import.meta.url)))) {
  process.env.ROCKHOUR_TEST_BUILT = '1';
} else {
  console.error('not built (npm run build): from the sources the daemon takes some 80 MB more');
}

const rows: string[][] = [];
let missed = 0;
function row(what: string, found: string, asked: string, holds: boolean | null): void {
  rows.push([what, found, asked, holds === null ? '' : holds ? 'met' : 'MISSED']);
  if (holds === false) missed++;
}
const folder = () => mkdtempSync(join(tmpdir(), 'rockhour-load-'));
const told = (text: string) => console.error(text);
const mean = (all: readonly number[]) => all.reduce((sum, one) => sum + one, 0) / all.length;

if (chosen.includes('ingest')) {
  for (const every_s of [1, 30]) {
    const protocol = values.protocol === '4' ? 4 : 5;
    const sizes = { messages: positive('messages'), rounds: positive('rounds') };
    const found = await ingest({ mosquitto, folder: folder(), every_s, protocol, ...sizes });
    for (const { bare, daemon } of found) {
      told(`each ${every_s} s: bare ${bare.toFixed(0)}/s, rockhour ${daemon.toFixed(0)}/s`);
    }
    const [bare, own] = [mean(found.map((one) => one.bare)), mean(found.map((one) => one.daemon))];
    const figures = `${own.toFixed(0)} of ${bare.toFixed(0)} messages/s: ${(own / bare).toFixed(2)}`;
    row(`ingest, readings each ${every_s} s`, figures, '0.60', own / bare >= 0.6);
  }
}
for (const part of ['units', 'one'] as const) {
  if (!chosen.includes(part)) continue;
  const units = part === 'one' ? 1 : positive('units');
  const minutes = positive('minutes') / (part === 'one' ? 10 : 1);
  const { burst } = values;
  const scan_s = positive('scan');
  const found = await manyUnits({
    ...{ mosquitto, folder: folder(), payload, told, burst, units, minutes, scan_s },
  });
  const { scans, wanted, all_p99_s, p50_s, p99_s, p99_bound_s, resident_MB } = found;
  const who = `${units} ${units === 1 ? 'unit' : 'units'}, ${minutes} min`;
  const late = `p50 ${p50_s.toFixed(3)} s, p99 ${p99_s.toFixed(3)} s (at most ${p99_bound_s} s)`;
  row(`${who}: lateness of scans`, late, 'p99 1 s', p99_s < 1);
  const first = 'with the first two minutes, in which all units are new';
  row(`${who}: ${first}`, `p99 ${all_p99_s.toFixed(3)} s`, 'told', null);
  row(`${who}: scans`, `${scans} of ${wanted}`, 'all', scans >= wanted - units);
  const most = units === 1 ? 200 : 1000;
  row(`${who}: resident memory`, `${resident_MB.toFixed(0)} MB`, `${most} MB`, resident_MB < most);
}
if (chosen.includes('week')) {
  const days = positive('days');
  const { resident_MB, slope, se, heap } = await week({ mosquitto, folder: folder(), days, told });
  const figures = `${slope.toFixed(2)} +- ${se.toFixed(2)} MB a day (heap ${heap.slope.toFixed(2)} +- ${heap.se.toFixed(2)}), at most ${resident_MB.toFixed(0)} MB`;
  row(`one unit, ${days} simulated days`, figures, '1 MB a day', slope < 1);
}
console.log(table(['what', 'found', 'asked', ''], rows));
process.exit(missed > 0 ? 1 : 0);
