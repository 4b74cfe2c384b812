import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parseTime } from '../../../src/adapters/recording/time.js';

describe('the time of a row', () => {
  it.each([
    ['1970-01-01T00:00:00Z', 0],
    ['1970-01-01T00:00:01.5Z', 1500],
    ['1970-01-01T01:00:00+01:00', 0],
    ['1970-01-01T01:00+0100', 0],
    ['1969-12-31T19:30:00-04:30', 0],
    ['1970-01-01 00:00:00z', 0],
    ['2024-02-29T12:00:00,250Z', Date.UTC(2024, 1, 29, 12, 0, 0, 250)],
    ['0', 0],
    ['30.0', 30_000],
    ['1740805200.0004', 1_740_805_200_000],
    ['1.5e3', 1_500_000],
    ['-60', -60_000],
  ])('%s is %d ms after 1970', (text, ms) => {
    expect(parseTime(text)).toBe(ms);
  });

  it.each([
    '',
    'noon',
    '2025-03-01T06:00:00',
    '2025-02-29T06:00:00Z',
    '2025-13-01T06:00:00Z',
    '2025-03-01T24:00:00Z',
    '2025-03-01',
    '01.03.2025 06:00',
    'Infinity',
    'NaN',
    '1e300',
  ])('%s is no time', (text) => {
    expect(parseTime(text)).toBeNaN();
  });

  it('reads every instant that a Date writes', () => {
    const date = fc.date({
      min: new Date('0000-01-01T00:00:00Z'),
      max: new Date('9999-12-31T23:59:59Z'),
      noInvalidDate: true,
    });
    fc.assert(
      fc.property(date, (one) => {
        expect(parseTime(one.toISOString())).toBe(one.getTime());
      }),
      { seed: 8601 },
    );
  });
});
