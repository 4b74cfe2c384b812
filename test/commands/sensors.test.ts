import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { writeSynthetic } from './synthetic.js';

const folder = temporaryFolder('sensors');
const config = join(folder, 'plant.yaml');
const recording = join(folder, 'run.csv');
const short = join(folder, 'short.csv');

// Few cells: what is tested is the command, not the figures.
const demo = readFileSync('config/demo.yaml', 'utf8')
  .replace('scan_period_s: 30', 'scan_period_s: 60')
  .replace('hours_at_MW_el: [1.8, 1.2]', 'hours_at_MW_el: [1.8]\n    estimator: { cells: 20 }');
writeFileSync(config, demo);
const unit = loadSite(config).units[0]!;
const hot = unit.stores.find(({ id }) => id === 'hot')!;

const sensors = (...more: string[]) => rockhour(['sensors', '--config', config, ...more]);

beforeAll(async () => {
  await writeSynthetic(recording, unit, { rows: 5 * 60 });
  const [header, ...rows] = readFileSync(recording, 'utf8').trimEnd().split('\n');
  writeFileSync(short, [header, ...rows.slice(0, 60)].join('\n'));
  const at = header!.split(',').indexOf('hot_axis_04');
  const emptied = rows.map((row) => row.split(',').with(at, '').join(','));
  writeFileSync(recording, [header, ...emptied].join('\n'));
});

describe('rockhour sensors', () => {
  it('gives as JSON every thermocouple, the most precious first, every card, string and place', async () => {
    const { code, stdout, stderr } = await sensors('--store', 'hot', '--places', '3', '--json');
    expect({ code, stderr }).toEqual({ code: 0, stderr: '' });
    const answer = JSON.parse(stdout);
    expect(answer).toMatchObject({ unit: 'vellmoor', over: { kind: 'day' }, rejected: [] });
    expect(answer.full_hours).toBeGreaterThan(4);
    expect(answer.stores).toHaveLength(1);
    const [{ all, sensors: weighed, groups, strings }] = answer.stores;
    const ids = hot.strings.flatMap((s) => s.thermocouples.map((t) => t.id));
    expect(weighed.map((s: { id: string }) => s.id).sort()).toEqual([...ids].sort());
    const rises = weighed.map((s: { rise: number }) => s.rise);
    expect(rises).toEqual([...rises].sort((a, b) => b - a));
    expect(groups.map((g: { id: string }) => g.id)).toEqual(['card_h1', 'card_h2', 'card_h3']);
    for (const group of groups)
      expect(group.store.soc_sigma_rms).toBeGreaterThan(all.soc_sigma_rms);
    for (const { one_more } of strings) {
      expect(one_more.map((m: { position_m: number }) => m.position_m / 9.2)).toEqual([
        expect.closeTo(1 / 6),
        expect.closeTo(1 / 2),
        expect.closeTo(5 / 6),
      ]);
      for (const { rise } of one_more) expect(rise).toBeLessThan(0);
    }
  });

  it('says it to a person, over the second half of a recording, with what is rejected at its end', async () => {
    const { code, stdout, stderr } = await sensors(
      ...['--recording', recording, '--store', 'hot', '--places', '2', '--all'],
    );
    expect({ code, stderr }).toEqual({ code: 0, stderr: '' });
    expect(stdout).toContain(`the second half of ${recording} (5.0 h)`);
    // Others may be rejected as well: the synthetic recording follows no physics.
    expect(Number(/with all (\d+) on 3 strings +rms +worst/.exec(stdout)?.[1])).toBeLessThan(42);
    for (const { id } of hot.strings.flatMap((s) => s.thermocouples)) {
      expect(stdout).toMatch(new RegExp(`^${id} `, 'm'));
    }
    expect(stdout).toMatch(/^Rejected and not counted above/m);
    expect(stdout).toMatch(/^hot_axis_04 +axis +2\.37 +open +-?\d/m);
    expect(stdout).toMatch(/^group card_h2: 14, all of middle +\+\d/m);
    expect(stdout).not.toMatch(/^string /m);
    expect(stdout).toContain('One thermocouple more, on a card of its own:');
    expect(stdout).not.toContain('Store cold');
    expect(stdout).not.toMatch(/NaN|undefined|Infinity/);
  });

  it.each([
    [['--store', 'warm'], 2, '--store is "warm"; unit vellmoor has hot, cold'],
    [['--places', '101'], 2, '--places is "101"; expected a whole number from 0 to 100'],
    [['--url', 'http://127.0.0.1:1'], 2, '--url asks a daemon; --config'],
    [['--recording', short], 3, 'covers less than 4 h'],
  ])('%j ends with one message', async (args, exit, words) => {
    const { code, stdout, stderr } = await sensors(...args);
    expect(stderr).toContain(words);
    expect(code).toBe(exit);
    expect(stdout).toBe('');
  });
});
