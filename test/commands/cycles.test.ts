import { readFileSync, writeFileSync } from 'node:fs';
import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { parse, stringify } from 'yaml';
import { cyclesText } from '../../src/commands/cycles/text.js';
import { checkCyclesOptions } from '../../src/commands/cycles.js';
import { loadSite } from '../../src/config/load.js';
import { cycleView } from '../../src/core/watch/cycleView.js';
import { run, script } from '../core/watch/cycleScript.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { START_MS, writeSynthetic } from './synthetic.js';

const RUNS = run(
  script([
    { mode: 'stand', scans: 30 },
    { mode: 'charge', scans: 240 },
    { mode: 'stand', scans: 60 },
    { mode: 'discharge', scans: 150 },
    { mode: 'stand', scans: 30 },
  ]),
).records.map(cycleView);

describe('runs for people', () => {
  it('one line each, one for each store, what is incomplete and where widths were taken', () => {
    const lines = cyclesText('u', RUNS).split('\n');
    expect(lines[0]).toBe(`u: 4 runs, to ${RUNS[3]!.to.slice(0, 19)}Z`);
    expect(lines[3]).toMatch(
      /^ *2 +charge +2026-05-01T\S+Z +4\.00 +8\.00\d +0\.000 +10\.1 +70\.0 /,
    );
    expect(lines[5]).toMatch(/^ *4 +discharge .* 62\.\d +- +- +0$/);
    const told = { made: '2026-05-01T05:32:00Z', power_MW_el: 2 };
    const ends = { end: '2026-05-01T08:10:29.000Z', firm_end: '2026-05-01T07:58:00.000Z' };
    const promised = RUNS.map((one) => ({ ...one, told: { ...told, ...ends } }));
    expect(cyclesText('u', promised).split('\n')[5]).toMatch(/ 62\.\d +08:10Z +07:58Z +0$/);
    const stores = lines.filter((line) => / (hot|cold) /.test(line));
    expect(stores).toHaveLength(8);
    expect(stores[2]).toContain(' 0.75 1.00 ');
    expect(lines).toContain('Run 1 is incomplete: began_before.');
    expect(cyclesText('u', [])).toBe('u: no run that is over');
  });
});

describe('rockhour cycles', () => {
  const folder = temporaryFolder('cycles');
  const config = join(folder, 'plant.yaml');
  const recording = join(folder, 'run.csv');
  let server: Server;
  let url = '';
  const asked: string[] = [];

  beforeAll(async () => {
    const site = parse(readFileSync('config/hot-air.yaml', 'utf8'), { merge: true });
    site.units[0].estimator = { cells: 40 };
    writeFileSync(config, stringify(site, { aliasDuplicateObjects: false }));
    const unit = loadSite(config).units[0]!;
    await writeSynthetic(recording, unit, { rows: 60 });
    // It charges for 30 rows, then stands.
    const [head, ...rows] = readFileSync(recording, 'utf8').trimEnd().split(/\r?\n/);
    const still = head!.split(',').map((name) => {
      const role = unit.channels.find(({ id }) => id === name)?.role.kind;
      return role === 'flow' || role === 'power' || role === 'mode' || role === 'valve';
    });
    const stood = rows.map((row, i) => {
      const cells = row.split(',');
      return i < 30 ? row : cells.map((cell, k) => (still[k] ? '0' : cell)).join(',');
    });
    writeFileSync(recording, [head, ...stood, ''].join('\r\n'));
    server = createServer((request, response) => {
      asked.push(request.url!);
      const body = request.url!.startsWith('/api/units/')
        ? { unit: 'u', from: '', to: '', older_left_out: true, cycles: RUNS }
        : { units: [{ unit: 'u' }] };
      response.setHeader('content-type', 'application/json').end(JSON.stringify(body));
    });
    await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
    url = `http://127.0.0.1:${(server.address() as AddressInfo).port}`;
  });
  afterAll(() => server.close());

  it('tells the runs of a recording, and what is not over at its end', async () => {
    const from = ['--config', config, '--recording', recording];
    const { stdout, stderr, code } = await rockhour(['cycles', ...from, '--json']);
    expect(stderr).toMatch(/^stand since \S+ is not over at the end of the recording$/m);
    expect(code).toBe(0);
    const { unit, cycles } = JSON.parse(stdout);
    expect(unit).toBe('air1');
    expect(cycles.map(({ kind }: { kind: string }) => kind)).toEqual(['charge']);
    expect(cycles[0]).toMatchObject({
      from: new Date(START_MS).toISOString(),
      incomplete: ['began_before'],
    });
    const edge_s = (Date.parse(cycles[0].to) - START_MS) / 1000;
    expect(Math.abs(edge_s - 29.5 * 30)).toBeLessThanOrEqual(60);
    expect(cycles[0].ambient_mean_degC).toBeGreaterThan(-50);
  });

  it('asks a daemon for the span and the kind', async () => {
    const { stdout, stderr, code } = await rockhour([
      ...['cycles', '--url', url, '--from', '2026-01-01T00:00:00Z', '--kind', 'charge'],
    ]);
    expect(code).toBe(0);
    expect(asked.at(-1)).toBe('/api/units/u/cycles?from=2026-01-01T00%3A00%3A00Z&kind=charge');
    expect(stdout).toContain('u: 4 runs');
    expect(stderr).toContain('older ones');
  });

  it.each([
    [{ config: 'a.yaml' }, 'needs --config and --recording'],
    [{ url: 'http://x', recording: 'b.csv' }, 'do not go with it'],
    [{ url: 'http://x', kind: 'rest' }, 'expected charge, stand, discharge'],
  ])('refuses %j', (options, said) => {
    expect(() => checkCyclesOptions(options)).toThrow(said);
  });
});
