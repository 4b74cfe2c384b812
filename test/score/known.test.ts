import { describe, expect, it } from 'vitest';
import { figure } from '../../tools/score/figure.js';
import { KNOWN_MISSES, missesOf } from '../../tools/score/known.js';
import { QUICK } from '../../tools/score/scenarios.js';

const block = (...figures: ReturnType<typeof figure>[]) => [
  { scenario: 'quick-cycle', row: 'all-class', title: '', seeds: 2, figures },
];
const list = [{ row: 'quick-cycle all-class', figure: 'slow', reason: 'it is known', most: 3 }];

describe('a quick run', () => {
  it('fails by a goal for each run that is missed and not known', () => {
    const goal = { most: 1, each: true };
    expect(missesOf(block(figure('fast', 2, '', goal)), list).unknown).toHaveLength(1);
    expect(missesOf(block(figure('fast', 1, '', goal)), list).unknown).toEqual([]);
  });

  it('does not fail by a known miss, and says when it is one no longer', () => {
    const goal = { most: 1, each: true };
    const missed = missesOf(block(figure('  slow', 2, '', goal)), list);
    expect(missed).toMatchObject({ unknown: [], met: [] });
    expect(missed.known[0]).toContain('it is known');
    const met = missesOf(block(figure('  slow', 0, '', goal)), list);
    expect(met).toMatchObject({ unknown: [], known: [] });
    expect(met.met).toHaveLength(1);
  });

  it('fails by a known miss that has grown beyond what is known of it, or could not be had', () => {
    const goal = { most: 1, each: true };
    for (const value of [3.1, Number.POSITIVE_INFINITY, null]) {
      const { known, unknown } = missesOf(block(figure('slow', value, '', goal)), list);
      expect(known).toEqual([]);
      expect(unknown[0]).toContain('known up to 3');
    }
  });

  it('does not fail by a goal that only many runs together can keep', () => {
    expect(missesOf(block(figure('rms', 2, '', { most: 1 })), list).unknown).toEqual([]);
  });

  it('knows misses only of rows that it has', () => {
    const rows = QUICK.flatMap((s) => s.rows.map((r) => `${s.id} ${r.id}`));
    for (const { row } of KNOWN_MISSES) expect(rows).toContain(row);
  });
});
