import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { configureOf } from '../../../src/core/tune/configure.js';
import type { TuneRow } from '../../../src/core/tune/result.js';
import { demoUnit } from '../../support/truthRun.js';
import { tuneRows } from '../../support/tuneRows.js';

const unit: UnitDefinition = demoUnit();
const rows = tuneRows(unit);
const open = (store: string | null, name: string): TuneRow[] =>
  rows.map((row) =>
    row.store === store && row.name === name
      ? { ...row, determined: false, reason: 'tells_less_than_known' }
      : row,
  );

describe('what a recording gives the configuration', () => {
  it('is the work over the mean way with these heat capacities', () => {
    const { work_factor, stores } = configureOf(unit, rows, [true, true]);
    // Ways of 0.98 in both stores, heat capacities of 1.05.
    expect(work_factor.charge).toBeCloseTo(0.9 / (0.98 * 1.05), 12);
    expect(work_factor.discharge).toBeCloseTo(1.1 / (0.98 * 1.05), 12);
    expect(stores.map((store) => store.heat_capacity)).toEqual([1.05, 1.05]);
  });

  it('leaves out a work factor whose work is not determined, power read or not', () => {
    const { work_factor } = configureOf(unit, open(null, 'work_charge'), [true, true]);
    expect(work_factor.charge).toBeNull();
    expect(work_factor.discharge).not.toBeNull();
  });

  it('leaves out both work factors where the way in any store is not determined', () => {
    const { work_factor, stores } = configureOf(unit, open('cold', 'front_travel'), [true, true]);
    expect(work_factor).toEqual({ charge: null, discharge: null });
    expect(stores[1]!.heat_capacity).toBe(1.05);
  });

  it('leaves out all of a store whose search has not settled, and the work factors with it', () => {
    const { work_factor, stores } = configureOf(unit, rows, [true, false]);
    expect(work_factor).toEqual({ charge: null, discharge: null });
    expect(stores[0]!.heat_transfer).toBe(1.2);
    const { id, ...factors } = stores[1]!;
    expect(id).toBe('cold');
    expect(new Set(Object.values(factors))).toEqual(new Set([null]));
  });
});
