import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { rounded } from '../../../src/core/watch/indicators/view.js';
import { learningWords, normalWords, sideOf } from '../../../src/core/watch/side.js';

const at = (value: number | null, score = 0, healthy: number | null = 1, limit = 1.3) => ({
  ...{ value, healthy, limit, score },
});

describe('what is said of a value that is not decided', () => {
  it('calls healthy only what is nearer to it than to the limit, with a test that is silent', () => {
    expect(sideOf(at(1.1))).toBe('healthy');
    expect(sideOf(at(0.4))).toBe('healthy');
    expect(sideOf(at(1.2))).toBe('open');
    expect(sideOf(at(1.1, 0.3))).toBe('open');
    expect(sideOf(at(1.31))).toBe('beyond');
    // A limit below the healthy value.
    expect(sideOf(at(0.95, 0, 1, 0.7))).toBe('healthy');
    expect(sideOf(at(0.6, 0, 1, 0.7))).toBe('beyond');
  });

  it('goes by the test where there are no figures', () => {
    expect(sideOf(at(null))).toBe('healthy');
    expect(sideOf(at(null, 0.5))).toBe('open');
    expect(sideOf(at(2, 0, null))).toBe('healthy');
  });

  it('says how far the decision is, and that a limit is passed', () => {
    expect(normalWords(at(1.05), 'as steep as ever')).toBe('as steep as ever');
    expect(normalWords(at(1.2, 0.4), 'as steep as ever')).toBe(
      'within its limit, but not decided yet (40 % of a decision)',
    );
    expect(normalWords(at(1.57, 0.5), 'as steep as ever')).toBe(
      'at its limit or beyond, not decided yet (50 % of a decision)',
    );
    expect(learningWords(at(1.05))).toBe('');
    expect(learningWords(at(1.5, 0.2))).toMatch(/ at the limit or beyond already: 20 %/);
  });

  it('never calls healthy what is beyond the limit, on whichever side that is', () => {
    const number = fc.double({ min: -5, max: 5, noNaN: true });
    fc.assert(
      fc.property(number, number, number, (value, healthy, limit) => {
        fc.pre(limit !== healthy);
        const beyond = limit > healthy ? value >= limit : value <= limit;
        expect(sideOf(at(value, 0, healthy, limit)) === 'beyond').toBe(beyond);
      }),
      { seed: 5, numRuns: 300 },
    );
  });

  it('rounds to one decimal without a signed zero', () => {
    expect([-0.04, 0.04, -0.06, 12.34].map(rounded)).toEqual(['0.0', '0.0', '-0.1', '12.3']);
  });
});
