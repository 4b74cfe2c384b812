import { describe, expect, it } from 'vitest';
import { balanceText } from '../../src/commands/balance/text.js';
import { balanceOf } from '../../src/core/plan/balance.js';
import { contextOf } from '../core/plan/units.js';
import { unitOf } from '../core/track/plants.js';

const head = { unit: 'two', time: '2026-01-31T06:00:00Z', age_s: 4, quality: 'good' } as const;
const context = contextOf(unitOf(), { hot: 0.6, cold: 0.4, width: 0.1 });
const balance = balanceOf(context, { charge_J: 0.3 * 3.6e9 });

describe('the balance of two stores in words', () => {
  const mismatch = balance.mismatch!;
  const first = mismatch.ends_first!;
  const line = (of: typeof balance) =>
    balanceText({ ...head, ...of })
      .split('\n')
      .find((one) => one.startsWith('Each run alone'));
  const endingBy = (ends_by: typeof mismatch.together.ends_by) =>
    line({ ...balance, mismatch: { ...mismatch, together: { ...mismatch.together, ends_by } } });

  it('says which store is empty first, and by how much', () => {
    const hours = Math.abs(mismatch.mismatch_h).toFixed(2);
    expect(line(balance)).toContain(`store ${first} is empty first, the other ${hours} h later`);
  });

  it('does not contradict what ends both together', () => {
    const own = mismatch.alone[first]!.ends_by;
    expect(endingBy(own)).toMatch(/ h later\.$/);
    expect(own).not.toBe('flow');
    expect(endingBy('flow')).toMatch(/ h later; together they end by flow, /);
  });
});
