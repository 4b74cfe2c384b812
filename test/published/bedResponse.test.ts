import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { stagnantConductivity } from '../../src/core/bed/bedConductivity.js';
import { volumetricHeatTransfer } from '../../src/core/bed/heatTransfer.js';
import { buildBedTables } from '../../src/core/bed/tables.js';
import { frontMoments, plainStep, runBed, uniformBed } from '../core/bed/advanceBed.js';
import { constantSolid, simpleBed } from '../core/bed/simpleBed.js';

/**
 * Source: fixtures/schumann_analytic_J_table.csv (Schumann, J. Franklin Inst. 208 (1929) 405;
 * Anzelius 1926): exact two-phase response to a step at the inlet.
 */
const table = readFileSync(
  new URL('../../fixtures/schumann_analytic_J_table.csv', import.meta.url),
  'utf8',
)
  .split('\n')
  .filter((line) => /^[0-9]/.test(line))
  .map((line) => line.split(',').map(Number) as [number, number, number, number]);

const XI = 150;
const G = 0.3;
const LOW = 400;
const HIGH = 600;

/** Worst error in theta_solid over the table's rows 1 <= xi < 150 of one tau. */
function worstError(tau: number, cells: number): number {
  const plain = simpleBed({ conductivity_factor: 0 });
  const hv = volumetricHeatTransfer({ bed: plain, massFlux_kg_m2s: G, temperature_K: 500 });
  const cf = plain.fluid.heatCapacity(500);
  const bed = { ...plain, length_m: (XI * G * cf) / hv };
  const tables = buildBedTables(bed, LOW, HIGH, { segments: 64, mixing: 0 });
  const capacity = tables.heatCapacity[0] as number;
  const time = (tau * capacity) / hv;
  const dt = (0.5 * capacity * (bed.length_m / cells)) / (G * cf);
  const t = runBed(
    tables,
    uniformBed(tables, cells, LOW),
    plainStep({ massFlux_kg_m2s: G, inlet_K: HIGH, dt_s: dt }),
    time,
  );
  let worst = 0;
  for (const [xi, rowTau, , solid] of table) {
    if (rowTau !== tau || xi < 1 || xi >= XI) continue;
    const place = (xi / XI) * cells - 0.5;
    const i = Math.max(0, Math.min(cells - 2, Math.floor(place)));
    const a = t[i] as number;
    const value = a + (place - i) * ((t[i + 1] as number) - a);
    worst = Math.max(worst, Math.abs((value - LOW) / (HIGH - LOW) - solid));
  }
  return worst;
}

describe('exact bed response (Schumann 1929)', () => {
  it('is met below 0.002 in theta at 200 cells over xi = 150 and tau = 100', () => {
    expect(worstError(100, 200)).toBeLessThan(0.002);
  });

  it.each([50, 100, 150])('is approached at second order at tau = %i', (tau) => {
    const coarse = worstError(tau, 150);
    const fine = worstError(tau, 300);
    // Halving dx and dt together must divide the error by 4 at second order; 3.2 leaves room for
    // the interpolation between cells, itself of second order with another constant.
    expect(coarse / fine).toBeGreaterThan(3.2);
  });
});

describe('front speed and width in metres', () => {
  const cells = 400;
  const length = 8;
  const gas = simpleBed().fluid;
  const cf = gas.heatCapacity(500);
  const capacity = 0.6 * 2600 * 1000;
  const speed = (G * cf) / capacity;
  const time = 4 / speed;

  function measured(conductivityFactor: number, mixing: number, transfer: number) {
    const bed = simpleBed({
      length_m: length,
      conductivity_factor: conductivityFactor,
      heat_transfer_factor: transfer,
      solid: constantSolid({ conductivity: 3 }),
    });
    // A narrow range keeps the stagnant conductivity constant along the front.
    const tables = buildBedTables(bed, 499, 501, { segments: 64, mixing });
    const t = runBed(
      tables,
      uniformBed(tables, cells, 499),
      plainStep({ massFlux_kg_m2s: G, inlet_K: 501, dt_s: 30 }),
      time,
    );
    const moments = frontMoments(t, 501, 499, length / cells);
    const hv = volumetricHeatTransfer({ bed, massFlux_kg_m2s: G, temperature_K: 500 });
    const transferD = (G * cf) ** 2 / (hv * capacity);
    const axial =
      conductivityFactor * stagnantConductivity(bed, 500) +
      mixing * G * cf * bed.particle_diameter_m;
    // sigma^2 = 2 D t, D = (G cf)^2/(hv C) + kax/C (CHECKS.md, bed response).
    return { ...moments, transfer: 2 * transferD * time, axial: (2 * axial * time) / capacity };
  }

  it('moves with G cf/C', () => {
    const m = measured(1, 0.5, 1);
    // The front's mean is the heat taken up, so the speed is exact to round-off until breakthrough.
    expect(m.mean_m).toBeCloseTo(4, 9);
  });

  it('spreads by transfer alone as published', () => {
    const m = measured(0, 0, 1);
    // The formula is the long-time limit; the exact J has variance 2 tau to a part in xi^-1 ~ 1/100.
    expect(Math.abs(m.sigma_m / Math.sqrt(m.transfer) - 1)).toBeLessThan(0.01);
  });

  it.each([
    ['conduction', 1, 0],
    ['mixing', 0, 0.5],
    ['both', 1, 0.5],
  ])('adds the published variance by %s, alone and on top of transfer', (_, conduction, mixing) => {
    const without = measured(0, 0, 1);
    const with_ = measured(conduction, mixing, 1);
    // Variances of independent causes add: the difference is 2 kax t/C. Heat conducted back across
    // the inlet face (closed here) shifts moments by (kax/(G cf))^2, below 0.1 % of the variance.
    expect((with_.sigma_m ** 2 - without.sigma_m ** 2) / with_.axial).toBeCloseTo(1, 1);
    expect(with_.sigma_m / Math.sqrt(with_.transfer + with_.axial)).toBeCloseTo(1, 2);
  });
});

describe('heat capacity that depends on temperature (White, McTigue, Markides 2014 [citation from memory])', () => {
  // c = 600 + 0.8 T: between 300 and 700 K from 840 to 1160 J/kgK.
  const bed = simpleBed({
    length_m: 16,
    conductivity_factor: 0,
    solid: constantSolid({ heatCapacity: 600, slope: 0.8 }),
    heat_transfer_factor: 2,
  });
  const tables = buildBedTables(bed, 300, 700, { segments: 1024, mixing: 0 });
  const cells = 1600;
  const cf = 1000;

  function widthAfter(
    start: number,
    inlet: number,
    metres: number,
  ): { x50: number; width: number } {
    const c = (0.6 * 2600 * (bed.solid.enthalpy(700) - bed.solid.enthalpy(300))) / 400;
    const t = runBed(
      tables,
      uniformBed(tables, cells, start),
      plainStep({ massFlux_kg_m2s: G, inlet_K: inlet, dt_s: 30 }),
      (metres * c) / (G * cf),
    );
    const theta = t.map((v) => (v - start) / (inlet - start));
    const cross = (level: number): number => {
      const i = theta.findIndex((v) => v < level);
      const a = theta[i - 1] as number;
      return ((i - 0.5 + (a - level) / (a - (theta[i] as number))) * bed.length_m) / cells;
    };
    return { x50: cross(0.5), width: (cross(0.16) - cross(0.84)) / 2 };
  }

  it('spreads a hot front linearly with travel while charging', () => {
    const near = widthAfter(300, 700, 3);
    const far = widthAfter(300, 700, 9);
    // Local speeds v = G cf/C: theta 0.84 (636 K) and 0.16 (364 K) part at a constant rate.
    const rate = (t: number) => (G * cf) / (0.6 * 2600 * bed.solid.heatCapacity(t));
    const mean =
      (G * cf * 400) / (0.6 * 2600 * (bed.solid.enthalpy(700) - bed.solid.enthalpy(300)));
    const expected = ((rate(364) - rate(636)) / mean / 2) * 6;
    // Dispersion adds on top and shrinks in share: the growth between 3 and 9 m is within 15 %.
    expect((far.width - near.width) / expected).toBeGreaterThan(0.85);
    expect((far.width - near.width) / expected).toBeLessThan(1.15);
  });

  it('sharpens to a shock while discharging, that moves with the mean heat capacity', () => {
    const near = widthAfter(700, 300, 10);
    const far = widthAfter(700, 300, 14);
    const spread = widthAfter(300, 700, 10);
    // A front without the effect widens by sqrt(14/10) = 1.18 between the two; a shock keeps its shape.
    expect(Math.abs(far.width / near.width - 1)).toBeLessThan(0.02);
    expect(spread.width).toBeGreaterThan(3 * far.width);
    // Speed G cf/(C_mean), C_mean from [h(Th)-h(Tc)]/(Th-Tc): 4 m further to within a cell.
    expect(Math.abs(far.x50 - near.x50 - 4)).toBeLessThan(bed.length_m / cells);
  });
});
