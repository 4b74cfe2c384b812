import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { unitWith } from '../../tools/score/sensorSets.js';
import { StraightLines } from './straightLines.js';

const unit = unitWith('all', 'class');
const index = new Map(unit.channels.map((c, i) => [c.id, i]));

/** A scan in which a store's profile is T(x), with flow, power and gas at the ends of the profile. */
function scanOf(
  of: UnitDefinition,
  profile: (store: string, x_m: number) => number,
  flow_kg_s = 0,
  power_W = 0,
): Float64Array {
  const values = new Float64Array(of.channels.length).fill(Number.NaN);
  const set = (id: string, value: number) => {
    values[index.get(id)!] = value;
  };
  for (const store of of.stores) {
    for (const t of store.strings.flatMap((s) => s.thermocouples)) {
      set(t.id, profile(store.id, t.position_m));
    }
    for (const c of of.channels) {
      if (c.role.kind !== 'gas_temperature' || c.role.store !== store.id) continue;
      set(c.id, profile(store.id, c.role.end === 'charge_inlet' ? 0 : store.bed.length_m));
    }
  }
  set('flow', flow_kg_s);
  set('power', power_W);
  return values;
}

const reference = (store: string, charged: boolean) => {
  const found = unit.stores.find((s) => s.id === store)!;
  return (found.kind === 'hot') === charged ? found.reference_hot_K : found.reference_cold_K;
};

/** Charged up to a point, discharged behind it, with a straight ramp of some length between. */
const ramp = (at_m: number, length_m: number) => (store: string, x_m: number) => {
  const share = Math.min(Math.max((at_m - x_m) / length_m + 0.5, 0), 1);
  const empty = reference(store, false);
  return empty + share * (reference(store, true) - empty);
};

describe('straight lines', () => {
  it('find a full store full and an empty one empty', () => {
    const lines = new StraightLines(unit);
    lines.take(
      scanOf(unit, (s) => reference(s, true)),
      60,
    );
    for (const { id } of unit.stores) expect(lines.soc(id)).toBeCloseTo(1, 12);
    lines.take(
      scanOf(unit, (s) => reference(s, false)),
      60,
    );
    for (const { id } of unit.stores) expect(lines.soc(id)).toBeCloseTo(0, 12);
  });

  it('sum the heat of a profile that is straight between the thermocouples as its integral', () => {
    const lines = new StraightLines(unit);
    // From inlet to outlet, so that no thermocouple is a corner.
    const line = ramp(4.6, 9.2);
    lines.take(scanOf(unit, line, 10, 1e6), 60);
    for (const store of unit.stores) {
      const { solid, length_m } = store.bed;
      const [empty, full] = [reference(store.id, false), reference(store.id, true)];
      const count = 20_000;
      let sum = 0;
      for (let i = 0; i < count; i++) {
        const T = line(store.id, ((i + 0.5) * length_m) / count);
        sum += (solid.enthalpy(T) - solid.enthalpy(empty)) / count;
      }
      const exact = sum / (solid.enthalpy(full) - solid.enthalpy(empty));
      // Enthalpy by straight lines over 1 K and 300 midpoints: below 1e-5 for a c that doubles at most.
      expect(lines.soc(store.id)).toBeCloseTo(exact, 5);
    }
  });

  it('pass over a missing reading and one that no bed can have', () => {
    const line = ramp(4.6, 9.2);
    const sound = new StraightLines(unit);
    sound.take(scanOf(unit, line, 10, 1e6), 60);
    const faulty = new StraightLines(unit);
    const values = scanOf(unit, line, 10, 1e6);
    values[index.get('hot_axis_05')!] = Number.NaN;
    values[index.get('hot_rim_09')!] = 1573;
    faulty.take(values, 60);
    // The profile is straight across the gaps.
    expect(faulty.soc('hot')).toBeCloseTo(sound.soc('hot'), 12);
  });

  it('keep their last figure through a gap', () => {
    const lines = new StraightLines(unit);
    lines.take(scanOf(unit, ramp(4.6, 2)), 60);
    const before = lines.soc('hot');
    lines.take(new Float64Array(unit.channels.length).fill(Number.NaN), 60);
    expect(lines.soc('hot')).toBe(before);
  });

  it('reckon hours as heat over the rated rate before any discharge', () => {
    const lines = new StraightLines(unit);
    lines.take(
      scanOf(unit, (s) => reference(s, true)),
      60,
    );
    expect(lines.hours(unit.rated_power_W)).toBeCloseTo(unit.rated_hours, 9);
    expect(lines.hours(unit.rated_power_W / 2)).toBeCloseTo(2 * unit.rated_hours, 9);
  });

  it('take the heat per electricity from the last discharge, of the store that is empty first', () => {
    const lines = new StraightLines(unit);
    const power = unit.rated_power_W;
    const minutes = 120;
    // The front goes back by 3 m in two hours at rated power, by 4 m in the cold store.
    const at = (m: number) => (store: string, x: number) =>
      ramp(store === 'hot' ? 8 - (3 * m) / minutes : 8 - (4 * m) / minutes, 1.5)(store, x);
    lines.take(scanOf(unit, at(0)), 60);
    for (let m = 0; m <= minutes; m++) lines.take(scanOf(unit, at(m), -15, -power), 60);
    const left = unit.stores.map(({ id }) => {
      const from = new StraightLines(unit);
      from.take(scanOf(unit, at(0), -15, -power), 60);
      return (2 * lines.soc(id)) / (from.soc(id) - lines.soc(id));
    });
    expect(lines.hours(power)).toBeCloseTo(Math.min(...left), 9);
    expect(lines.hours(power / 2)).toBeCloseTo(2 * Math.min(...left), 9);
  });
});
