import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { tuneText } from '../../src/commands/tune/print.js';
import { fragmentFaults, mergeFragment } from '../../src/config/fragment.js';
import { parseSite } from '../../src/config/load.js';
import { DEMO_GEOMETRY } from '../plant/demoGeometry.js';
import { headerOf, rowOf } from '../plant/recording.js';
import { createTruth } from '../plant/truth.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';

const CONFIG = 'config/demo.yaml';
const folder = temporaryFolder('tune');
const recording = join(folder, 'run.csv');
const H = 3600;

beforeAll(() => {
  const geometry = { ...DEMO_GEOMETRY, scan_period_s: 60 };
  const plant = createTruth({ seed: 11, geometry, resolution: { cells: 150 }, step_s: 30 });
  const rows = [headerOf(geometry)];
  plant.run(
    [
      { mode: 'stand', duration_s: 0.5 * H },
      { mode: 'charge', power_W: 2.4e6, duration_s: 2.5 * H },
      { mode: 'discharge', power_W: 1.5e6, duration_s: 1.5 * H },
    ],
    (scan) => rows.push(rowOf(geometry, scan)),
  );
  writeFileSync(recording, `${rows.join('\n')}\n`);
});

function tune(...more: string[]) {
  return rockhour(['tune', '--config', CONFIG, '--recording', recording, ...more]);
}

describe('rockhour tune', () => {
  it('tells everything as JSON and writes a fragment that the file takes', async () => {
    const out = join(folder, 'tuned.yaml');
    const { code, stdout, stderr } = await tune('--out', out, '--json');
    expect(stderr).toBe('');
    expect(code).toBe(0);
    const result = JSON.parse(stdout);
    expect(result.unit).toBe('vellmoor');
    expect(result.correlations).toHaveLength(result.rows.length);
    for (const row of result.rows) {
      expect(row.value).toBeGreaterThan(row.name === 'gas_share' ? -1 : 0);
      expect(row.determined).toBe(row.reason === null);
    }
    const fragment = readFileSync(out, 'utf8');
    expect(result.fragment).toBe(fragment);
    expect(fragment).toContain('# conductivity: not determined');
    expect(fragmentFaults(CONFIG, fragment)).toEqual([]);
    const { site } = parseSite(mergeFragment(readFileSync(CONFIG, 'utf8'), fragment), 'config');
    // So short a recording need not settle the search in every store: what has not is left out.
    const settled = result.fits.map((fit: { converged: boolean }) => fit.converged);
    expect(settled).toContain(true);
    const stores = site!.units[0]!.stores;
    expect(stores.map(({ bed }) => bed.heat_transfer_factor !== 1)).toEqual(settled);
    expect(stores.map(({ bed }) => bed.conductivity_factor)).toEqual([1, 1]);

    const text = tuneText(result);
    expect(text).toMatch(/^vellmoor: .* 2\.5 h charging, 1\.5 h discharging, 0\.5 h standing/);
    for (const words of ['heat transfer', 'front travel per metered kg', 'not determined']) {
      expect(text).toContain(words);
    }
    // Half an hour at rest shows no conduction.
    expect(text).toContain('hot: bed conductivity: less than 4 h of standing');
  });

  it.each([
    ['too short', ['--to', '2025-01-01T02:00:00Z'], 3, 'less than 3 h without a gap'],
    ['a window without rows', ['--from', '2026-01-01T00:00:00Z'], 3, 'no stretch of known flow'],
    [
      'times turned round',
      ['--from', '2025-01-01T02:00:00Z', '--to', '2025-01-01T01:00:00Z'],
      2,
      'does not come after',
    ],
    ['an output over its input', ['--out', CONFIG], 2, 'would overwrite'],
  ])('refuses %s in words', async (_, more, expected, words) => {
    const { code, stdout, stderr } = await tune(...more);
    expect(stderr).toContain(words);
    expect(code).toBe(expected);
    expect(stdout).toBe('');
  });
});
