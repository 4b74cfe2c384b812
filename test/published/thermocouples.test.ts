import { describe, expect, it } from 'vitest';
import {
  celsiusFromCompensated,
  millivoltFromCelsius,
  seebeck_mV_K,
  THERMOCOUPLE_TYPES,
} from '../../src/core/thermocouple/its90.js';
import { THERMOCOUPLE_TABLES } from '../../src/core/thermocouple/its90Tables.js';
import { fixtureRows, numberIn } from '../support/table.js';

/** NIST Monograph 175 (1993), NIST SRD 60; the same functions are in IEC 60584-1. */
describe('ITS-90 tables', () => {
  it.each(THERMOCOUPLE_TYPES)('type %s has every coefficient of the reference function', (type) => {
    const rows = fixtureRows('thermocouple_its90_reference_coefficients.csv');
    const mine = THERMOCOUPLE_TABLES[type].reference.flatMap((piece) => [
      ...piece.c.map((value, i) => [piece.from, piece.to, String(i), value]),
      ...(piece.a ?? []).map((value, i) => [piece.from, piece.to, `a${i}`, value]),
    ]);
    const published = rows
      .filter((row) => row.type === type)
      .map((row) => [
        numberIn(row, 'T_min_C'),
        numberIn(row, 'T_max_C'),
        row.term,
        numberIn(row, 'value'),
      ]);
    expect(mine).toEqual(published);
  });

  it.each(THERMOCOUPLE_TYPES)('type %s has every coefficient of the inverse', (type) => {
    const rows = fixtureRows('thermocouple_its90_inverse_coefficients.csv');
    const mine = THERMOCOUPLE_TABLES[type].inverse.flatMap((piece) =>
      piece.d.map((value, i) => [piece.from, piece.to, i, value]),
    );
    const published = rows
      .filter((row) => row.type === type)
      .map((row) => ['E_min_mV', 'E_max_mV', 'i', 'd_i'].map((column) => numberIn(row, column)));
    expect(mine).toEqual(published);
  });
});

describe('ITS-90 check values', () => {
  const rows = fixtureRows('thermocouple_its90_check_values.csv');

  it.each(THERMOCOUPLE_TYPES)('type %s meets voltage and slope of every row, and back', (type) => {
    let checked = 0;
    for (const row of rows) {
      const T = numberIn(row, 'T_C');
      const E = numberIn(row, `E_${type}_mV`);
      if (Number.isNaN(E)) continue;
      checked += 1;
      // Printed to 1e-5 mV and 1e-3 uV/K.
      expect(Math.abs(millivoltFromCelsius(type, T) - E)).toBeLessThanOrEqual(0.501e-5);
      const slope = numberIn(row, `S_${type}_uV_K`);
      if (!Number.isNaN(slope)) {
        expect(Math.abs(1000 * seebeck_mV_K(type, T) - slope)).toBeLessThanOrEqual(0.501e-3);
      }
      const back = celsiusFromCompensated(type, E) as number;
      expect(Math.abs(back - T)).toBeLessThan(0.51e-5 / seebeck_mV_K(type, T));
    }
    expect(checked).toBeGreaterThan(15);
  });

  // NIST Monograph 175, printed to 1e-3 mV.
  const printed = {
    K: [
      [-200, -5.891],
      [-160, -5.141],
      [-100, -3.554],
      [100, 4.096],
      [500, 20.644],
      [600, 24.905],
    ],
    N: [
      [-200, -3.99],
      [-160, -3.491],
      [500, 16.748],
      [600, 20.613],
    ],
    T: [
      [-200, -5.603],
      [-160, -4.865],
      [100, 4.279],
      [400, 20.872],
    ],
    J: [
      [-200, -7.89],
      [500, 27.393],
    ],
  } as const;

  it.each(THERMOCOUPLE_TYPES)('type %s meets the printed tables', (type) => {
    for (const [T, E] of printed[type]) {
      expect(Math.abs(millivoltFromCelsius(type, T) - E)).toBeLessThanOrEqual(0.501e-3);
    }
  });

  it('type K would miss -200 degC by 43 mV with the wrong sign on c5 of a public copy', () => {
    const c5 = THERMOCOUPLE_TABLES.K.reference[0]?.c[5] as number;
    expect(c5).toBeLessThan(0);
    const wrong = millivoltFromCelsius('K', -200) - 2 * c5 * (-200) ** 5;
    expect(Math.abs(wrong - -5.891)).toBeGreaterThan(40);
  });
});
