import { describe, expect, it } from 'vitest';
import { BRANCHES, GEOMETRY, leadSegments, waySegments } from '../../tools/watch/branches.js';
import { branchOff, recordPlant, startPlant } from '../../tools/watch/plantRun.js';
import { planOf } from '../../tools/watch/watchTruth.js';

describe('truths of the watch', () => {
  it('branch off at the scan that they come from, and differ by their fault alone', () => {
    const plant = startPlant(1, GEOMETRY, []);
    const run = [{ mode: 'charge', power_W: 2e6, duration_s: 300 }] as const;
    const lead = recordPlant(plant, run);
    const at_s = plant.elapsed_s;
    const step = { kind: 'meter_step', at_s, factor: 0.93 } as const;
    const faulty = recordPlant(branchOff(plant, [], [step]), run);
    const sound = recordPlant(plant, run);
    expect(faulty.time_ms(0)).toBe(lead.time_ms(lead.header.scans));
    expect(faulty.time_ms(0)).toBe(sound.time_ms(0));
    for (let n = 0; n < sound.header.scans; n++) {
      expect(faulty.reading('flow', n) / sound.reading('flow', n)).toBeCloseTo(0.93, 6);
      for (const id of ['hot_axis_00', 'cold_drop', 'hot_gas_top'])
        expect(faulty.reading(id, n)).toBe(sound.reading(id, n));
      expect(faulty.truth('hot.soc', n)).toBe(sound.truth('hot.soc', n));
    }
  });

  it('have every fault set in with the end of what comes before it', () => {
    const length = (seed: number, way: boolean) =>
      [...leadSegments(seed), ...(way ? waySegments(seed) : [])].reduce(
        (sum, s) => sum + 60 * Math.round(s.duration_s / 60),
        0,
      );
    for (const { id, onset } of BRANCHES) {
      const { before, changes, faults } = planOf(3, id);
      expect(before.length).toBe(onset === 'way' ? 2 : 1);
      const [only] = [...changes, ...faults];
      expect(changes.length + faults.length).toBe(1);
      expect(only?.at_s).toBe(length(3, onset === 'way'));
    }
    expect(planOf(3, 'weeks').changes.length).toBeGreaterThan(2);
    expect(() => planOf(3, 'moths')).toThrow(RangeError);
  });
});
