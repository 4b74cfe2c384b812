import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { fluidByName, liquidOf } from '../../../src/core/bed/fluids.js';
import { bedSubstep, createBedWork, stepBed } from '../../../src/core/bed/kernel.js';
import { createPropagation, propagate } from '../../../src/core/bed/propagate.js';
import { solidByName } from '../../../src/core/bed/solids.js';
import { buildBedTables, enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import {
  applyTangentToVector,
  createBedTangent,
  linearise,
} from '../../../src/core/bed/tangent.js';
import { mulberry } from '../../support/random.js';
import { plainStep, uniformBed } from './advanceBed.js';
import { simpleBed } from './simpleBed.js';

const argonGranite = simpleBed({
  length_m: 8,
  solid: solidByName('granite'),
  fluid: fluidByName('argon'),
  wall_loss_W_m2K: 0.3,
  end_loss_W_m2K: { charge_inlet: 0.3, discharge_inlet: 0.3 },
});

describe('energy of a bed', () => {
  it('closes to 1e-9 of the capacity over 10,000 steps in either direction and standing', () => {
    const random = mulberry(7);
    const tables = buildBedTables(argonGranite, 298, 733);
    const cells = 100;
    const bed = uniformBed(tables, cells, 350);
    const work = createBedWork(cells);
    const dx = 8 / cells;
    const sum = () => bed.reduce((a, h) => a + h, 0) * dx;
    const start = sum();
    const capacity = (enthalpyAt(tables, 733) - enthalpyAt(tables, 298)) * 8;
    let balance = 0;
    for (let n = 0; n < 10_000; n++) {
      const kind = Math.floor(n / 500) % 4;
      const flux = kind === 0 ? 0.8 : kind === 2 ? -0.7 : kind === 3 ? -0.2 : 0;
      stepBed(
        tables,
        bed,
        plainStep({
          massFlux_kg_m2s: flux,
          inlet_K: flux > 0 ? 733 + 5 * random() : 298 + 5 * random(),
          ambient_K: 283,
          dt_s: 20 + 60 * random(),
          wallLoss_W_m3K: 0.2,
        }),
        work,
      );
      balance += work.gasIn_J_m2 - work.gasOut_J_m2 - work.loss_J_m2;
    }
    expect(Math.abs(sum() - start - balance) / capacity).toBeLessThan(1e-9);
  });

  it('mirrors: charging a bed is discharging its mirror image', () => {
    const tables = buildBedTables(simpleBed(), 300, 700);
    const forward = uniformBed(tables, 60, 300);
    const backward = uniformBed(tables, 60, 300);
    const work = createBedWork(60);
    for (let n = 0; n < 200; n++) {
      stepBed(tables, forward, plainStep({ inlet_K: 700 }), work);
      stepBed(tables, backward, plainStep({ inlet_K: 700, massFlux_kg_m2s: -0.3 }), work);
    }
    // Conduction is summed in the other order: a few roundings a step, 200 steps.
    forward.forEach((h, i) => {
      expect(Math.abs((backward[59 - i] as number) / h - 1)).toBeLessThan(200 * 2 ** -52 * 10);
    });
  });

  it('cools while standing by exactly what it loses, towards ambient and never beyond', () => {
    const tables = buildBedTables(argonGranite, 298, 733);
    const bed = uniformBed(tables, 80, 700);
    const work = createBedWork(80);
    for (let n = 0; n < 2000; n++) {
      stepBed(
        tables,
        bed,
        plainStep({ massFlux_kg_m2s: 0, ambient_K: 283, dt_s: 600, wallLoss_W_m3K: 0.3 }),
        work,
      );
    }
    const t = bed.map((h) => temperatureAt(tables, h));
    expect(Math.min(...t)).toBeGreaterThan(283);
    expect(t[0]).toBeLessThan(t[40] as number); // the ends lose more than the middle
  });
});

describe('properties of the step, for random beds, gases and flows', () => {
  const cases = fc.record({
    gas: fc.constantFrom('argon', 'air', 'nitrogen'),
    flux: fc.double({ min: 0.02, max: 1.5, noNaN: true }),
    sign: fc.constantFrom(1, -1),
    dt: fc.double({ min: 1, max: 1800, noNaN: true }),
    diameter: fc.double({ min: 0.005, max: 0.06, noNaN: true }),
    length: fc.double({ min: 1, max: 12, noNaN: true }),
    cells: fc.integer({ min: 20, max: 160 }),
    transfer: fc.double({ min: 0.1, max: 2, noNaN: true }),
    seed: fc.integer(),
  });

  it('keeps temperatures within those of bed and inlet (no new extremes beyond antidiffusion)', () => {
    fc.assert(
      fc.property(cases, (c) => {
        const bed = simpleBed({
          length_m: c.length,
          particle_diameter_m: c.diameter,
          solid: solidByName('basalt'),
          fluid: fluidByName(c.gas),
        });
        const tables = buildBedTables(bed, 300, 800);
        const state = uniformBed(tables, c.cells, 300);
        const work = createBedWork(c.cells);
        for (let n = 0; n < 60; n++) {
          stepBed(
            tables,
            state,
            plainStep({
              massFlux_kg_m2s: c.sign * c.flux,
              inlet_K: 800,
              dt_s: c.dt,
              heatTransferFactor: c.transfer,
            }),
            work,
          );
        }
        for (const h of state) {
          const t = temperatureAt(tables, h);
          // Where cells are coarser than the physical front, taking the scheme's own dispersion out
          // of kax leaves ripples; a fiftieth of the step bounds them in the second-order scheme.
          expect(t).toBeGreaterThan(300 - 10);
          expect(t).toBeLessThan(800 + 10);
        }
      }),
      { numRuns: 60, seed: 11 },
    );
  });

  it('has the tangent that finite differences show', () => {
    fc.assert(
      fc.property(cases, (c) => {
        const bed = simpleBed({
          length_m: c.length,
          particle_diameter_m: c.diameter,
          solid: solidByName('granite'),
          fluid: fluidByName(c.gas),
        });
        // Few segments, so that a small perturbation stays within one.
        const tables = buildBedTables(bed, 300, 800, { segments: 40 });
        const random = mulberry(c.seed);
        const start = Float64Array.from({ length: c.cells }, () => 310 + 480 * random());
        const perturb = start.map(() => random() - 0.5);
        const inlet = random() - 0.5;
        const dt = Math.min(c.dt, 120);
        const run = (eps: number) => {
          const state = start.map((t, i) => enthalpyAt(tables, t + eps * (perturb[i] as number)));
          const work = createBedWork(c.cells);
          const step = plainStep({
            massFlux_kg_m2s: c.sign * c.flux,
            inlet_K: 640 + eps * inlet,
            dt_s: dt / 60,
            wallLoss_W_m3K: 0.3,
          });
          bedSubstep(tables, state, step, work);
          const tangent = createBedTangent(c.cells);
          linearise(tables, state, step, work, tangent);
          return { t: state.map((h) => temperatureAt(tables, h)), tangent };
        };
        const eps = 1e-5;
        const plus = run(eps);
        const minus = run(-eps);
        const expected = perturb.slice();
        applyTangentToVector(run(0).tangent, expected, inlet);
        for (let i = 0; i < c.cells; i++) {
          const difference = ((plus.t[i] as number) - (minus.t[i] as number)) / (2 * eps);
          // Round-off of the difference quotient: 1e-13 * 800 K / 1e-5; a segment boundary within
          // eps of a cell (probability 1e-6 a cell) would fail, none does with this seed.
          expect(Math.abs(difference - (expected[i] as number))).toBeLessThan(1e-6);
        }
      }),
      { numRuns: 100, seed: 5 },
    );
  });

  it('applies the tangent to a covariance as F P F would', () => {
    const random = mulberry(3);
    const tables = buildBedTables(argonGranite, 298, 733);
    const sizes = [2, 28, 29, 30, 31];
    for (const [flux, cells] of sizes.flatMap((n) => [0.7, -0.7, 0].map((g) => [g, n] as const))) {
      const state = Float64Array.from({ length: cells }, (_, i) =>
        enthalpyAt(tables, 300 + 13 * i),
      );
      const work = createBedWork(cells);
      const step = plainStep({ massFlux_kg_m2s: flux, inlet_K: 500, dt_s: 60 });
      bedSubstep(tables, state, step, work);
      const tangent = createBedTangent(cells);
      linearise(tables, state, step, work, tangent);
      const size = cells + 4;
      const columns = [0, 1].map(() => Float64Array.from({ length: cells }, () => random() - 0.5));
      const parameters = columns.map((column, k) => ({ row: cells + 1 + k, column }));
      const rows = { inlet: cells, parameters };
      const f = Array.from({ length: size }, (_, j) => {
        const unit = new Float64Array(size);
        unit[j] = 1;
        const cellsPart = unit.slice(0, cells);
        applyTangentToVector(tangent, cellsPart, unit[cells] as number);
        for (let i = 0; i < cells; i++) {
          for (const p of parameters) {
            cellsPart[i] =
              (cellsPart[i] as number) + (p.column[i] as number) * (unit[p.row] as number);
          }
        }
        unit.set(cellsPart);
        return unit; // column j of F
      });
      const root = Array.from({ length: size }, () =>
        Float64Array.from({ length: size }, () => random() - 0.5),
      );
      const p = new Float64Array(size * size);
      for (let i = 0; i < size; i++)
        for (let j = 0; j < size; j++)
          for (let k = 0; k < size; k++)
            p[i * size + j]! += (root[i]?.[k] as number) * (root[j]?.[k] as number);
      const dense = new Float64Array(size * size);
      for (let i = 0; i < size; i++)
        for (let j = 0; j < size; j++)
          for (let a = 0; a < size; a++)
            for (let b = 0; b < size; b++)
              dense[i * size + j]! +=
                (f[a]?.[i] as number) * (p[a * size + b] as number) * (f[b]?.[j] as number);
      propagate(tangent, p, size, rows, createPropagation(cells));
      for (let i = 0; i < size * size; i++) {
        // Sums of a few hundred products of order one: 1e-12 is thousands of roundings.
        expect(Math.abs((p[i] as number) - (dense[i] as number))).toBeLessThan(1e-11);
      }
      for (let i = 0; i < size; i++)
        for (let j = 0; j < i; j++) expect(p[i * size + j]).toBe(p[j * size + i]);
    }
  });
});

describe('tables', () => {
  it('invert temperature and enthalpy exactly, in and beyond the range', () => {
    const tables = buildBedTables(argonGranite, 298, 733);
    for (const t of [240, 298, 412.34, 733, 790]) {
      expect(temperatureAt(tables, enthalpyAt(tables, t))).toBeCloseTo(t, 9);
    }
  });

  it('count the heat of a liquid with the solid, not that of a gas', () => {
    const salt = liquidOf({
      name: 'salt',
      source: 'test',
      density_kg_m3: 1835.6,
      heat_capacity_J_kgK: 1511.8,
      viscosity_Pa_s: 2.63e-3,
      conductivity_W_mK: 0.52,
    });
    const bed = simpleBed({ void_fraction: 0.22, fluid: salt, solid: solidByName('quartz') });
    const wet = buildBedTables(bed, 563, 669);
    const dry = buildBedTables({ ...bed, fluid: fluidByName('air') }, 563, 669);
    const difference =
      enthalpyAt(wet, 669) - enthalpyAt(wet, 563) - (enthalpyAt(dry, 669) - enthalpyAt(dry, 563));
    // 0.22 * 1835.6 * 1511.8 J/m3K over 106 K
    expect(difference / (0.22 * 1835.6 * 1511.8 * 106)).toBeCloseTo(1, 6);
  });

  it('refuse a range that does not ascend, naming it', () => {
    expect(() => buildBedTables(argonGranite, 700, 300)).toThrow(/700, 300/);
  });
});
