import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  celsiusFromMillivolt,
  millivoltFromCelsius,
  seebeck_mV_K,
  THERMOCOUPLE_TYPES,
} from '../../../src/core/thermocouple/its90.js';
import { celsiusReversed } from '../../../src/core/thermocouple/reversed.js';

/** Seeded, so that a run can be repeated. */
fc.configureGlobal({ seed: 60584 });

const celsius = (min: number, max: number) => fc.double({ min, max, noNaN: true });

describe('a thermocouple whose wires are reversed', () => {
  it('reads, of type K against ice, at 101 degC what the table lists for -120 degC', () => {
    // Both are 4.138 mV in the tables, rounded to 0.001 mV each.
    const rounding = (2 * 0.0005) / seebeck_mV_K('K', -120);
    expect(Math.abs((celsiusReversed('K', 101, 0) as number) + 120)).toBeLessThan(rounding);
  });

  describe.each(THERMOCOUPLE_TYPES)('of type %s', (type) => {
    it('is the reading of the same voltage with its sign changed', () => {
      fc.assert(
        fc.property(celsius(-200, 150), celsius(-20, 60), (T, junction) => {
          const terminals = millivoltFromCelsius(type, T) - millivoltFromCelsius(type, junction);
          const read = celsiusFromMillivolt(type, -terminals, junction);
          expect(celsiusReversed(type, T, junction)).toBe(read);
        }),
      );
    });

    it('gives back what it measures from what it reads', () => {
      fc.assert(
        fc.property(celsius(-150, 130), celsius(0, 50), (T, junction) => {
          const read = celsiusReversed(type, T, junction) as number;
          expect(celsiusReversed(type, read, junction)).toBeCloseTo(T, 6);
        }),
      );
    });

    it('stays where the junction is, moves against what it measures, and further below than above', () => {
      expect(celsiusReversed(type, 30, 30)).toBeCloseTo(30, 9);
      const near = celsiusReversed(type, 60, 30) as number;
      const far = celsiusReversed(type, 120, 30) as number;
      expect(near).toBeLessThan(0);
      expect(30 - far).toBeGreaterThan(120 - 30);
      expect(far).toBeLessThan(near);
    });

    it('has no reading in hot rock, since no voltage of its type lies so low', () => {
      expect(celsiusReversed(type, 350, 25)).toBe('below_range');
    });
  });

  it('gives a reason for what is no temperature of the type or the terminals', () => {
    expect(celsiusReversed('K', Number.NaN, 25)).toBe('not_a_number');
    expect(celsiusReversed('T', 600, 25)).toBe('not_a_number');
    expect(celsiusReversed('K', 100, Number.NaN)).toBe('not_a_number');
    expect(celsiusReversed('K', 100, 120)).toBe('cold_junction_out_of_range');
    expect(celsiusReversed('K', 100, -300)).toBe('cold_junction_out_of_range');
  });
});
