import { describe, expect, it } from 'vitest';
import { fluidByName, gasAtPressure } from '../../src/core/bed/fluids.js';
import { fixtureRows, numberIn } from '../support/table.js';

/**
 * CoolProp 8.0.0: air Lemmon 2000, nitrogen Span 2000, argon Tegeler 1999; transport Lemmon &
 * Jacobsen 2004. All rows of fixtures/gas_property_check_values_coolprop.csv.
 */
const rows = fixtureRows('gas_property_check_values_coolprop.csv').map((row) => ({
  gas: (row.gas as string).toLowerCase(),
  T: numberIn(row, 'T_K'),
  bar: numberIn(row, 'p_bar'),
  cp: numberIn(row, 'cp_J_kgK'),
  rho: numberIn(row, 'rho_kg_m3'),
  mu: numberIn(row, 'mu_Pa_s'),
  k: numberIn(row, 'k_W_mK'),
}));
const inFit = rows.filter((row) => row.T >= 105 && row.T <= 900);

/** The fits' own largest errors; the file rounds them to four decimals, hence half a unit more. */
const fitError = new Map(
  fixtureRows('gas_property_fits_105_900K.csv').map((row) => [
    `${(row.gas as string).toLowerCase()} ${row.property}`,
    numberIn(row, 'max_rel_err') + 0.5e-4,
  ]),
);
const errorOf = (gas: string, property: string) => fitError.get(`${gas} ${property}`) as number;

describe('gas fits', () => {
  it('are the coefficients of the table', () => {
    for (const row of fixtureRows('gas_property_fits_105_900K.csv')) {
      const gas = fluidByName((row.gas as string).toLowerCase());
      const c = (row.coefficients_c0_up as string).split(' ').map(Number);
      for (const T of [110, 300, 555, 890]) {
        const value = c.reduce((sum, ci, i) => sum + ci * (T / 1000) ** i, 0);
        const mine = {
          cp0_J_kgK: gas.heatCapacity(T),
          mu_uPa_s: 1e6 * gas.viscosity_Pa_s(T),
          k_mW_mK: 1e3 * gas.conductivity(T),
        }[row.property as string] as number;
        expect(Math.abs(mine / value - 1)).toBeLessThan(1e-13);
      }
    }
  });

  it('meet the published ideal-gas heat capacity, found by letting the pressure go to 0', () => {
    // cp is linear in p as long as the third virial coefficient is small: above 250 K it moves the
    // extrapolated value by less than 1e-4 (argon at 250 K: cp + 3.4 % at 10.5 bar, squared over ten).
    let checked = 0;
    for (const low of inFit.filter((row) => row.bar < 2 && row.T >= 250)) {
      const high = rows.find((row) => row.gas === low.gas && row.T === low.T && row.bar > 2);
      if (!high) continue;
      const cp0 = low.cp - ((high.cp - low.cp) * low.bar) / (high.bar - low.bar);
      const mine = fluidByName(low.gas).heatCapacity(low.T);
      expect(Math.abs(mine / cp0 - 1)).toBeLessThan(errorOf(low.gas, 'cp0_J_kgK') + 1e-4);
      checked += 1;
    }
    // 18 temperatures of three gases.
    expect(checked).toBe(54);
  });

  it('meet the published viscosity and conductivity at 1 atm within the error of the fit', () => {
    for (const row of inFit.filter((each) => each.bar < 2)) {
      const gas = fluidByName(row.gas);
      const mu = Math.abs(gas.viscosity_Pa_s(row.T) / row.mu - 1);
      const k = Math.abs(gas.conductivity(row.T) / row.k - 1);
      expect(mu).toBeLessThan(errorOf(row.gas, 'mu_uPa_s'));
      expect(k).toBeLessThan(errorOf(row.gas, 'k_mW_mK'));
    }
  });

  it('continue to 100 K by the power law within 0.3 %', () => {
    for (const row of rows.filter((each) => each.T === 100)) {
      const gas = fluidByName(row.gas);
      expect(Math.abs(gas.viscosity_Pa_s(100) / row.mu - 1)).toBeLessThan(0.003);
      expect(Math.abs(gas.conductivity(100) / row.k - 1)).toBeLessThan(0.003);
    }
  });
});

describe('pressure', () => {
  it('is what the ideal gas misses: the second virial coefficient halves every error', ({
    annotate,
  }) => {
    for (const row of inFit) {
      const ideal = fluidByName(row.gas).heatCapacity(row.T) / row.cp - 1;
      const real = gasAtPressure(row.gas, row.bar * 1e5).heatCapacity(row.T) / row.cp - 1;
      const fit = errorOf(row.gas, 'cp0_J_kgK');
      const where = `${row.gas} ${row.T} K ${row.bar} bar`;
      expect(Math.abs(real), where).toBeLessThan(fit + Math.abs(ideal) / 2);
      if (row.bar > 2 && row.T <= 323.15) {
        void annotate(
          `${row.gas} ${row.T} K 10.5 bar: cp of the ideal gas ${(100 * ideal).toFixed(2)} %, ` +
            `with the virial coefficient ${(100 * real).toFixed(2)} %`,
        );
      }
    }
  });

  it('is met within 0.5 % of cp and 0.2 % of density where the gas is within 5 % of ideal', () => {
    for (const row of inFit) {
      const gas = gasAtPressure(row.gas, row.bar * 1e5);
      const Z = (row.bar * 1e5) / (row.rho * gas.gasConstant_J_kgK * row.T);
      if (Math.abs(Z - 1) > 0.05) continue;
      const where = `${row.gas} ${row.T} K ${row.bar} bar`;
      expect(Math.abs(gas.heatCapacity(row.T) / row.cp - 1), where).toBeLessThan(0.005);
      const rho = gas.density_kg_m3(row.T, row.bar * 1e5);
      expect(Math.abs(rho / row.rho - 1), where).toBeLessThan(0.002);
    }
  });

  it('leaves the ideal-gas density within 0.1 % at 1 atm above 0 degC', () => {
    for (const row of inFit.filter((each) => each.bar < 2 && each.T >= 273)) {
      const rho = fluidByName(row.gas).density_kg_m3(row.T, row.bar * 1e5);
      expect(Math.abs(rho / row.rho - 1)).toBeLessThan(0.001);
    }
  });
});

describe('values named in the checks', () => {
  // CoolProp 8.0.0, to the digits given; cp of the real gas at 1 atm.
  it('argon at 300 K and 773.15 K, cp0 = 2.5 R/M', () => {
    const argon = gasAtPressure('argon', 101325);
    expect(fluidByName('argon').heatCapacity(300)).toBeCloseTo(520.333, 3);
    // The virial correction here is 1.2 J/kgK, good to a tenth.
    expect(Math.abs(argon.heatCapacity(300) - 521.54)).toBeLessThan(0.12);
    expect(Math.abs(argon.heatCapacity(773.15) - 520.47)).toBeLessThan(0.12);
    expect(argon.viscosity_Pa_s(300) / 2.2741e-5 - 1).toBeCloseTo(0, 3);
    expect(argon.conductivity(300) / 0.017837 - 1).toBeCloseTo(0, 3);
    expect(argon.viscosity_Pa_s(773.15) / 4.6704e-5 - 1).toBeCloseTo(0, 3);
    expect(argon.conductivity(773.15) / 0.036589 - 1).toBeCloseTo(0, 3);
  });

  it('air at 773.15 K and nitrogen at 113.15 K', () => {
    const air = gasAtPressure('air', 101325);
    expect(Math.abs(air.heatCapacity(773.15) / 1092.43 - 1)).toBeLessThan(0.00115);
    expect(air.viscosity_Pa_s(773.15) / 3.6531e-5 - 1).toBeCloseTo(0, 3);
    expect(air.conductivity(773.15) / 0.055795 - 1).toBeCloseTo(0, 3);
    const nitrogen = gasAtPressure('nitrogen', 101325);
    expect(Math.abs(nitrogen.heatCapacity(113.15) / 1060.93 - 1)).toBeLessThan(0.00115);
    // The ideal gas alone is 2 % low there: the pressure's part of cp.
    expect(fluidByName('nitrogen').heatCapacity(113.15) / 1060.93).toBeLessThan(0.981);
  });
});
