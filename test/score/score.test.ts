import { spawnSync } from 'node:child_process';
import { describe, expect, it } from 'vitest';
import { Refusal, scoreOptions } from '../../tools/score/options.js';
import type { Scenario } from '../../tools/score/scenario.js';
import { ALL_SCENARIOS, QUICK, SCENARIOS } from '../../tools/score/scenarios.js';
import { FIXED_FROM } from '../../tools/score/seeds.js';
import { root } from '../house/imports.js';

function score(...args: string[]) {
  const program = ['--import', 'tsx', 'tools/score.ts', ...args];
  return spawnSync(process.execPath, program, { cwd: root, encoding: 'utf8' });
}

describe('npm run score', () => {
  it('refuses in one line that says what an option takes, and does nothing else', () => {
    const { status, stderr, stdout } = score('--only', 'nominal,gab');
    expect(stderr).toMatch(/^--only must be of nominal, .*; got gab$/m);
    expect(stderr.trim().split('\n')).toHaveLength(1);
    expect(stdout).toBe('');
    expect(status).toBe(2);
  });

  it.each([
    [['--seeds', '0'], '--seeds must be a whole number of at least 1, got "0"'],
    [['--fresh', 'many'], '--fresh must be a whole number of at least 0, got "many"'],
    [['--workers', '1.5'], '--workers must be a whole number of at least 1, got "1.5"'],
    [['--rows', 'all'], /^--rows must be of all-independent, .*; got all$/],
    [['--quick', '--only', 'watch'], /^--only must be of quick-cycle, .*; got watch$/],
  ])('refuses %s', (args, words) => {
    expect(() => scoreOptions(args)).toThrow(Refusal);
    expect(() => scoreOptions(args)).toThrow(words);
  });

  it('takes the seeds for scoring, the first ones for tuning, two of them where it is quick', () => {
    expect(scoreOptions(['--seeds', '2']).fixed).toEqual([FIXED_FROM, FIXED_FROM + 1]);
    expect(scoreOptions(['--seeds', '2', '--tuning'])).toMatchObject({
      ...{ fixed: [1, 2], freshCount: 0 },
    });
    expect(scoreOptions(['--quick'])).toMatchObject({ list: QUICK, freshCount: 0 });
    expect(scoreOptions(['--quick']).fixed).toEqual([1, 2]);
    expect(scoreOptions([])).toMatchObject({ list: SCENARIOS, freshCount: 5, workers: 2 });
  });
});

describe('the scenarios', () => {
  it('have names of their own, rows of their own and truths that differ where their names do', () => {
    const ids = ALL_SCENARIOS.map((s) => s.id);
    expect(new Set(ids).size).toBe(ids.length);
    for (const { id, rows } of ALL_SCENARIOS) {
      expect(new Set(rows.map((r) => r.id)).size, id).toBe(rows.length);
    }
    const plans = new Map(ALL_SCENARIOS.map(({ truth }) => [truth.id, truth]));
    for (const { truth } of ALL_SCENARIOS) {
      const { machine, hours_every_min } = plans.get(truth.id)!;
      expect([truth.machine, truth.hours_every_min]).toEqual([machine, hours_every_min]);
    }
  });

  it('stand in the module of own/ by whose code their results are kept', async () => {
    for (const scenario of ALL_SCENARIOS) {
      const module = await import(`../../tools/score/own/${scenario.code}.ts`);
      const there = Object.values(module).flat() as Scenario[];
      // Short ones may be a long one with fewer rows.
      expect(
        there.map((s) => s.run),
        scenario.id,
      ).toContain(scenario.run);
      expect(there.map((s) => s.truth)).toContain(scenario.truth);
    }
  });

  it('cover what is asked for', () => {
    const asked = ['nominal', 'week', 'standing', 'faults', 'meter-step', 'gap'];
    const more = ['scans', 'restart', 'leak', 'settled'];
    const levels = ['channel-5', 'channel-10', 'channel-22'];
    const transfers = ['transfer-70', 'transfer-50', 'transfer-16'];
    const ids = SCENARIOS.map((s) => s.id);
    expect(ids).toEqual(expect.arrayContaining([...asked, ...more, ...levels, ...transfers]));
    expect(QUICK.length).toBeGreaterThan(3);
  });
});
