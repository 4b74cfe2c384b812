import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import { type GasGap, gasGap } from '../../../src/core/track/gasGap.js';
import { mulberry } from '../../support/random.js';
import { hotStore, modelOf } from './plants.js';

const CELLS = 20;
const LENGTH_M = 4;
const { tables } = modelOf(hotStore(), { cells: CELLS });

interface Drawn {
  readonly enthalpy: Float64Array;
  readonly lag_m: number;
  readonly inlet_K: number;
}

/** Rock that rises and falls by 100 K from cell to cell, lags from a tenth of a cell to two beds. */
function drawn(seed: number): Drawn {
  const random = mulberry(seed);
  return {
    enthalpy: Float64Array.from({ length: CELLS }, () => enthalpyAt(tables, 400 + 100 * random())),
    lag_m: (random() < 0.5 ? -1 : 1) * 0.02 * 400 ** random(),
    inlet_K: 300 + 400 * random(),
  };
}

function gapOf(
  { enthalpy, lag_m, inlet_K }: Drawn,
  place_m: number,
  weights?: Float64Array,
): GasGap {
  const out: GasGap = { gap_K: 0, perLnLag_K: 0, remainder: 0, from: 0, to: 0 };
  const into = weights ?? new Float64Array(CELLS);
  gasGap(tables, enthalpy, place_m, lag_m, inlet_K, 1, into, out);
  return out;
}

/** D by small steps along l dTg/dz = Ts - Tg from the inlet, each exact for a level rock. */
function integrated({ enthalpy, lag_m, inlet_K }: Drawn, place_m: number): number {
  const t = Array.from(enthalpy, (h) => temperatureAt(tables, h));
  if (lag_m < 0) t.reverse();
  const rock = (z: number): number => {
    const place = Math.min(CELLS - 1, Math.max(0, (z * CELLS) / LENGTH_M - 0.5));
    const j = Math.min(CELLS - 2, Math.floor(place));
    return (t[j] as number) + (place - j) * ((t[j + 1] as number) - (t[j] as number));
  };
  const end = lag_m > 0 ? place_m : LENGTH_M - place_m;
  const steps = 8000;
  const dz = end / steps;
  const keep = Math.exp(-dz / Math.abs(lag_m));
  let gas = inlet_K;
  for (let i = 0; i < steps; i++) {
    const around = rock((i + 0.5) * dz);
    gas = around + (gas - around) * keep;
  }
  return rock(end) - gas;
}

const seeds = fc.integer({ min: 1, max: 1e6 });
const places = fc.double({ min: 0, max: LENGTH_M, noNaN: true });

describe('how far the rock is from the gas', () => {
  it('is what the gas equation gives, integrated from the inlet, in either direction', () => {
    fc.assert(
      fc.property(seeds, places, (seed, place_m) => {
        const d = drawn(seed);
        // Left out upstream: 3e-4 of at most 400 K.
        expect(Math.abs(gapOf(d, place_m).gap_K - integrated(d, place_m))).toBeLessThan(0.12);
      }),
      { numRuns: 300 },
    );
  });

  it('has the derivatives that it says: it is linear in the rock and in the gas that enters', () => {
    fc.assert(
      fc.property(seeds, places, (seed, place_m) => {
        const d = drawn(seed);
        const weights = new Float64Array(CELLS);
        const { gap_K, remainder, from, to } = gapOf(d, place_m, weights);
        let sum = -remainder * d.inlet_K;
        weights.forEach((w, i) => {
          sum += w * temperatureAt(tables, d.enthalpy[i] as number);
          if (i < from || i > to) expect(w).toBe(0);
        });
        expect(sum).toBeCloseTo(gap_K, 8);
        // Everything a kelvin warmer changes nothing.
        expect(weights.reduce((a, b) => a + b) - remainder).toBeCloseTo(0, 10);
      }),
      { numRuns: 200 },
    );
  });

  it('has the derivative with respect to the lag that finite differences give', () => {
    fc.assert(
      fc.property(seeds, places, (seed, place_m) => {
        const d = drawn(seed);
        const by = 1e-5;
        const value = (sign: number): GasGap =>
          gapOf({ ...d, lag_m: d.lag_m * Math.exp(sign * by) }, place_m);
        const [high, low] = [value(1), value(-1)];
        // Not where one cell more is left out by one of them.
        fc.pre(high.from === low.from && high.to === low.to);
        fc.pre(high.remainder > 0 === low.remainder > 0);
        const found = (high.gap_K - low.gap_K) / (2 * by);
        expect(Math.abs(found - gapOf(d, place_m).perLnLag_K)).toBeLessThan(1e-4);
      }),
      { numRuns: 200 },
    );
  });

  it('adds to the weights that are there, by its factor', () => {
    const d = drawn(7);
    const once = new Float64Array(CELLS);
    gapOf(d, 1.3, once);
    const weights = new Float64Array(CELLS).fill(1);
    gasGap(tables, d.enthalpy, 1.3, d.lag_m, d.inlet_K, -0.5, weights, gapOf(d, 1.3));
    weights.forEach((w, i) => {
      expect(w).toBeCloseTo(1 - 0.5 * (once[i] as number), 12);
    });
  });

  it('refuses gas that does not move', () => {
    expect(() => gapOf({ ...drawn(1), lag_m: 0 }, 1)).toThrow(
      new RangeError('lag_m 0: expected other than 0'),
    );
    expect(() => gapOf({ ...drawn(1), lag_m: Number.NaN }, 1)).toThrow(RangeError);
  });
});
