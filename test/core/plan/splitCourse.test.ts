import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { commandOf } from '../../../src/core/plan/command.js';
import { planContext } from '../../../src/core/plan/context.js';
import { cutAtEdges, cutCommand, energyBetween } from '../../../src/core/plan/course.js';
import type { Leg } from '../../../src/core/plan/leg.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import { unitOf } from '../track/plants.js';

/** A machine that ramps, starts and changes over, so that a cut falls into all of these. */
const plain = unitOf();
const unit = unitOf({
  limits: {
    ...plain.limits,
    operation: {
      ramp_W_s: { charge: 100, discharge: 50 },
      start: {
        warm: { time_s: 300, energy_J: 3e6 },
        cold: { time_s: 900, energy_J: 9e6 },
        cold_after_s: 7200,
      },
      change_over_s: 600,
    },
  },
});
const state = watchedUnit(unit, { hot: 0.45, cold: 0.45 }, 3);
const outlook = createOutlook(unitModel(unit), state);
const { before } = planContext(unitModel(unit), state);

const block = fc.record({
  mode: fc.constantFrom('charge', 'discharge', 'stand'),
  power_W: fc.integer({ min: 20e3, max: 90e3 }),
  quarters: fc.integer({ min: 1, max: 8 }),
});

function legsOf(blocks: readonly { mode: string; power_W: number; quarters: number }[]): Leg[] {
  let at = 0;
  return blocks.map(({ mode, power_W, quarters }) => {
    const from_s = at;
    at += quarters * 900;
    return {
      mode: mode as Leg['mode'],
      power_W: mode === 'stand' ? 0 : power_W,
      from_s,
      to_s: at,
    };
  });
}

describe('a schedule cut in two at the edge of a block', () => {
  /**
   * The step is a scheme of its own: a step that ended elsewhere would change temperatures by its
   * error of second order. Steps end at every edge of a piece, so both marches take the same ones
   * and the tolerance is 0; only net energy is summed up in another order (relative 2^-52 a piece).
   */
  it('ends the same as whole, to the bit', () => {
    let stops = 0;
    let within = 0;
    fc.assert(
      fc.property(
        fc.array(block, { minLength: 2, maxLength: 8 }),
        fc.nat({ max: 6 }),
        (blocks, n) => {
          const legs = legsOf(blocks);
          const end_s = legs.at(-1)!.to_s;
          const at_s = legs[n % (legs.length - 1)]!.to_s;
          // Start-ups and ramps that run over an edge end there too.
          const edges = legs.map(({ to_s }) => to_s);
          const command = cutAtEdges(commandOf(unit, legs, [], before, end_s), edges);
          const whole = outlook.march(command, {}, { beyond_s: 0 });
          const [first, second] = cutCommand(command, at_s);
          const half = outlook.march(first, {}, { beyond_s: 0 });
          const kept = structuredClone(half);
          const rest = outlook.march(second, {}, { beyond_s: 0, from: half });
          expect(half).toEqual(kept);
          expect(rest.end).toEqual(whole.end);
          stops += whole.episodes.filter(({ stopped_s }) => stopped_s !== null).length;
          within += half.running === null ? 0 : 1;
          // A stop that the second part finds just before the cut costs the first part's last step.
          const late = whole.episodes.find(
            ({ stopped_s }) => stopped_s !== null && stopped_s < at_s && at_s - stopped_s < 600,
          );
          if (late !== undefined) return;
          const sum =
            energyBetween(half.delivered, 0, at_s) + energyBetween(rest.delivered, at_s, end_s);
          const all = energyBetween(whole.delivered, 0, end_s);
          const pieces = command.pieces.length + end_s / 60;
          expect(Math.abs(sum - all)).toBeLessThan(pieces * 2 ** -52 * 90e3 * end_s);
        },
      ),
      { numRuns: 60, seed: 4 },
    );
    // The cuts fell into runs, and rules stopped some.
    expect(stops).toBeGreaterThan(5);
    expect(within).toBeGreaterThan(5);
  });

  it('falls where it is put within a ramp', () => {
    const legs = legsOf([
      { mode: 'discharge', power_W: 60e3, quarters: 4 },
      { mode: 'stand', power_W: 0, quarters: 1 },
    ]);
    const command = commandOf(unit, legs, [], { ...before, stood_s: 60 }, 4500);
    const ramp = command.pieces.find(({ purpose }) => purpose === 'ramp')!;
    const middle = (ramp.from_s + ramp.to_s) / 2;
    const [first, second] = cutCommand(command, middle);
    expect(first.pieces.at(-1)).toMatchObject({ to_s: middle, power1_W: ramp.power1_W / 2 });
    expect(second.pieces[0]).toMatchObject({ from_s: middle, power0_W: ramp.power1_W / 2 });
    expect(energyBetween([...first.pieces, ...second.pieces], 0, 4500)).toBeCloseTo(
      energyBetween(command.pieces, 0, 4500),
      3,
    );
  });
});
