import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { RecentReadings } from '../../../src/adapters/mqtt/recent.js';

const QUALITIES = ['good', 'uncertain', 'bad'] as const;

const reading = fc.record({
  unit: fc.constantFrom('u', 'v'),
  channel: fc.constantFrom('a', 'b', 'c'),
  time_ms: fc.integer({ min: 0, max: 400 }),
  value: fc.constantFrom(1, 0, -0, Number.NaN),
  quality: fc.constantFrom(...QUALITIES),
});

describe('the last readings', () => {
  it('never take news for a copy, and forget none of a channel’s last 64 nor of the last of all', () => {
    fc.assert(
      fc.property(
        fc.array(reading, { minLength: 200, maxLength: 1200 }),
        fc.integer({ min: 1, max: 500 }),
        (all, window) => {
          const recent = new RecentReadings(window);
          const kept: (typeof all)[number][] = [];
          const isSame = (a: (typeof all)[number], b: (typeof all)[number]) =>
            a.unit === b.unit &&
            a.channel === b.channel &&
            a.time_ms === b.time_ms &&
            a.quality === b.quality &&
            Object.is(a.value, b.value);
          for (const one of all) {
            const isCopy = recent.seen(one);
            const own = kept.filter(({ unit, channel }) => {
              return unit === one.unit && channel === one.channel;
            });
            const near = [...own.slice(-64), ...kept.slice(-window)];
            if (near.some((other) => isSame(one, other))) expect(isCopy).toBe(true);
            if (!kept.some((other) => isSame(one, other))) expect(isCopy).toBe(false);
            if (!isCopy) kept.push(one);
          }
        },
      ),
      { numRuns: 30 },
    );
  });
});
