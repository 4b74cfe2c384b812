import { describe, expect, it } from 'vitest';
import { createBedWork } from '../../../src/core/bed/kernel.js';
import { enthalpyAt } from '../../../src/core/bed/tables.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { type RolloutInput, RULES, rollOut } from '../../../src/core/dispatch/rollout.js';
import { createMachine } from '../../../src/core/machine/machine.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { type Fronts, frontTemperature } from '../track/fronted.js';
import { coldStore, hotBed, hotStore, unitOf } from '../track/plants.js';

const PLENUM = {
  end_capacity_J_K: { charge_inlet: 60e3, discharge_inlet: 60e3 },
  end_volume_m3: { charge_inlet: 1, discharge_inlet: 1 },
};

function withPlenum(): UnitDefinition {
  return unitOf({
    stores: [
      hotStore({ bed: hotBed(PLENUM) }),
      coldStore({ bed: { ...coldStore().bed, ...PLENUM } }),
    ],
  });
}

/** A rollout from given fronts; `split` divides each bed into tubes with these factors on the flow. */
function inputOf(
  unit: UnitDefinition,
  fronts: Fronts,
  over: Partial<RolloutInput> & { split?: readonly number[]; plenum_K?: number[] } = {},
): RolloutInput {
  const { split = [1], plenum_K = [], ...rest } = over;
  const stores = unitModel(unit).stores.map(({ store, tables, tubes }, s) => {
    const cells = tubes[0]?.layout.cells ?? 0;
    const front = store.kind === 'hot' ? fronts.hot : fronts.cold;
    const enthalpy = Float64Array.from({ length: cells }, (_, i) => {
      const x = ((i + 0.5) / cells) * store.bed.length_m;
      return enthalpyAt(tables, frontTemperature(store, x, front, fronts.width));
    });
    return {
      store,
      tables,
      plenum_K: plenum_K[s] ?? Number.NaN,
      tubes: split.map((flowFactor) => ({
        area_share: 1 / split.length,
        enthalpy,
        flowFactor,
        heatTransferFactor: 1,
        wallLoss_W_m3K: 0,
      })),
    };
  });
  return {
    unit,
    machine: createMachine(unit.machine),
    stores,
    power_W: 60e3,
    workFactor: 1,
    ambient_K: unit.ambient_K,
    step_s: 300,
    most_s: 72 * 3600,
    ...rest,
  };
}

const run = (input: RolloutInput) =>
  rollOut(
    input,
    input.stores.map((s) => s.tubes.map(() => createBedWork(30))),
  );
const HALF = { hot: 0.6, cold: 0.65 };

describe('a rollout', () => {
  const unit = unitOf();

  it('ends with the earliest of the rules', () => {
    const { times_s, end_s, ends_by } = run(inputOf(unit, HALF));
    expect(end_s).toBe(Math.min(...times_s));
    expect(RULES[times_s.indexOf(end_s)]).toBe(ends_by);
  });

  it('ends at a time that does not depend on its step', () => {
    const at = (step_s: number, of = unit): number => run(inputOf(of, HALF, { step_s })).end_s;
    for (const of of [unit, withPlenum()]) {
      const fine = at(10, of);
      // Second order in the step: means over steps count for their middles and flows are those of
      // the middles. The outlet falls from 99 % to its limit within about an hour, on which five
      // minutes are 1/12: an error of (1/12)^2 of that hour, 25 s, against the half step of 150 s
      // that a first-order count would be off by.
      expect(Math.abs(at(300, of) - fine)).toBeLessThan(45);
      expect(Math.abs(at(100, of) - fine)).toBeLessThan(15);
    }
  });

  it('is smooth in the state: a front a millimetre on moves the end by its travel', () => {
    const times = [0.6, 0.6005, 0.601, 0.6015, 0.602].map(
      (at) => run(inputOf(unit, { hot: at, cold: at })).end_s,
    );
    const steps = times.slice(1).map((t, i) => t - (times[i] as number));
    const mean = steps.reduce((a, b) => a + b, 0) / steps.length;
    // Two millimetres of 2.4 m; a jump by a step of 300 s would be hundreds of these.
    for (const step of steps) expect(Math.abs(step / mean - 1)).toBeLessThan(0.3);
    expect(mean).toBeGreaterThan(0);
  });

  it('takes less flow, and so longer, for a machine that gives more work per kilogram', () => {
    const plain = run(inputOf(unit, HALF)).end_s;
    const better = run(inputOf(unit, HALF, { workFactor: 1.05 })).end_s;
    // Nearly in proportion: the way to the outlet is the same, the loss on the way a little more.
    expect(better / plain).toBeGreaterThan(1.03);
    expect(better / plain).toBeLessThan(1.06);
  });

  it('ends the sooner the more unlike its tubes are, at the same total flow', () => {
    const even = run(inputOf(unit, HALF, { split: [1, 1] })).end_s;
    const uneven = run(inputOf(unit, HALF, { split: [0.8, 1.2] })).end_s;
    expect(run(inputOf(unit, HALF)).end_s).toBeCloseTo(even, 6);
    expect(uneven).toBeLessThan(even);
  });

  it('leaves the beds that it was given alone', () => {
    const input = inputOf(unit, HALF);
    const before = structuredClone(input.stores.map((s) => s.tubes.map((t) => t.enthalpy)));
    run(input);
    expect(input.stores.map((s) => s.tubes.map((t) => t.enthalpy))).toEqual(before);
  });

  it('rolls no longer than asked, and then no rule has broken', () => {
    const result = run(inputOf(unit, HALF, { most_s: 1800 }));
    expect(result.end_s).toBe(Number.POSITIVE_INFINITY);
    expect(result.ends_by).toBe('empty');
  });
});

describe('gas that stood under the lid', () => {
  const unit = withPlenum();
  const charged = { hot: 0.8, cold: 0.8 };

  it('is pushed out before the outlets count: cooled lids do not forbid a discharge', () => {
    const warm = run(inputOf(unit, charged)).end_s;
    // Lids at 630 K and 180 K are both beyond their limits (633 K, 178 K).
    const cooled = run(inputOf(unit, charged, { plenum_K: [630, 180] })).end_s;
    expect(warm).toBeGreaterThan(3600);
    // The same store but for the lids: a few minutes at another flow.
    expect(Math.abs(cooled - warm)).toBeLessThan(600);
  });

  it('hides an empty store no longer than it lasts', () => {
    const { end_s } = run(inputOf(unit, { hot: -0.5, cold: 0.8 }, { plenum_K: [720, 150] }));
    // Heat of the lid, and the ten minutes for which the outlets wait.
    expect(end_s).toBeLessThan(600);
  });
});
