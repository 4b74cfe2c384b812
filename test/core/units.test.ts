import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { differenceToSi, dimensionOf, fromSi, RAW_UNITS, toSi } from '../../src/core/units.js';

describe('units at the edges', () => {
  it.each([
    ['degC', 0, 273.15],
    ['degC', -160, 113.15],
    ['K', 300, 300],
    ['degF', 32, 273.15],
    ['degF', 212, 373.15],
    ['kg/s', 2.5, 2.5],
    ['g/s', 3.4, 0.0034],
    ['t/h', 3.6, 1],
    ['kg/h', 7200, 2],
    ['kg/min', 90, 1.5],
    ['kW', 1.5, 1500],
    ['MW', 2, 2e6],
    ['bar', 10.5, 1.05e6],
    ['mbar', 1013.25, 101325],
    ['hPa', 1013.25, 101325],
    ['kPa', 101.325, 101325],
    ['MPa', 1, 1e6],
    ['mV', 20.644, 20.644],
    ['%', 40, 0.4],
  ])('%s: %d becomes %d', (unit, raw, si) => {
    // A sum and a product, each rounded once: two units in the last place.
    expect(Math.abs(toSi(unit, raw) - si)).toBeLessThanOrEqual(2 * Math.abs(si) * Number.EPSILON);
  });

  it('comes back from SI', () => {
    fc.assert(
      fc.property(
        fc.constantFrom(...RAW_UNITS),
        fc.double({ min: -1e4, max: 1e4, noNaN: true }),
        (unit, raw) => {
          const back = fromSi(unit, toSi(unit, raw));
          // Four roundings at a magnitude of at most |raw| + the largest offset.
          expect(Math.abs(back - raw)).toBeLessThanOrEqual(
            4 * (Math.abs(raw) + 460) * Number.EPSILON,
          );
        },
      ),
      { seed: 1 },
    );
  });

  it('keeps a missing value missing', () => {
    for (const unit of RAW_UNITS) expect(toSi(unit, Number.NaN)).toBeNaN();
  });

  it('takes a deadband without the zero point', () => {
    expect(differenceToSi('degC', 0.5)).toBe(0.5);
    expect(differenceToSi('kPa', 2)).toBe(2000);
  });

  it('names the unknown unit and the known ones', () => {
    expect(() => toSi('psi', 1)).toThrow(RangeError);
    expect(() => dimensionOf('degc')).toThrow(/degC.*"degc"/);
    expect(() => toSi('toString', 1)).toThrow(RangeError);
  });
});
