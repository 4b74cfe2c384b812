import { describe, expect, it } from 'vitest';
import {
  ageText,
  DASH,
  fixed,
  hoursText,
  parted,
  percent,
  power,
  withSigma,
} from '../../../src/adapters/page/lib/format.js';
import { isSamePower, roundHours, typedPower } from '../../../src/adapters/page/lib/powers.js';

describe('figures in words', () => {
  it('shows a missing figure as a dash, never as zero', () => {
    for (const missing of [null, undefined, Number.NaN, Number.POSITIVE_INFINITY]) {
      expect(fixed(missing, 1)).toBe(DASH);
      expect(hoursText(missing)).toBe(DASH);
    }
    expect(percent(null)).toBe(DASH);
    expect(fixed(0, 1)).toBe('0.0');
  });

  it('writes a minus sign, and none before a zero', () => {
    expect(fixed(-155.25, 1)).toBe('−155.3');
    expect(fixed(-0.004, 2)).toBe('0.00');
  });

  it.each([
    [0, '0 min'],
    [0.5, '30 min'],
    // 59.7 min rounds to a full hour, not to 60 min.
    [0.995, '1 h 00 min'],
    [4.95, '4 h 57 min'],
    [120, '120 h 00 min'],
  ])('says %d h as %s', (hours, words) => {
    expect(hoursText(hours)).toBe(words);
  });

  it.each([
    [0, '0 s'],
    [59.9, '59 s'],
    [60, '1 min 00 s'],
    [3599, '59 min 59 s'],
    [3600, '1 h 00 min'],
    [47.99 * 3600, '47 h 59 min'],
    [52 * 3600, '2 d 4 h'],
    [-0.2, '0 s'],
  ])('says an age of %d s as %s, never more than it is', (age, words) => {
    expect(ageText(age)).toBe(words);
  });

  it('never says that a figure is certain', () => {
    expect(withSigma(0.989, 0.0045, 2)).toBe('0.99 ± 0.01');
    expect(withSigma(0.989, 0.005, 2)).toBe('0.99 ± 0.01');
    expect(withSigma(0.989, null, 2)).toBe('0.99');
    expect(withSigma(null, 0.1, 2)).toBe(DASH);
  });

  it('writes a message with the signs of the page, and leaves its dates alone', () => {
    expect(parted('Reads -186.4 degC since 2026-01-31. Look at it.')).toEqual([
      'Reads −186.4 °C since 2026-01-31.',
      'Look at it.',
    ]);
  });

  it('says a power no longer than needed', () => {
    expect([power(2), power(1.85), power(0.1 + 0.2)]).toEqual(['2', '1.85', '0.3']);
  });
});

describe('a typed power', () => {
  it.each([
    ['1.8', 1.8],
    [' 1,8 ', 1.8],
    ['.5', 0.5],
    ['2', 2],
  ])('%j is %d MW', (text, value) => {
    expect(typedPower(text)).toBe(value);
  });

  it.each(['', '0', '-1', '1.2,1.8', '1e3', 'two', '0x10', '1 2'])('%j is none', (text) => {
    expect(typedPower(text)).toBeNull();
  });
});

it('ends the bars at a round figure that holds the longest', () => {
  expect([0.5, 1, 7.2, 9.89, 96.1, 400].map(roundHours)).toEqual([1, 1, 8, 12, 168, 504]);
});

it('takes a reading for a configured power where it is within two hundredths of it', () => {
  expect([1.77, 1.8, 1.83].map((read) => isSamePower(read, 1.8))).toEqual([true, true, true]);
  expect([1.7, 1.85].map((read) => isSamePower(read, 1.8))).toEqual([false, false]);
});

describe('a message', () => {
  it('is its first sentence and what follows, whatever points stand in it', () => {
    const first = 'Store hot: its front is 1.62 +/- 0.1 times as wide (limit 1.5, see no. 3).';
    const rest = 'It began after 06:00 UTC. The gas may find a channel.';
    expect(parted(`${first} ${rest}`)).toEqual([first, rest]);
    expect(parted(first)).toEqual([first, '']);
    expect(parted('')).toEqual(['', '']);
  });
});
