import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { hold, startHold } from '../../../src/core/scan/hold.js';
import { thermocouple } from '../../adapters/recording/small.js';

const reporting = { kind: 'by_exception', deadband: 0.5, longest_silence_s: 90 } as const;
const unit = { channels: [thermocouple('quiet', { reporting }), thermocouple('steady')] };

describe('holding a silent channel', () => {
  it('carries on exactly what was last heard, up to the longest silence, and periodic ones never', () => {
    const step = fc.record({
      gap_s: fc.integer({ min: 1, max: 120 }),
      value: fc.option(fc.oneof(fc.double({ noNaN: true }), fc.constant(Number.NaN))),
    });
    fc.assert(
      fc.property(fc.array(step, { maxLength: 30 }), (steps) => {
        const state = startHold(unit);
        // Told apart from the code under test: the whole history is searched anew each time.
        const history: { at_s: number; value: number }[] = [];
        let now_s = 0;
        for (const { gap_s, value } of steps) {
          now_s += gap_s;
          const spoke = value !== null;
          if (spoke) history.push({ at_s: now_s, value });
          const values = Float64Array.of(value ?? Number.NaN, value ?? Number.NaN);
          const heard = Uint8Array.of(spoke ? 1 : 0, spoke ? 1 : 0);
          const held = hold(unit, state, now_s * 1000, values, heard);
          const last = history.at(-1);
          const valid = last !== undefined && now_s - last.at_s <= 90 && !Number.isNaN(last.value);
          expect(values[0]).toBe(valid ? last.value : Number.NaN);
          expect(held[0]).toBe(!spoke && valid ? 1 : 0);
          expect(values[1]).toBe(spoke ? value : Number.NaN);
          expect(held[1]).toBe(0);
        }
      }),
      { seed: 9 },
    );
  });

  it('refuses arrays of another length by name', () => {
    const state = startHold(unit);
    expect(() => hold(unit, state, 0, new Float64Array(3), new Uint8Array(2))).toThrow(/values/);
    expect(() => hold(unit, state, 0, new Float64Array(2), new Uint8Array(1))).toThrow(/heard/);
  });
});
