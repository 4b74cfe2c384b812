import { describe, expect, it } from 'vitest';
import type { StoreEnd } from '../../../src/core/definitions.js';
import { gasLimit_K, startGasMemory, stepGas } from '../../../src/core/track/gasCheck.js';
import { type StoreState, startStore } from '../../../src/core/track/storeTracker.js';
import { hotStore, modelOf, stringOf } from './plants.js';

const HOT_K = 733.15;
const FLUX = 0.4;
const LAG_M = 0.05;
const strings = [
  stringOf('a', 8, 4, { area_share: 0.4 }),
  stringOf('b', 8, 4, { radius_m: 0.5, area_share: 0.6 }),
];

/** What a run of scans says at one inlet; rock by the hours and the thermocouple's index. */
interface Run {
  readonly end?: StoreEnd;
  readonly hours?: number;
  readonly gas_K?: (h: number) => number;
  readonly rock_K?: (h: number, sensor: number) => number;
  readonly machine_K?: number;
  readonly flux?: (h: number) => number;
  readonly prepare?: (state: StoreState) => void;
}

/** When the channel was doubtful, in hours from the start [from, to); null: never. */
function run({
  end = 'charge_inlet',
  hours = 24,
  gas_K = () => HOT_K,
  rock_K = () => HOT_K,
  machine_K = HOT_K,
  flux = () => FLUX,
  prepare,
}: Run) {
  const model = modelOf(hotStore({ strings }));
  const state = startStore(model);
  for (const tube of state.tubes) tube.gasLag_m.fill(LAG_M);
  prepare?.(state);
  const memory = startGasMemory();
  let from: number | null = null;
  let to = hours;
  for (let n = 0; n < hours * 60; n++) {
    const h = n / 60;
    const values = Float64Array.from({ length: 16 }, (_, i) => rock_K(h, i));
    const scan = { gas_K: gas_K(h), massFlux_kg_m2s: flux(h), dt_s: 60, ambient_K: 290, values };
    stepGas(model, state, end, memory, { ...scan, machine_K: () => machine_K });
    if (memory.doubtful && from === null) from = h;
    if (!memory.doubtful && from !== null && to === hours) to = h;
  }
  return { from, to, memory, limit_K: gasLimit_K(model) };
}

describe('a gas channel at an inlet', () => {
  it('is doubtful once rock near the inlet stays off from it, at either end, too high or too low', () => {
    for (const end of ['charge_inlet', 'discharge_inlet'] as const) {
      for (const off of [100, -40]) {
        const { from, memory } = run({ end, gas_K: () => HOT_K + off });
        expect(from).toBeGreaterThan(1);
        expect(memory.off_K).toBeCloseTo(off, 6);
        expect(memory.rock_K).toBeCloseTo(HOT_K, 6);
      }
    }
  });

  it('is not while it differs by less than six sigma of channel and thermocouples', () => {
    const { limit_K } = run({ hours: 0 });
    // inlet 2 K, thermocouple 1 K, its group 0.5 K, as the test's estimator is told.
    expect(limit_K).toBeCloseTo(6 * Math.sqrt(4 + 1 + 0.25), 9);
    expect(run({ gas_K: () => HOT_K + limit_K - 1 }).from).toBeNull();
    expect(run({ gas_K: () => HOT_K + limit_K + 5 }).from).not.toBeNull();
  });

  it('is not while the rock still follows, however slowly', () => {
    // A bed with a sixth of the heat transfer that is believed follows twice as fast.
    const rock_K = (h: number) => HOT_K + 100 * (1 - Math.exp(-h / 3));
    expect(run({ gas_K: () => HOT_K + 100, rock_K }).from).toBeNull();
  });

  it('is not where the machine would send what it reads, nor where it has not long been even', () => {
    expect(run({ gas_K: () => HOT_K + 100, machine_K: HOT_K + 90 }).from).toBeNull();
    expect(run({ gas_K: (h) => HOT_K + 60 + 30 * Math.sin(4 * h) }).from).toBeNull();
    expect(run({ gas_K: () => HOT_K + 100, flux: (h) => (h % 3 < 1 ? FLUX : 0) }).from).toBeNull();
  });

  it('is not where thermocouples do not agree, or their readings are none of rock', () => {
    const apart = (_h: number, i: number) => HOT_K + 40 * i;
    expect(run({ gas_K: () => HOT_K - 200, rock_K: apart }).from).toBeNull();
    const off = { gas_K: () => HOT_K + 100 };
    const all = (verdict: 'stuck' | 'offset') => (state: StoreState) => {
      for (const memory of state.sensors.flat()) memory.verdict = verdict;
    };
    expect(run({ ...off, prepare: all('stuck') }).from).toBeNull();
    // A channel that is off makes sound thermocouples seem so.
    expect(run({ ...off, prepare: all('offset') }).from).not.toBeNull();
    const missing = (_h: number, i: number) => (i === 0 ? HOT_K : Number.NaN);
    expect(run({ ...off, rock_K: missing }).from).toBeNull();
  });

  it('is well again once the same rock shows it, not because the flow ends', () => {
    const gas_K = (h: number) => HOT_K + (h < 12 ? 100 : 0);
    const ends = run({ gas_K, flux: (h) => (h < 12 || h > 14 ? FLUX : 0) });
    expect(ends.from).toBeLessThan(12);
    expect(ends.to).toBeGreaterThan(14);
    expect(ends.to).toBeLessThan(24);
    expect(run({ gas_K, flux: (h) => (h < 12 ? FLUX : 0) }).to).toBe(24);
  });

  it('keeps nothing that is not finite, whatever is read', () => {
    const odd = [Number.NaN, Number.POSITIVE_INFINITY, HOT_K + 100, 1e9, -5, 0];
    const { memory } = run({
      gas_K: (h) => odd[Math.floor(h * 4) % odd.length] as number,
      rock_K: (h, i) => odd[Math.floor(h * 3 + i) % odd.length] as number,
      machine_K: Number.NaN,
    });
    for (const value of Object.values(memory)) {
      if (typeof value === 'number') expect(Number.isFinite(value)).toBe(true);
    }
  });
});
