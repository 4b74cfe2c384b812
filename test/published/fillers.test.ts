import { describe, expect, it } from 'vitest';
import { solidByName } from '../../src/core/bed/solids.js';
import { lowTemperatureForm } from '../../src/core/bed/solidsLowTemperature.js';
import { MAGNETITE_HEAT_CAPACITY } from '../../src/core/bed/solidsMagnetite.js';
import { fixtureRows, numberIn } from '../support/table.js';

/** Names of fixtures/rock_cp_correlations.csv that are named solids here. */
const NAMES: Record<string, string> = {
  'corundum alpha-Al2O3': 'corundum',
  'quartz (alpha)': 'quartz',
  'hematite Fe2O3': 'hematite',
  'periclase MgO': 'periclase',
  'Westerly granite': 'granite',
  'Rockville granite': 'granite_rockville',
  basalt: 'basalt',
  andesite: 'andesite',
  peridotite: 'peridotite',
  'basalt (Nahhas 2019)': 'basalt_nahhas',
  'mixed Swiss alpine rocks (Zanganeh)': 'alpine_rock',
  'magnetite (NIST Shomate)': 'magnetite_nist',
};

const table = fixtureRows('rock_cp_correlations.csv').filter((row) => NAMES[row.material ?? '']);
const CHECKED_AT = [298.15, 373.15, 573.15, 773.15];

describe('published heat capacities of fillers', () => {
  it('covers every correlation of the table but the generic one, which has no rock of its own', () => {
    expect(table).toHaveLength(12);
    expect(fixtureRows('rock_cp_correlations.csv')).toHaveLength(13);
  });

  it.each(table.map((row) => [row.material as string, row] as const))('%s', (material, row) => {
    const solid = solidByName(NAMES[material] as string);
    for (const T of CHECKED_AT) {
      const published = numberIn(row, `cp_${Math.floor(T)}K`);
      // A blank field lies outside the fit, where the end value goes on.
      if (Number.isNaN(published)) continue;
      // Values are printed to 0.1 J/kgK.
      expect(Math.abs(solid.heatCapacity(T) - published)).toBeLessThanOrEqual(0.0501);
    }
    expect(solid.range_K[1]).toBe(numberIn(row, 'T_max_K'));
  });

  it('rounds to the values named in the checks (298, 373, 573, 773 K)', () => {
    // USGS OFR 95-622; Nahhas et al. 2019; Zanganeh et al. 2012.
    const named: Record<string, number[]> = {
      corundum: [775.7, 911, 1087, 1171],
      quartz: [747, 858, 1065, 1222],
      granite: [768, 849, 1017, 1119],
      basalt: [738, 851, 1004, 1076],
      basalt_nahhas: [700, 817, 943, 994],
      alpine_rock: [761, 804, 917, 1031],
    };
    for (const [name, values] of Object.entries(named)) {
      values.forEach((value, i) => {
        const mine = solidByName(name).heatCapacity(CHECKED_AT[i] as number);
        // Half a unit of the last digit, and the 0.05 that the table itself was rounded by.
        expect(Math.abs(mine - value), name).toBeLessThanOrEqual(0.55);
      });
    }
  });

  it('corundum at 298.15 K is NIST SRM 720, 79.01 J/molK [M: from memory]', () => {
    const molar = solidByName('corundum').heatCapacity(298.15) * 0.101961;
    // The fit of OFR 95-622 passes 0.1 % above the standard.
    expect(Math.abs(molar / 79.01 - 1)).toBeLessThan(0.0015);
  });
});

describe('magnetite', () => {
  const rows = fixtureRows('magnetite_cp_table_100_900K.csv');

  it('carries the published table to the last digit', () => {
    expect(rows.map((row) => numberIn(row, 'cp_J_kgK'))).toEqual([...MAGNETITE_HEAT_CAPACITY]);
    const solid = solidByName('magnetite');
    for (const row of rows) {
      expect(solid.heatCapacity(numberIn(row, 'T_K'))).toBe(numberIn(row, 'cp_J_kgK'));
    }
    // NREL solar-PTES table, as named in the checks.
    for (const [T, c] of [
      [150, 396],
      [300, 653],
      [500, 831],
      [800, 1092],
    ] as const) {
      expect(Math.round(solid.heatCapacity(T))).toBe(c);
    }
  });

  it('has the published enthalpy, which was summed by trapezia too', () => {
    const solid = solidByName('magnetite');
    const first = rows[0] as Record<string, string>;
    for (const row of rows) {
      const rise = solid.enthalpy(numberIn(row, 'T_K')) - solid.enthalpy(100);
      const published = numberIn(row, 'h_J_kg') - numberIn(first, 'h_J_kg');
      // 10 K times the rounding of two heat capacities (5e-4 each) per step, adding at worst.
      const steps = (numberIn(row, 'T_K') - 100) / 10;
      expect(Math.abs(rise - published)).toBeLessThan(0.01 + 0.005 * steps);
    }
  });

  it('follows the Shomate equation of NIST from 298 to 900 K', () => {
    const solid = solidByName('magnetite_nist');
    for (const row of rows) {
      const published = numberIn(row, 'cp_NIST_shomate_J_kgK');
      if (Number.isNaN(published)) continue;
      expect(Math.abs(solid.heatCapacity(numberIn(row, 'T_K')) - published)).toBeLessThan(0.00501);
    }
  });
});

/**
 * Low temperatures. The anchors [M] are from memory, J/molK: alumina 12.8 (100 K), 32 (150 K),
 * 51.1 (200 K), 67.1 (250 K); quartz 15.7 (100 K), 32.6 (200 K). The continuation knows nothing of
 * them but the order of its spectrum; the bounds are what a two-parameter shape was found to reach.
 */
describe('continuation below 298 K', () => {
  const alumina = (T: number) => solidByName('corundum').heatCapacity(T) * 0.101961;
  const quartz = (T: number) => solidByName('quartz').heatCapacity(T) * 0.060084;

  it('alumina: within 5 % from 150 K, and 15 % at 100 K, where its heat is a sixth', ({
    annotate,
  }) => {
    for (const [T, anchor, bound] of [
      [250, 67.1, 0.05],
      [200, 51.1, 0.05],
      [150, 32, 0.05],
      [100, 12.8, 0.15],
    ] as const) {
      const error = alumina(T) / anchor - 1;
      void annotate(`alumina ${T} K: ${alumina(T).toFixed(1)} against ${anchor} J/molK`);
      expect(Math.abs(error)).toBeLessThan(bound);
    }
  });

  it('quartz: within 1 % at 200 K and 6 % at 100 K', ({ annotate }) => {
    void annotate(`quartz 200 K: ${quartz(200).toFixed(1)} against 32.6 J/molK`);
    void annotate(`quartz 100 K: ${quartz(100).toFixed(1)} against 15.7 J/molK`);
    expect(Math.abs(quartz(200) / 32.6 - 1)).toBeLessThan(0.01);
    expect(Math.abs(quartz(100) / 15.7 - 1)).toBeLessThan(0.06);
  });

  it('magnetite: anchored at the table at 300 K alone, it finds the table down to 120 K', () => {
    const table = solidByName('magnetite');
    // Slope of the table around 300 K, over 40 K since the table has a kink there.
    const slope = (table.heatCapacity(320) - table.heatCapacity(280)) / 40;
    const form = lowTemperatureForm('silicate', 300, table.heatCapacity(300), slope);
    for (let T = 120; T < 300; T += 10) {
      expect(Math.abs(form.heatCapacity(T) / table.heatCapacity(T) - 1)).toBeLessThan(0.05);
    }
    // The enthalpy from 120 to 300 K, which is what a cold store holds, within 2 %.
    const mine = form.enthalpy(300) - form.enthalpy(120);
    expect(Math.abs(mine / (table.enthalpy(300) - table.enthalpy(120)) - 1)).toBeLessThan(0.02);
  });

  it('basalt: between two other published curves through measurements on basaltic rock', () => {
    // J/gK, Winter & Saari, Astrophys. J. 156 (1969) 1135; cal/gK, Ledlow et al., Astrophys. J. 384
    // (1992) 640; each over its own value at 298 K, for they are of other rock than the fit above.
    const winter = (T: number) => -0.034 * Math.sqrt(T) + 0.008 * T - 0.0002 * T ** 1.5;
    const ledlow = (T: number) => {
      const y = T / 300 - 1;
      return 0.1812 + y * (0.1191 + y * (0.0176 + y * (0.2721 + y * 0.1869)));
    };
    const { heatCapacity } = solidByName('basalt');
    // To 2 % outside of the two, which differ among themselves by 2 to 6 %.
    for (let T = 140; T < 298; T += 10) {
      const ratio = heatCapacity(T) / heatCapacity(298.15);
      const both = [winter(T) / winter(298.15), ledlow(T) / ledlow(298.15)];
      expect(ratio).toBeGreaterThan(Math.min(...both) * 0.98);
      expect(ratio).toBeLessThan(Math.max(...both) * 1.02);
    }
  });

  it('every rock about halves towards -150 degC, as is known of rock', () => {
    for (const name of ['granite', 'granite_rockville', 'basalt', 'basalt_nahhas', 'andesite']) {
      const solid = solidByName(name);
      const ratio = solid.heatCapacity(123.15) / solid.heatCapacity(298.15);
      expect(ratio).toBeGreaterThan(0.43);
      expect(ratio).toBeLessThan(0.51);
    }
  });
});
