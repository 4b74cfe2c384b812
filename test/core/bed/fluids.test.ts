import { describe, expect, it } from 'vitest';
import { FLUID_NAMES, fluidByName, gasAtPressure, liquidOf } from '../../../src/core/bed/fluids.js';
import { integrate } from '../../support/quadrature.js';

const GASES = ['air', 'nitrogen', 'argon'];
const FLUIDS = [
  ...FLUID_NAMES.map(fluidByName),
  ...GASES.map((name) => gasAtPressure(name, 10.5e5)),
  gasAtPressure('argon', 101325),
];

describe.each(FLUIDS)('$name ($source)', (fluid) => {
  // Gauss with eight points is exact to degree 15; panels end at the kinks of 105 and 900 K.
  it.each([
    [60, 105],
    [105, 300],
    [300, 900],
    [900, 1200],
  ])('has the integral of its heat capacity from %d to %d K as enthalpy', (a, b) => {
    const rise = fluid.enthalpy(b) - fluid.enthalpy(a);
    expect(rise / integrate((T) => fluid.heatCapacity(T), a, b, 32) - 1).toBeCloseTo(0, 12);
    if (fluid.entropy) {
      const gain = fluid.entropy(b) - fluid.entropy(a);
      const sum = integrate((T) => fluid.heatCapacity(T) / T, a, b, 32);
      expect(gain / sum - 1).toBeCloseTo(0, 11);
    }
  });

  it('is finite and above 0 from 20 K to 2000 K and continuous at the ends of its range', () => {
    for (let T = 20; T <= 2000; T += 7.3) {
      for (const value of [
        fluid.heatCapacity(T),
        fluid.viscosity_Pa_s(T),
        fluid.conductivity(T),
        fluid.density_kg_m3(T, 101325),
      ]) {
        expect(value).toBeGreaterThan(0);
        expect(value).toBeLessThan(1e5);
      }
    }
    for (const end of fluid.range_K.filter((T) => T > 0 && Number.isFinite(T))) {
      const below = end * (1 - 1e-12);
      const above = end * (1 + 1e-12);
      // A relative step of 2e-12 moves no property by more than its own logarithmic slope times that.
      for (const f of [fluid.heatCapacity, fluid.viscosity_Pa_s, fluid.conductivity]) {
        expect(f(above) / f(below) - 1).toBeCloseTo(0, 10);
      }
    }
  });
});

describe('named fluids', () => {
  it('continues transport beyond the fit with the slope it has there', () => {
    for (const name of GASES) {
      const gas = fluidByName(name);
      for (const end of gas.range_K) {
        for (const f of [gas.viscosity_Pa_s, gas.conductivity]) {
          const h = 1e-4 * end;
          const left = (f(end) - f(end - h)) / h;
          const right = (f(end + h) - f(end)) / h;
          // One-sided differences differ by h times the second derivative, f''/f' < 2/T here.
          expect(right / left - 1).toBeGreaterThan(-2e-4);
          expect(right / left - 1).toBeLessThan(2e-4);
        }
      }
    }
  });

  it('obeys the ideal-gas law and, for argon, cp = 2.5 R to the last bit', () => {
    for (const name of GASES) {
      const gas = fluidByName(name);
      expect(gas.density_kg_m3(300, 2e5) * gas.gasConstant_J_kgK * 300).toBeCloseTo(2e5, 8);
    }
    const argon = fluidByName('argon');
    expect(argon.heatCapacity(450)).toBe(2.5 * argon.gasConstant_J_kgK);
  });

  it('tends to the ideal gas as the pressure vanishes', () => {
    for (const name of GASES) {
      const ideal = fluidByName(name);
      const thin = gasAtPressure(name, 1);
      expect(thin.heatCapacity(150) / ideal.heatCapacity(150) - 1).toBeCloseTo(0, 6);
      expect(thin.density_kg_m3(150, 1) / ideal.density_kg_m3(150, 1) - 1).toBeCloseTo(0, 6);
    }
  });

  it('leaves a liquid as it is at any pressure', () => {
    expect(gasAtPressure('solar_salt', 5e5)).toBe(fluidByName('solar_salt'));
  });

  it('names an unknown fluid, an impossible pressure and an impossible liquid', () => {
    expect(() => fluidByName('helium')).toThrow(RangeError);
    expect(() => fluidByName('helium')).toThrow(/air, nitrogen, argon, solar_salt, got helium/);
    expect(() => gasAtPressure('air', -1)).toThrow(/pressure_Pa .* got -1/);
    expect(() =>
      liquidOf({
        name: 'oil',
        density_kg_m3: 900,
        heat_capacity_J_kgK: 0,
        viscosity_Pa_s: 1e-3,
        conductivity_W_mK: 0.1,
      }),
    ).toThrow(/heat_capacity_J_kgK .* got 0/);
  });
});
