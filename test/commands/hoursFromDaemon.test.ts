import type { ChildProcess } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import mqtt from 'mqtt';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { parse, stringify } from 'yaml';
import { loadSite } from '../../src/config/load.js';
import type { SiteConfig } from '../../src/config/site.js';
import { rockhour, startRockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { freePort } from '../support/ports.js';
import { waitFor } from '../support/wait.js';
import { syntheticReading } from './synthetic.js';

const SCANS = 15;
const folder = temporaryFolder('hours');
const config = join(folder, 'plant.yaml');
let daemon: ChildProcess;
let site: SiteConfig;
let url: string;

/** The demonstration plant on ports and in a folder of the test's own. */
async function writeConfig(): Promise<void> {
  const demo = parse(readFileSync('config/demo.yaml', 'utf8'), { merge: true });
  demo.mqtt = { ...demo.mqtt, embedded_port: await freePort() };
  // Few cells: weighing thermocouples takes seconds with many.
  demo.units[0].estimator = { ...demo.units[0].estimator, cells: 40 };
  demo.http = { ...demo.http, port: await freePort() };
  demo.store = { ...demo.store, folder: join(folder, 'data') };
  writeFileSync(config, stringify(demo, { aliasDuplicateObjects: false }));
  site = loadSite(config);
}

async function sendScans(): Promise<void> {
  const unit = site.units[0]!;
  const period_ms = unit.scan_period_s * 1000;
  const first_ms = (Math.floor(Date.now() / period_ms) - SCANS) * period_ms;
  const client = await mqtt.connectAsync(`mqtt://127.0.0.1:${site.mqtt.embedded_port}`);
  for (let scan = 0; scan < SCANS; scan++) {
    const time = new Date(first_ms + scan * period_ms).toISOString();
    for (const { topic, channels, payload } of site.sources) {
      const values = channels.map((id) =>
        syntheticReading(
          unit,
          unit.channels.find((one) => one.id === id)!,
          scan * unit.scan_period_s,
        ),
      );
      const body = payload === 'array' ? { time, values } : { time, value: values[0] };
      await client.publishAsync(topic, JSON.stringify(body), { qos: 1 });
    }
  }
  await client.endAsync();
}

async function api(path: string) {
  // biome-ignore lint/suspicious/noExplicitAny: what any client of the API sees
  return (await fetch(url + path)).json() as Promise<any>;
}

beforeAll(async () => {
  await writeConfig();
  daemon = startRockhour(['run', '--config', config]);
  let said = '';
  daemon.stdout?.on('data', (chunk: Buffer) => {
    said += chunk.toString();
  });
  daemon.stderr?.resume();
  url = `http://127.0.0.1:${site.http.port}`;
  await waitFor('the ready line', () => said.includes('ready page='));
});

afterAll(async () => {
  const ended = new Promise((resolve) => daemon.once('exit', resolve));
  if (daemon.kill('SIGTERM')) await ended;
});

describe('rockhour hours of a running daemon', () => {
  it('says that there is no estimate yet', async () => {
    const { code, stderr } = await rockhour(['hours', '--url', url, '--power', '1']);
    expect(stderr).toContain('no estimate yet');
    expect(code).toBe(4);
  });

  it('gives what the API gives, with the age of the estimate', async () => {
    await sendScans();
    await waitFor('the scans', async () => (await api('/api/counters')).counters.scans >= SCANS);
    const { stdout, code } = await rockhour(['hours', '--url', url, '--power', '1,1.5', '--json']);
    expect(code).toBe(0);
    const answer = JSON.parse(stdout);
    const direct = await api('/api/units/vellmoor/hours?power_MW=1,1.5');
    expect(answer).toMatchObject({ unit: 'vellmoor', time: direct.time, answers: direct.answers });
    expect(answer.age_s).toBeGreaterThan(0);
    expect(answer.answers).toHaveLength(2);
  });

  it('gives headroom and capability as the API does', async () => {
    const headroom = await rockhour(['headroom', '--url', url, '--power', '2.4', '--json']);
    expect(headroom.code).toBe(0);
    const direct = await api('/api/units/vellmoor/headroom?power_MW=2.4');
    const { age_s, ...answer } = JSON.parse(headroom.stdout);
    expect(answer).toEqual(expect.objectContaining({ answers: direct.answers, time: direct.time }));
    expect(age_s).toBeGreaterThan(0);
    const { stdout, code } = await rockhour(['capability', '--url', url, '--tolerance', '0.05']);
    expect(code).toBe(0);
    expect(stdout).toMatch(/^Discharging at most; ends by \w+; largest error 0\.0\d+ MW_el /m);
    expect(stdout).toMatch(/^Cycle \d from now, /m);
  });

  it('gives what the thermocouples of the present state are worth, as text', async () => {
    const { stdout, code } = await rockhour(['sensors', '--url', url, '--store', 'hot', '--all']);
    expect(code).toBe(0);
    expect(stdout).toMatch(
      /^the next \d+\.\d h, (charging|discharging|standing), from the present state$/m,
    );
    expect(stdout).toContain('Losses are counted from now on.');
    const { stores } = await api('/api/units/vellmoor/sensors');
    const [{ id, string_id }] = stores[0].sensors;
    expect(stdout).toMatch(new RegExp(`^${id} +${string_id} `, 'm'));
    expect(stdout).not.toContain('Store cold');
    const wrong = await rockhour(['sensors', '--url', url, '--store', 'warm']);
    expect(wrong.stderr).toContain('--store is "warm"; unit vellmoor has hot, cold');
    expect(wrong.code).toBe(2);
  });

  it('gives an offer table with its blocks, keeps it, and reports on what it kept', async () => {
    const gate = ['--closes-before', '60min', '--every', '4h', '--count', '2'];
    const ask = ['--url', url, '--power', '0.8,9', ...gate, '--certainty', '0.5,0.9'];
    const { stdout, code } = await rockhour(['offers', ...ask, '--blocks', '--keep']);
    expect(code).toBe(0);
    expect(stdout).toMatch(/^vellmoor: estimate of .* quality /);
    expect(stdout).toMatch(/^\d{4}-\S+:[0-9]{2}\+0\d:00 +0\.8 .* cold_outlet \d+ %/m);
    expect(stdout).toContain('above_greatest_power: the unit discharges at 0.400 to 2.000 MW_el');
    expect(stdout).toMatch(/^from +MWh_el 50 % +MWh_el 90 % +mean MWh_el +whole alone/m);
    expect(stdout).toContain('Given that the machine runs: ');
    expect(stdout).toContain('Kept as number 1.');
    const [kept] = (await api('/api/units/vellmoor/offers/history')).tables;
    expect(kept).toMatchObject({ no: 1, block_s: 900 });
    expect(kept.offers).toHaveLength(4);
    const report = await rockhour(['offers', '--url', url, '--report']);
    expect(report.stdout).toContain('No offer was put to the test.');
    expect(report.stdout).toContain('Not put to the test: 2 refused, 2 not_yet.');
  });

  it('passes on what the daemon says of a unit that it does not have', async () => {
    const { stderr, code } = await rockhour(['hours', '--url', url, '--unit', 'x', '--power', '1']);
    expect(stderr).toContain('there is no unit "x"; one of vellmoor');
    expect(code).toBe(2);
  });

  it('finds its folder taken when it is started twice, and says so in one message', async () => {
    const { stderr, code } = await rockhour(['run', '--config', config, '--log-level', 'silent']);
    expect(stderr).toMatch(/^rockhour: .+\n.+ \[STORE_FAILED\]\n$/);
    expect(code).toBe(4);
  });

  it('finds its port taken by another daemon, and says so in one message', async () => {
    const other = join(folder, 'other.yaml');
    const text = readFileSync(config, 'utf8').replace(join(folder, 'data'), join(folder, 'other'));
    writeFileSync(other, text);
    const { stderr, code } = await rockhour(['run', '--config', other, '--log-level', 'silent']);
    expect(stderr).toMatch(/^rockhour: .*EADDRINUSE.*\n.*\[PORT_IN_USE\]\n$/);
    expect(code).toBe(4);
  });

  it('ends with code 0 when it is asked to stop', async () => {
    const code = new Promise((resolve) => daemon.once('exit', resolve));
    daemon.kill('SIGTERM');
    expect(await code).toBe(0);
  });
});
