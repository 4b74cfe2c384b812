import { beforeAll, describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { computeHours } from '../../../src/core/dispatch/hours.js';
import { createRoller } from '../../../src/core/dispatch/roller.js';
import { planContext } from '../../../src/core/plan/context.js';
import { offersOf } from '../../../src/core/plan/offers.js';
import { scheduleOf } from '../../../src/core/plan/schedule.js';
import { unitModel } from '../../../src/core/unitModel.js';
import type { UnitState } from '../../../src/core/unitState.js';
import { inputOf, watchedUnit } from '../dispatch/fullUnit.js';
import { coldStore, hotBed, hotStore, unitOf } from '../track/plants.js';

const PLENUM = {
  end_capacity_J_K: { charge_inlet: 200e3, discharge_inlet: 200e3 },
  end_volume_m3: { charge_inlet: 1, discharge_inlet: 1 },
};
const POWER = 60e3;
const FRONTS = { hot: 0.85, cold: 0.85 };
const H = 3.6e6;

function withMost(flow_max_kg_s: number): UnitDefinition {
  const plain = unitOf();
  const discharge = { ...plain.limits.discharge, flow_max_kg_s };
  const cold = coldStore();
  return unitOf({
    stores: [hotStore({ bed: hotBed(PLENUM) }), coldStore({ bed: { ...cold.bed, ...PLENUM } })],
    limits: { ...plain.limits, discharge },
  });
}

let watched: UnitState | null = null;

/** The unit with gas and steel under its lids that have cooled so far from 700 and 125 K. */
function stateOf(of: UnitDefinition, cooled: number | null): UnitState {
  // What a unit has watched does not hang on its greatest flow.
  watched ??= watchedUnit(of, FRONTS, 3);
  const state = structuredClone(watched);
  if (cooled !== null) state.plenum_K.splice(0, 2, 700 - 100 * cooled, 125 + 70 * cooled);
  return state;
}

/** What the first moment leaves of the power, over it. */
function firstMargin(of: UnitDefinition, cooled: number | null): number {
  const { start } = createRoller(inputOf(of, stateOf(of, cooled)), POWER).start();
  return (start[0]?.margin_W as number) / POWER;
}

/** Where a function that falls from above 0 to below passes 0. */
function zeroOf(f: (x: number) => number, from: number, to: number): number {
  let [low, high] = [from, to];
  for (let i = 0; i < 20; i++) {
    const middle = (low + high) / 2;
    if (f(middle) > 0) low = middle;
    else high = middle;
  }
  return low;
}

describe('a unit whose lids have cooled, near its greatest flow', () => {
  let of: UnitDefinition;
  let some: number;
  let much: number;
  beforeAll(() => {
    const needed = zeroOf((flow) => -firstMargin(withMost(flow), null), 0.2, 5);
    of = withMost(1.2 * needed);
    some = zeroOf((cooled) => firstMargin(of, cooled) + 0.12, 0, 2);
    much = zeroOf((cooled) => firstMargin(of, cooled) + 0.3, 0, 2);
  });

  it('has its hours, and is told to lack power at first', () => {
    const warm = computeHours(inputOf(of, stateOf(of, null)), POWER);
    const found = computeHours(inputOf(of, stateOf(of, some)), POWER);
    const { hours, first_minutes, energy_MWh_el } = found;
    expect(hours.p50).toBeGreaterThan(1);
    // The same stores but for their lids, which hold heat of a few minutes.
    expect(Math.abs(hours.p50 - warm.hours.p50)).toBeLessThan(0.2);
    expect(first_minutes?.lacking_MW).toBeCloseTo(0.12 * 0.06, 3);
    expect(first_minutes?.minutes).toBeGreaterThan(0);
    expect(first_minutes?.minutes).toBeLessThanOrEqual(10);
    const missing = hours.p50 * 0.06 - energy_MWh_el.p50;
    expect(missing).toBeCloseTo(first_minutes?.lacking_MWh_el as number, 9);
    // Less than if all of it lacked all the while.
    const { lacking_MW, minutes } = first_minutes as NonNullable<typeof first_minutes>;
    expect(missing).toBeLessThan((lacking_MW * minutes) / 60);
    expect(missing).toBeGreaterThan((lacking_MW * minutes) / 60 / 4);
  });

  it('has its hours as well where much is missing at first, and says how much', () => {
    const warm = computeHours(inputOf(of, stateOf(of, null)), POWER);
    const found = computeHours(inputOf(of, stateOf(of, much)), POWER);
    expect(Math.abs(found.hours.p50 - warm.hours.p50)).toBeLessThan(0.2);
    expect(found.first_minutes?.probability).toBeGreaterThan(0.9);
    expect(found.first_minutes?.lacking_MW).toBeGreaterThan(0.2 * 0.06);
    const [offer] = offer_(much);
    expect(offer?.blocks[0]?.whole.alone).toBeLessThan(0.05);
    expect(offer?.blocks[1]?.whole.alone).toBeGreaterThan(0.9);
  });

  const offer_ = (cooled: number | null) => {
    const context = planContext(unitModel(of), stateOf(of, cooled));
    return offersOf(context, {
      ...{ powers_W: [POWER], starts_ms: [H / 4], block_s: 900 },
      certainties: [0.5, 0.9],
    });
  };

  it('is offered with nearly all its energy, but not with its first block whole', () => {
    const [cooled] = offer_(some);
    const [warm] = offer_(null);
    expect(warm?.first_minutes).toBeUndefined();
    expect(warm?.blocks[0]?.whole.alone).toBeGreaterThan(0.99);
    const counts = cooled?.first_minutes?.probability as number;
    expect(counts).toBeGreaterThan(0.5);
    const [first, second] = cooled?.blocks ?? [];
    // The normal of that probability by 2048 points in layers.
    expect(Math.abs((first?.whole.alone as number) - (1 - counts))).toBeLessThan(0.03);
    expect(first?.whole.jointly).toBe(first?.whole.alone);
    expect(second?.whole.alone).toBeGreaterThan(0.9);
    // With all blocks before it, the first among them.
    expect(second?.whole.jointly).toBe(first?.whole.jointly);
    const whole = 0.06 / 4;
    expect(first?.mean_MWh_el).toBeLessThan(0.995 * whole);
    expect(first?.mean_MWh_el).toBeGreaterThan(0.9 * whole);
    // Energies at one certainty add up over the blocks.
    for (const [i, at] of (cooled?.at ?? []).entries()) {
      const sum = cooled?.blocks.reduce((s, block) => s + (block.at[i]?.energy_MWh_el ?? 0), 0);
      expect(sum).toBeCloseTo(at.energy_MWh_el, 9);
    }
  });

  it('leaves a schedule short by what is missing, in the block of its start alone', () => {
    const context = planContext(unitModel(of), stateOf(of, some));
    const { now_ms } = context;
    const block = (n: number) => ({
      ...({ mode: 'discharge', power_W: POWER } as const),
      ...{ from_ms: now_ms + (n * H) / 4, to_ms: now_ms + ((n + 1) * H) / 4 },
    });
    const found = scheduleOf(context, {
      ...{ blocks: [block(0), block(1)], certainty: 0.9, zone: null },
    });
    const [first, second] = found.blocks;
    const counts = found.runs[0]?.first_minutes?.probability as number;
    expect(counts).toBeGreaterThan(0.5);
    expect(Math.abs((first?.met_probability as number) - (1 - counts))).toBeLessThan(0.03);
    expect(second?.met_probability).toBeGreaterThan(0.99);
    expect(second?.expected_shortfall_MWh_el).toBeCloseTo(0, 9);
    const [run] = found.runs;
    const lack = run?.first_minutes?.lacking_MWh_el as number;
    expect(first?.expected_shortfall_MWh_el).toBeGreaterThan(0.5 * lack);
    expect(first?.expected_shortfall_MWh_el).toBeLessThan(2 * lack);
    expect(found.first_shortfall.certain?.cause).toBe('flow');
    expect(found.first_shortfall.certain?.time).toBe(run?.from);
    // What follows holds: the reserve is that of the stores.
    expect(run?.stops).toBeNull();
    const reserve = run?.reserve_hours.p50;
    expect(reserve === null || (reserve as number) > 0.5).toBe(true);
  });
});
