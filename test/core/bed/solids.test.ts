import { describe, expect, it } from 'vitest';
import {
  SOLID_NAMES,
  solidByName,
  solidFromPolynomial,
  solidFromTable,
} from '../../../src/core/bed/solids.js';
import { lowTemperatureForm } from '../../../src/core/bed/solidsLowTemperature.js';
import { integrate } from '../../support/quadrature.js';

const facts = { name: 'rock', density_kg_m3: 2600, conductivity_W_mK: 2.5, emissivity: 0.85 };

describe.each(SOLID_NAMES)('%s', (name) => {
  const solid = solidByName(name);
  const [low, high] = solid.range_K;

  it('has the integral of its heat capacity as enthalpy, below, within and above its data', () => {
    for (const [a, b] of [
      [60, low],
      [low, high],
      [high, high + 300],
    ] as const) {
      const rise = solid.enthalpy(b) - solid.enthalpy(a);
      // Panels end at the points of the table (10 K apart), so that Gauss is exact for it too.
      const panels = Math.round((b - a) / 10);
      const sum = integrate((T) => solid.heatCapacity(T), a, b, panels);
      expect(Math.abs(rise / sum - 1)).toBeLessThan(1e-11);
    }
  });

  it('is finite, above 0 and continuous from 20 to 2000 K, and grows below its data', () => {
    for (let T = 20; T <= 2000; T += 1) {
      expect(solid.heatCapacity(T)).toBeGreaterThan(0);
      expect(solid.conductivity(T)).toBeGreaterThan(0);
      expect(Math.abs(solid.heatCapacity(T + 1e-9) / solid.heatCapacity(T) - 1)).toBeLessThan(1e-9);
      if (T < low - 1) {
        expect(solid.heatCapacity(T + 1)).toBeGreaterThanOrEqual(solid.heatCapacity(T));
      }
    }
    for (const end of solid.range_K) {
      const step = solid.heatCapacity(end * (1 + 1e-13)) / solid.heatCapacity(end * (1 - 1e-13));
      expect(Math.abs(step - 1)).toBeLessThan(1e-11);
      const jump = solid.enthalpy(end * (1 + 1e-13)) - solid.enthalpy(end * (1 - 1e-13));
      expect(Math.abs(jump)).toBeLessThan(1e-6);
    }
  });

  it('names where its data come from', () => {
    expect(solid.source).toMatch(/\d{4}|USGS|NREL/);
  });
});

describe('continuation below the fit', () => {
  it('meets value and slope of the fit where the slope is one that minerals have', () => {
    for (const shape of ['silicate', 'close_packed_oxide'] as const) {
      const form = lowTemperatureForm(shape, 298.15, 750, 1.7);
      expect(form.slopeContinuous).toBe(true);
      expect(form.heatCapacity(298.15)).toBeCloseTo(750, 9);
      const h = 0.01;
      const slope = (form.heatCapacity(298.15 + h) - form.heatCapacity(298.15 - h)) / (2 * h);
      // Central difference: error h^2/6 times a third derivative of about c/T^3.
      expect(slope).toBeCloseTo(1.7, 8);
    }
  });

  it('holds a slope that no mineral has to the band, and keeps the value', () => {
    for (const slope of [0, 3]) {
      const form = lowTemperatureForm('silicate', 298.15, 750, slope);
      expect(form.slopeContinuous).toBe(false);
      expect(form.heatCapacity(298.15)).toBeCloseTo(750, 9);
      const ratio = form.heatCapacity(123.15) / 750;
      expect(ratio).toBeGreaterThan(0.43);
      expect(ratio).toBeLessThan(0.51);
    }
  });

  it('tends to 0 with the temperature and never turns NaN', () => {
    const form = lowTemperatureForm('silicate', 298.15, 750, 1.7);
    expect(form.heatCapacity(1)).toBeLessThan(1);
    expect(form.heatCapacity(1e-6)).toBe(0);
    expect(form.enthalpy(1e-6)).toBe(0);
  });
});

describe('solids of the configuration', () => {
  it('takes a polynomial in kelvin or in degC', () => {
    const kelvin = solidFromPolynomial({ ...facts, coefficients: [600, 0.5], range_K: [250, 900] });
    const celsius = solidFromPolynomial({
      ...facts,
      coefficients: [600 + 0.5 * 273.15, 0.5],
      zero_K: 273.15,
      range_K: [250, 900],
    });
    expect(celsius.heatCapacity(500)).toBeCloseTo(kelvin.heatCapacity(500), 9);
    expect(celsius.enthalpy(800) - celsius.enthalpy(300)).toBeCloseTo(
      kelvin.enthalpy(800) - kelvin.enthalpy(300),
      6,
    );
  });

  it('keeps the end values of given data unless a shape is asked for', () => {
    const given = solidFromPolynomial({ ...facts, coefficients: [600, 0.5], range_K: [298, 900] });
    expect(given.heatCapacity(123)).toBe(given.heatCapacity(298));
    expect(given.heatCapacity(1500)).toBe(given.heatCapacity(900));
    const shaped = solidFromPolynomial({
      ...facts,
      coefficients: [600, 0.5],
      range_K: [298, 900],
      below: 'silicate',
    });
    expect(shaped.heatCapacity(123)).toBeLessThan(0.6 * given.heatCapacity(298));
  });

  it('runs straight between the points of a table', () => {
    const solid = solidFromTable({
      ...facts,
      temperatures_K: [300, 400, 600],
      heatCapacities_J_kgK: [700, 800, 900],
    });
    expect(solid.heatCapacity(350)).toBe(750);
    expect(solid.heatCapacity(500)).toBe(850);
    expect(solid.heatCapacity(600)).toBe(900);
    // Trapezia: 100 * 750 + 200 * 850.
    expect(solid.enthalpy(600) - solid.enthalpy(300)).toBe(245000);
    expect(solid.enthalpy(700) - solid.enthalpy(600)).toBe(90000);
    expect(solid.enthalpy(300) - solid.enthalpy(200)).toBe(70000);
  });

  it('refuses what cannot be, naming argument and value', () => {
    const table = { ...facts, temperatures_K: [300, 400], heatCapacities_J_kgK: [700, 800] };
    expect(() => solidFromTable({ ...table, temperatures_K: [400, 300] })).toThrow(
      /temperatures_K must ascend, got 400 before 300/,
    );
    expect(() => solidFromTable({ ...table, heatCapacities_J_kgK: [700] })).toThrow(/got 1/);
    expect(() => solidFromTable({ ...table, heatCapacities_J_kgK: [700, -1] })).toThrow(/got -1/);
    expect(() => solidFromTable({ ...table, density_kg_m3: 0 })).toThrow(/density_kg_m3.*got 0/);
    expect(() => solidFromTable({ ...table, emissivity: 1.2 })).toThrow(/emissivity.*got 1.2/);
    const polynomial = { ...facts, coefficients: [600, 0.5], range_K: [298, 900] as const };
    expect(() => solidFromPolynomial({ ...polynomial, coefficients: [100, -0.2] })).toThrow(
      /heat capacity at .* K must be/,
    );
    expect(() => solidFromPolynomial({ ...polynomial, range_K: [900, 298] })).toThrow(/range_K/);
    expect(() => solidFromPolynomial({ ...polynomial, inverse_square: 1, zero_K: 273.15 })).toThrow(
      /zero_K .* got 273.15/,
    );
    expect(() => solidByName('kryptonite')).toThrow(/granite.*got kryptonite/);
  });
});
