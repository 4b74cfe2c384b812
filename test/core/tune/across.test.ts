import { describe, expect, it } from 'vitest';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import { conductAcross } from '../../../src/core/tune/across.js';
import { placeOf, ringsOf } from '../../../src/core/tune/rings.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { airUnit } from './ownModel.js';

const store = unitModel(airUnit()).stores[0]!;
const rings = ringsOf(store);
const count = rings.string.length;

describe('rings', () => {
  it('fill the bed, one string each, thinner towards the wall', () => {
    expect(rings.share.reduce((a, b) => a + b, 0)).toBeCloseTo(1, 12);
    expect(rings.edge_m[count - 1]).toBeCloseTo(store.store.bed.diameter_m / 2, 12);
    const thickness = (r: number) => rings.edge_m[r]! - rings.edge_m[r - 1]!;
    for (let r = 3; r < count; r++) expect(thickness(r)).toBeLessThan(thickness(r - 1));
  });

  it('put a string between the two of its rings around it', () => {
    store.store.strings.forEach((string, k) => {
      const { inner, outer, weight } = placeOf(rings, k);
      expect(rings.string[inner]).toBe(k);
      expect(rings.string[outer]).toBe(k);
      if (weight === 0) return;
      const radius = (1 - weight) * rings.middle_m[inner]! + weight * rings.middle_m[outer]!;
      expect(radius).toBeCloseTo(string.radius_m, 12);
    });
  });
});

describe('heat across the bed', () => {
  it('leaves one ring and enters another, the wall, or ambient: nothing is lost', () => {
    const cells = 4;
    const at = (r: number, i: number) => 500 + 40 * r - 25 * i;
    const enthalpy = Array.from({ length: count }, (_, r) =>
      Float64Array.from({ length: cells }, (_, i) => enthalpyAt(store.tables, at(r, i))),
    );
    const steel = new Float64Array(cells).fill(420);
    const tables = enthalpy.map(() => store.tables);
    const radius = store.store.bed.diameter_m / 2;
    const heat = () =>
      enthalpy.reduce((sum, row, r) => sum + rings.share[r]! * row.reduce((a, b) => a + b, 0), 0);
    const before = heat();
    const steelBefore = steel.reduce((a, b) => a + b, 0);
    const capacity = 59e3;
    for (let n = 0; n < 20; n++) {
      const temperature = enthalpy.map((row) => row.map((H) => temperatureAt(store.tables, H)));
      conductAcross(rings, tables, enthalpy, temperature, steel, {
        steel_J_m2K: capacity,
        loss_W_m2K: 0,
        ambient_K: 285,
        massFlux_kg_m2s: 0.1,
        dt_s: 300,
      });
    }
    // Without losses: what the bed gave, per area of cross-section, went into the wall's steel.
    const given = before - heat();
    const taken = (2 / radius) * capacity * (steel.reduce((a, b) => a + b, 0) - steelBefore);
    // Bed temperatures are those of the step's start in both: identical up to rounding of 1e9 J/m3.
    expect(given / taken).toBeCloseTo(1, 6);
  });
});
