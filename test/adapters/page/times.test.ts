import { describe, expect, it } from 'vitest';
import { clockIn, spanWords } from '../../../src/adapters/page/trader/times.js';

describe('a span in words', () => {
  const words = (from: string, to: string) => spanWords(from, to, (time) => clockIn(null, time));

  it('is from when to when', () => {
    expect(words('2026-01-31T07:00:00Z', '2026-01-31T07:20:00Z')).toBe('07:00 to 07:20');
  });

  it('is told in seconds where both are within one minute', () => {
    expect(words('2026-01-31T07:00:00Z', '2026-01-31T07:00:20Z')).toBe('07:00 for 20 s');
  });
});
