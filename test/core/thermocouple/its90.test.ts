import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  celsiusFromCompensated,
  celsiusFromMillivolt,
  millivoltFromCelsius,
  seebeck_mV_K,
  THERMOCOUPLE_TYPES,
  type ThermocoupleType,
  thermocoupleRange_degC,
} from '../../../src/core/thermocouple/its90.js';
import { THERMOCOUPLE_TABLES } from '../../../src/core/thermocouple/its90Tables.js';

/** Seeded, so that a run can be repeated. */
fc.configureGlobal({ seed: 20020518 });

/**
 * Greatest rounding of a polynomial by Horner's rule, 2 n u sum |c_i T^i| with u = 2^-53 (Higham):
 * the terms of type T reach 1e4 mV near -270 degC and cancel.
 */
function hornerBound_mV(type: ThermocoupleType, T: number): number {
  const { reference } = THERMOCOUPLE_TABLES[type];
  const piece = reference.find((each) => T >= each.from && T <= each.to) ?? reference[0];
  const c = piece?.c ?? [];
  return 2 * c.length * 2 ** -53 * c.reduce((sum, ci, i) => sum + Math.abs(ci * T ** i), 0);
}

describe.each(THERMOCOUPLE_TYPES)('type %s', (type) => {
  const [low, high] = thermocoupleRange_degC(type);
  const celsius = (from: number, to: number) => fc.double({ min: from, max: to, noNaN: true });

  it('finds the temperature of a voltage as exactly as the polynomial can be summed', () => {
    fc.assert(
      fc.property(celsius(low, high), (T) => {
        const back = celsiusFromCompensated(type, millivoltFromCelsius(type, T)) as number;
        const rounding = (2 * hornerBound_mV(type, T)) / seebeck_mV_K(type, T);
        expect(Math.abs(back - T)).toBeLessThan(1e-9 + rounding);
      }),
      { numRuns: 500 },
    );
  });

  it('takes the junction into account exactly', () => {
    fc.assert(
      fc.property(celsius(-200, Math.min(high, 700)), celsius(-20, 60), (T, junction) => {
        const terminals = millivoltFromCelsius(type, T) - millivoltFromCelsius(type, junction);
        expect(celsiusFromMillivolt(type, terminals, junction)).toBeCloseTo(T, 8);
      }),
    );
  });

  it('grows with temperature, with the slope it states', () => {
    for (let T = low + 1; T < high - 1; T += 3.7) {
      const h = 0.01;
      if (Math.abs(T) < h) continue; // the pieces meet at 0 degC
      // Rounding 1e-11/(2 h) and truncation h^2/6 E''', with E''' below 1e-4 mV/K3, are each below 2e-9.
      const rise = millivoltFromCelsius(type, T + h) - millivoltFromCelsius(type, T - h);
      expect(rise).toBeGreaterThan(0);
      expect(Math.abs(rise / (2 * h) - seebeck_mV_K(type, T))).toBeLessThan(1e-8);
    }
  });

  it('has a reason for every voltage without a temperature', () => {
    expect(celsiusFromMillivolt(type, Number.NaN, 20)).toBe('not_a_number');
    expect(celsiusFromMillivolt(type, 1, Number.NaN)).toBe('not_a_number');
    expect(celsiusFromMillivolt(type, Number.POSITIVE_INFINITY, 20)).toBe('not_a_number');
    expect(celsiusFromMillivolt(type, millivoltFromCelsius(type, low) - 0.01, 0)).toBe(
      'below_range',
    );
    expect(celsiusFromMillivolt(type, millivoltFromCelsius(type, high) + 0.01, 0)).toBe(
      'above_range',
    );
    expect(celsiusFromMillivolt(type, 1, 150)).toBe('cold_junction_out_of_range');
    expect(celsiusFromMillivolt(type, 1, -80)).toBe('cold_junction_out_of_range');
    expect(() => millivoltFromCelsius(type, high + 1)).toThrow(RangeError);
    expect(() => millivoltFromCelsius(type, Number.NaN)).toThrow(/got NaN/);
  });
});
