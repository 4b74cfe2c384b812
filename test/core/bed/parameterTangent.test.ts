import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../../src/config/load.js';
import {
  type BedStep,
  bedSubstep,
  createBedWork,
  planSubsteps,
} from '../../../src/core/bed/kernel.js';
import { parameterColumns } from '../../../src/core/bed/parameterTangent.js';
import { enthalpyAt } from '../../../src/core/bed/tables.js';
import { unitModel } from '../../../src/core/unitModel.js';

const unit = loadSite(new URL('../../../config/demo.yaml', import.meta.url).pathname).units[0]!;
const stores = unitModel(unit).stores;
const CELLS = 60;
/** Relative step of the differences; their own error is of its square. */
const DELTA = 1e-4;

/** A random front between the references, in enthalpy of the cells. */
function drawn(store: (typeof stores)[number], at: number, width: number): Float64Array {
  const { reference_hot_K: hot, reference_cold_K: cold } = store.store;
  return Float64Array.from({ length: CELLS }, (_, i) => {
    const x = ((i + 0.5) / CELLS - at) / width;
    return enthalpyAt(store.tables, cold + ((hot - cold) * (1 - Math.tanh(x))) / 2);
  });
}

describe('columns of the parameters', () => {
  it('are those of central differences of the step itself', () => {
    fc.assert(
      fc.property(
        fc.nat(stores.length - 1),
        fc.double({ min: 0.1, max: 0.9, noNaN: true }),
        fc.double({ min: 0.05, max: 0.3, noNaN: true }),
        fc.double({ min: 0.05, max: 0.6, noNaN: true }),
        fc.boolean(),
        fc.double({ min: 0.1, max: 2, noNaN: true }),
        fc.double({ min: 10, max: 120, noNaN: true }),
        (index, at, width, flux, charge, factor, dt) => {
          const store = stores[index]!;
          const start = drawn(store, at, width);
          const whole: BedStep = {
            massFlux_kg_m2s: charge ? flux : -flux,
            inlet_K: charge ? store.store.reference_hot_K : store.store.reference_cold_K,
            ambient_K: 288,
            dt_s: dt,
            heatTransferFactor: factor,
            wallLoss_W_m3K: 0.5,
          };
          const step = { ...whole, dt_s: dt / planSubsteps(store.tables, CELLS, whole) };
          const bounds = new Set<string>();
          const stepped = (change: Partial<BedStep>): Float64Array => {
            const moved = start.slice();
            const own = createBedWork(CELLS);
            bedSubstep(store.tables, moved, { ...step, ...change }, own);
            bounds.add(own.sharpest.join(''));
            return moved;
          };
          const work = createBedWork(CELLS);
          const h = start.slice();
          bedSubstep(store.tables, h, step, work);
          const flow = new Float64Array(CELLS);
          const transfer = new Float64Array(CELLS);
          parameterColumns(store.tables, h, step, work, flow, transfer);
          const check = (column: Float64Array, up: Float64Array, down: Float64Array): void => {
            const greatest = column.reduce((m, v) => Math.max(m, Math.abs(v)), 1e-6);
            for (let i = 0; i < CELLS; i++) {
              const own = h[i]!;
              const { heatCapacity, inverse_dH } = store.tables;
              const differences =
                (up[i]! - down[i]!) / (2 * DELTA) / heatCapacity[Math.floor(own * inverse_dH)]!;
              // Round-off of the difference: 1e-16 of 2e8 J/m3 over 2e-4 and 1e6 J/m3K, and DELTA^2.
              expect(Math.abs(column[i]! - differences)).toBeLessThan(1e-6 * greatest + 1e-8);
            }
          };
          const ends = [DELTA, -DELTA].map((by) => [
            stepped({ massFlux_kg_m2s: step.massFlux_kg_m2s * Math.exp(by) }),
            stepped({ heatTransferFactor: factor * Math.exp(by) }),
          ]);
          // Between the ends a cell's conductivity may meet its least: a kink has no derivative.
          fc.pre(bounds.size === 1);
          check(flow, ends[0]![0]!, ends[1]![0]!);
          check(transfer, ends[0]![1]!, ends[1]![1]!);
        },
      ),
      { numRuns: 200, seed: 7 },
    );
  });
});
