import { describe, expect, it } from 'vitest';
import { FAULT_H, FAULT_KINDS } from '../../tools/score/own/faultKinds.js';
import { unitWith } from '../../tools/score/sensorSets.js';
import { applyFaults } from '../plant/faults.js';
import { syntheticSeries } from './syntheticSeries.js';

const unit = unitWith('all', 'class');
const { recording } = syntheticSeries(200, () => ({
  soc: 0.4,
  found_soc: 0.4,
  soc_sigma: 0.01,
  position_m: 3.6,
  found_position_m: 3.6,
}));
const seeds = Array.from({ length: 60 }, (_, i) => 1000 + i);
const thermocouples = unit.stores.flatMap((s) => s.strings.flatMap((t) => t.thermocouples));
const positionOf = new Map(thermocouples.map((t) => [t.id, t.position_m]));

describe.each(FAULT_KINDS)('fault: $words', (kind) => {
  const plans = seeds.map((seed) => kind.plan(unit, recording, seed));

  it('is the same for the same seed, falls on both stores and on many sensors', () => {
    expect(kind.plan(unit, recording, 1003)).toEqual(plans[3]);
    expect(new Set(plans.map((p) => p.store))).toEqual(new Set(['hot', 'cold']));
    expect(new Set(plans.flatMap((p) => p.sensors)).size).toBeGreaterThan(8);
  });

  it('changes the readings of the sensors it names from its hour on, and no others', () => {
    const groupOf = new Map(thermocouples.map((t) => [t.id, t.group]));
    for (const { fault, sensors } of plans) {
      // All different, none at the mirror point of a reversed reading; a frozen one moves later.
      const read = (at_s: number, stuck: Map<string, number>, by = 0) => {
        const values = Object.fromEntries(thermocouples.map((t, i) => [t.id, 400 + 0.5 * i + by]));
        const sound = { ...values };
        applyFaults(values, [fault], at_s, stuck, groupOf, []);
        return Object.keys(values).filter((id) => !Object.is(values[id], sound[id]));
      };
      const stuck = new Map<string, number>();
      expect(read(FAULT_H * 3600 - 60, stuck)).toEqual([]);
      read(FAULT_H * 3600, stuck);
      expect(read(FAULT_H * 3600 + 600, stuck, 20).sort()).toEqual([...sensors].sort());
    }
  });

  if (['stuck', 'reversed', 'swapped'].includes(kind.id)) {
    it('is put where the front comes along within the charge', () => {
      for (const { sensors } of plans) {
        const ahead = positionOf.get(sensors[0]!)! - 3.6;
        expect(ahead).toBeGreaterThanOrEqual(0.6);
        expect(ahead).toBeLessThanOrEqual(2.2);
      }
    });
  }
});
