import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { stringify } from 'yaml';
import { ReadingPublisher } from '../../src/adapters/mqtt/readingPublisher.js';
import { loadSite } from '../../src/config/load.js';
import { RockhourProcess } from '../daemon/processes.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { startInflux, startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { type MeasuredUnit, sourceMs } from './measuredUnits.js';
import { type InfluxRow, readInflux, readSqlite, type Stored } from './readBack.js';

export const MEASUREMENTS = [
  'rockhour_unit',
  'rockhour_store',
  'rockhour_front',
  'rockhour_string',
  'rockhour_sensor',
  'rockhour_dispatch',
  'rockhour_event',
] as const;

/** What has become of one unit at the end of the chain. */
export interface ChainResult {
  readonly stored: Stored;
  readonly influx: Readonly<Record<string, InfluxRow[]>>;
  /** Lines of `rockhour replay` of the same recording. */
  readonly replayed: readonly Record<string, unknown>[];
}

function writeSite(units: readonly MeasuredUnit[], mqtt: string, influx: string): string {
  const path = join(temporaryFolder('chain'), 'site.yaml');
  // Of months ago: nothing of the recordings may count as old.
  const long = { keep_readings_days: 36500, keep_estimates_days: 36500, thin_after_days: 36500 };
  const site = {
    name: 'Measured stores',
    units: units.map(({ block }) => block),
    mqtt: { url: mqtt, client_id: 'measured-chain' },
    influx: { url: influx },
    store: { folder: './data', ...long },
    http: { port: 0 },
  };
  writeFileSync(path, stringify(site));
  return path;
}

/** Plays the rows of all units as their gateways would, minute by minute. */
async function play(path: string, url: string, units: readonly MeasuredUnit[]): Promise<void> {
  const gateway = new ReadingPublisher(url, loadSite(path).sources);
  await gateway.start();
  try {
    const most = Math.max(...units.map(({ rows }) => rows.length));
    for (let i = 0; i < most; i++) {
      await Promise.all(
        units.map(async ({ id, rows }) => {
          const row = rows[i];
          if (row) await gateway.readings(id, sourceMs(row.time_s), row.values);
        }),
      );
    }
  } finally {
    await gateway.stop();
  }
}

interface Health {
  readonly parts: { readonly name: string; readonly detail: string }[];
}

/** Waits until every unit's measured time is estimated and all of it is in the database. */
async function finished(page: string, units: readonly MeasuredUnit[]): Promise<void> {
  const get = async <T>(path: string) => (await (await fetch(`${page}${path}`)).json()) as T;
  await waitFor(
    'the last scans',
    async () => {
      const { units: now } = await get<{ units: { unit: string; time: string | null }[] }>(
        'api/units',
      );
      const times = new Map(now.map(({ unit, time }) => [unit, Date.parse(time ?? '')]));
      return units.every(({ id, end_s }) => (times.get(id) ?? 0) >= sourceMs(end_s));
    },
    120_000,
    100,
  );
  await waitFor(
    'an empty outbox',
    async () =>
      (await get<Health>('api/health')).parts.find(({ name }) => name === 'influxdb')?.detail ===
      '0 entries to forward',
    30_000,
    100,
  );
}

async function replay(path: string, unit: MeasuredUnit, recording: string) {
  const file = join(temporaryFolder('measured'), `${unit.id}.csv`);
  writeFileSync(file, recording);
  const out = `${file}.jsonl`;
  const args = ['--config', path, '--unit', unit.id, '--recording', file, '--out', out];
  const { code, stderr } = await rockhour(['replay', ...args, '--hours-every', '1min']);
  if (code !== 0) throw new Error(stderr);
  const lines = readFileSync(out, 'utf8').trimEnd().split('\n');
  return lines.map((line) => JSON.parse(line) as Record<string, unknown>);
}

/**
 * The whole chain, with the programs themselves: readings to mosquitto, from there to a daemon of
 * its own process, into its SQLite file and on to InfluxDB; and the same rows through
 * `rockhour replay`.
 */
export async function runChain(
  programs: { readonly mosquitto: string; readonly influxd: string },
  units: readonly MeasuredUnit[],
  recordingOf: (unit: MeasuredUnit) => string,
): Promise<Map<string, ChainResult>> {
  const mosquitto = await startMosquitto(programs.mosquitto);
  const influx = await startInflux(programs.influxd);
  const path = writeSite(units, mosquitto.url, influx.url);
  const daemon = new RockhourProcess(['run', '--config', path], true);
  try {
    const [, page] = / page=(\S+)/.exec(await daemon.ready())!;
    await waitFor('the broker', () => daemon.stderr.includes('connected to the MQTT broker'));
    await play(path, mosquitto.url, units);
    await finished(page!, units);
    const code = await daemon.end('SIGTERM');
    if (code !== 0) throw new Error(`the daemon ended with ${code}: ${daemon.stderr}`);
    const results = new Map<string, ChainResult>();
    for (const unit of units) {
      const points: Record<string, InfluxRow[]> = {};
      for (const name of MEASUREMENTS) points[name] = await readInflux(influx.url, name, unit.id);
      results.set(unit.id, {
        stored: readSqlite(join(path, '..', 'data', 'history.sqlite'), unit.id),
        influx: points,
        replayed: await replay(path, unit, recordingOf(unit)),
      });
    }
    return results;
  } finally {
    await daemon.end('SIGKILL');
    await influx.stop();
    await mosquitto.stop();
  }
}
