import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type Known,
  NEWS_EVERY_S,
  newsOf,
  startNews,
} from '../../../../src/core/watch/indicators/news.js';

const SIGMA = 0.5;

/** A scalar Gauss-Markov filter of its own, stepped an hour at a time; prior mean 0. */
function step(now: Known, decay: number, measured?: { value: number; sigma: number }): Known {
  const value = now.value * decay;
  const variance = (now.sigma * decay) ** 2 + (1 - decay * decay) * SIGMA ** 2;
  if (measured === undefined) return { value, sigma: Math.sqrt(variance) };
  const gain = variance / (variance + measured.sigma ** 2);
  return {
    value: value + gain * (measured.value - value),
    sigma: Math.sqrt((1 - gain) * variance),
  };
}

const scanOf = (decay: number) => ({
  walk: (1 - decay * decay) * SIGMA ** 2,
  decay,
  dt_s: NEWS_EVERY_S,
  flowing: true,
  sound: true,
});

describe('what is new in a figure that comes back to its prior by itself', () => {
  it('is nothing, however long it does', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -2, max: 2, noNaN: true }),
        fc.double({ min: 0.05, max: 0.49, noNaN: true }),
        fc.double({ min: 0.7, max: 0.999, noNaN: true }),
        (value, sigma, decay) => {
          const state = startNews();
          let now: Known = { value, sigma };
          newsOf(state, () => now, scanOf(decay));
          for (let hour = 0; hour < 300; hour++) {
            now = step(now, decay);
            expect(newsOf(state, () => now, scanOf(decay))).toBeNull();
          }
        },
      ),
      { numRuns: 30 },
    );
  });

  it('is the measurement that it took in, also after hours without one', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -2, max: 2, noNaN: true }),
        fc.integer({ min: 0, max: 200 }),
        fc.double({ min: 0.9, max: 0.999, noNaN: true }),
        fc.record({
          value: fc.double({ min: -2, max: 2, noNaN: true }),
          sigma: fc.double({ min: 0.05, max: 0.5, noNaN: true }),
        }),
        (value, waits, decay, measured) => {
          const state = startNews();
          let now: Known = { value, sigma: 0.2 };
          newsOf(state, () => now, scanOf(decay));
          for (let hour = 0; hour < waits; hour++) {
            now = step(now, decay);
            newsOf(state, () => now, scanOf(decay));
          }
          now = step(now, decay, measured);
          const news = newsOf(state, () => now, scanOf(decay));
          expect(news!.value).toBeCloseTo(measured.value, 6);
          expect(news!.sigma).toBeCloseTo(measured.sigma, 6);
        },
      ),
      { numRuns: 50 },
    );
  });
});
