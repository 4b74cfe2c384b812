import { describe, expect, it } from 'vitest';
import { beyondLimits, inZone } from '../../../src/adapters/page/trader/scheduleLimits.js';
import { readSchedule } from '../../../src/adapters/page/trader/scheduleText.js';

const ZONE = 'Europe/Berlin';
const NOW_MS = Date.parse('2026-01-31T11:03:20Z');
const ESTIMATE_MS = NOW_MS - 20_000;
const told = (text: string) => {
  const { blocks, faults } = readSchedule(text, '2026-01-31', '12:03');
  expect(faults).toEqual([]);
  return beyondLimits(blocks, ZONE, NOW_MS, ESTIMATE_MS).map(({ words }) => words);
};

describe('what of a schedule the server would refuse', () => {
  it('is what begins before now, whatever clock it was typed by', () => {
    expect(told('2026-01-31 12:03, 2026-01-31 14:00, 1')).toEqual([
      'it begins at 2026-01-31 12:03, which is past',
    ]);
    expect(told('2026-01-31T11:03Z, 2026-01-31T12:00Z, 1')).toEqual([
      'it begins at 2026-01-31 12:03, which is past',
    ]);
    expect(told('2026-01-31 12:04, 2026-01-31 14:00, 1')).toEqual([]);
    expect(told('2026-01-31T11:04Z, 2026-01-31T12:00Z, 1')).toEqual([]);
  });

  it('is what ends more than a week after the estimate, or with an offset before it begins', () => {
    expect(told('2026-02-07 10:00, 2026-02-07 12:03, 1')).toEqual([]);
    expect(told('2026-02-07 10:00, 2026-02-07 12:04, 1')).toEqual([
      'it ends at 2026-02-07 12:04, more than 7 days ahead',
    ]);
    expect(told('2026-01-31T14:00+01:00, 2026-01-31T13:00Z, 1')).toEqual([
      'it ends at 2026-01-31 14:00, not after it begins',
    ]);
  });

  it('is more rows, or more power, than it takes', () => {
    const rows = Array.from({ length: 401 }, (_, i) => {
      const at = (n: number) => new Date(NOW_MS + (n + 1) * 900_000).toISOString().slice(0, 16);
      return `${at(i)}Z,${at(i + 1)}Z,1`;
    });
    expect(told(rows.join('\n'))).toEqual(['401 blocks; 400 can be checked at once']);
    expect(told('13:00, 14:00, 10001')).toEqual(['a power is 10000 MW at most']);
  });

  it('tells times typed with an offset by the clocks of the connection', () => {
    expect(inZone(ZONE, '2026-01-31T05:00Z')).toBe('2026-01-31 06:00');
    expect(inZone(ZONE, '2026-01-31T05:00+03:00')).toBe('2026-01-31 03:00');
    expect(inZone(ZONE, '2026-01-31T05:00')).toBe('2026-01-31 05:00');
  });
});
