import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { parse, stringify } from 'yaml';
import { checkAheadOptions } from '../../src/commands/aheadState.js';
import { balanceText } from '../../src/commands/balance/text.js';
import { loadSite } from '../../src/config/load.js';
import { balanceOf } from '../../src/core/plan/balance.js';
import { contextOf } from '../core/plan/units.js';
import { unitOf } from '../core/track/plants.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { START_MS, writeSynthetic } from './synthetic.js';

const folder = temporaryFolder('balance');
const config = join(folder, 'plant.yaml');
const recording = join(folder, 'run.csv');
const from = ['--config', config, '--recording', recording];

beforeAll(async () => {
  const site = parse(readFileSync('config/hot-air.yaml', 'utf8'), { merge: true });
  site.units[0].estimator = { cells: 40 };
  writeFileSync(config, stringify(site, { aliasDuplicateObjects: false }));
  await writeSynthetic(recording, loadSite(config).units[0]!, { rows: 40 });
});

describe('rockhour headroom, capability and balance, from a recording of one store', () => {
  const time = new Date(START_MS + 39 * 30_000).toISOString();

  it('headroom: a table with what ends it, and why a power is refused', async () => {
    const { stdout, code } = await rockhour(['headroom', ...from, '--power', '1.2,5']);
    expect(code).toBe(0);
    expect(stdout).toContain(`air1: estimate of ${time}, 0 s old, quality `);
    expect(stdout).toMatch(/^ +1\.2 +\d+\.\d\d +\d+\.\d\d +\d+\.\d\d .* (hot_outlet|flow)$/m);
    expect(stdout).toMatch(
      /^ +5 +0\.00 .*above_greatest_power: the unit charges at 0\.000 to 3\.000 MW_el$/m,
    );
  });

  it('capability: JSON of one line, and at an earlier time', async () => {
    const at = new Date(START_MS + 20 * 30_000).toISOString();
    const { stdout, code } = await rockhour(['capability', ...from, '--at', at, '--json']);
    expect(code).toBe(0);
    expect(stdout.trimEnd()).not.toContain('\n');
    const answer = JSON.parse(stdout);
    expect(answer).toMatchObject({ unit: 'air1', time: at, age_s: 0, rated_power_MW_el: 0.6 });
    // As a daemon heads its answers.
    expect(Date.parse(answer.valid_until)).toBe(Date.parse(at) + 600_000);
    expect(answer.given).toContain('the machine runs');
    expect(answer.limits.discharge).toMatchObject({ power_min_MW_el: 0.2, power_max_MW_el: 0.7 });
    expect(answer.discharge.points.length).toBeGreaterThan(1);
    expect(answer.discharge.largest_error_MW_el).toBeLessThanOrEqual(0.006);
    expect(Object.keys(answer.charge.points[0].stored_MWh_th)).toEqual(['rock']);
  });

  it('balance: what a flush wins, and no mismatch', async () => {
    const { stdout, code } = await rockhour([
      ...['balance', ...from, '--price', '100', '--charging-price', '-20'],
    ]);
    expect(code).toBe(0);
    expect(stdout).toContain('Usual cycle: takes ');
    expect(stdout).toMatch(/^full charge +-?\d+\.\d\d /m);
    expect(stdout).toMatch(/^full discharge: energy costs /m);
    expect(stdout).toContain('no mismatch: one store');
  });

  it('says what is wrong with a question', async () => {
    const { stderr, code } = await rockhour(['capability', ...from, '--tolerance', '1']);
    expect(stderr).toContain(
      '--tolerance is "1"; expected a share of rated power from 0.0005 to 0.2',
    );
    expect(code).toBe(2);
    const beyond = await rockhour(['balance', ...from, '--power', '5']);
    expect(beyond.stderr).toContain('--power is 5; expected 0.2 to 0.7 MW, as the unit discharges');
    expect(beyond.code).toBe(2);
  });
});

describe('options of the commands about what lies ahead', () => {
  it.each([
    [{}, 'balance needs --config and --recording, or --url of a daemon'],
    [{ config: 'a', recording: 'b', url: 'http://127.0.0.1:1' }, '--url asks a daemon;'],
    [{ config: 'a', recording: 'b', stale: 'mark' }, '--stale goes with --url'],
    [{ url: 'http://127.0.0.1:1', stale: 'no' }, '--stale is "no"; expected refuse or mark'],
  ])('%j do not go together', (options, words) => {
    expect(() => checkAheadOptions('balance', options)).toThrow(words);
  });
});

describe('the balance of two stores as text', () => {
  const unit = unitOf();
  const head = { unit: 'u', time: '2026-01-31T06:00:00.000Z', age_s: 3, quality: 'good' } as const;
  const found = balanceOf(contextOf(unit, { hot: 0.7, cold: 0.45 }), {});
  const text = balanceText({ ...head, ...found });
  const lines = text.split('\n');

  it('has the hours of each store, what is stranded, and every way to trim', () => {
    expect(lines[0]).toBe('u: estimate of 2026-01-31T06:00:00.000Z, 3 s old, quality good');
    const hot = found.mismatch?.alone.hot;
    const p50 = hot?.hours.p50.toFixed(2);
    expect(text).toMatch(new RegExp(`^hot +\\d+\\.\\d\\d +${p50} `, 'm'));
    expect(text).toMatch(
      /^Each run alone, store cold is empty first, the other \d+\.\d\d h later/m,
    );
    const worth = found.mismatch?.stranded?.worth_MWh_el.toFixed(2);
    expect(text).toContain(`stranded, worth ${worth} MWh_el.`);
    for (const way of ['longer charge', 'run on', 'stand']) {
      expect(lines.some((line) => line.startsWith(`${way} `))).toBe(true);
    }
  });

  it('says where the stores match', () => {
    const { mismatch } = found;
    if (mismatch === null) throw new Error('two stores have a mismatch');
    const matched = { ...mismatch, mismatch_h: 0, ends_first: null, stranded: null };
    const words = balanceText({ ...head, ...found, mismatch: matched });
    expect(words).toContain('The stores match to a minute.');
    expect(words).not.toContain('worth');
  });
});
