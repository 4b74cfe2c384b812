import { describe, expect, it } from 'vitest';
import { unitWith } from '../../tools/score/sensorSets.js';
import { TRUTH_COLUMNS, truthRow } from '../../tools/score/truthColumns.js';
import { columnOf, truthGeometry, withTwins } from '../../tools/score/truthPlant.js';
import { DEMO_GEOMETRY } from '../plant/demoGeometry.js';
import { createTruth } from '../plant/truth.js';

const COARSE = { cells: 100, shells: 2 };
const charge = [{ mode: 'charge', power_W: 2.7e6, duration_s: 3600 }] as const;

function run() {
  const plant = createTruth({
    seed: 31,
    geometry: truthGeometry(),
    resolution: COARSE,
    adjust: withTwins,
  });
  return { plant, ...plant.run(charge) };
}

const { plant, scans, truths } = run();

describe('the truth that serves all sensor sets', () => {
  it('has the physics of the plain plant, to the last bit', () => {
    const plain = createTruth({
      seed: 31,
      geometry: { ...DEMO_GEOMETRY, scan_period_s: 60 },
      resolution: COARSE,
    });
    const { hot, cold } = plain.run(charge).truths.at(-1)!.stores;
    expect(truths.at(-1)!.stores.hot!.soc).toBe(hot!.soc);
    expect(truths.at(-1)!.stores.cold!.fronts).toEqual(cold!.fronts);
  });

  it.each(['all', 'five', 'three'] as const)(
    'reads every thermocouple of the set %s with both kinds of errors',
    (set) => {
      for (const errors of ['independent', 'class'] as const) {
        const ids = unitWith(set, errors)
          .stores.flatMap((s) => s.strings.flatMap((t) => t.thermocouples))
          .map((t) => columnOf(t.id, errors));
        expect(ids.length).toBe({ all: 84, five: 10, three: 6 }[set]);
        for (const id of ids) expect(scans[0]!.readings[id], id).toSatisfy(Number.isFinite);
      }
    },
  );

  it('gives twins the same offset, lag and mixture, and only one of them the errors of the class', () => {
    const { thermocouples, groups } = plant.draw;
    for (const [id, own] of Object.entries(thermocouples)) {
      if (id.endsWith('~class')) continue;
      const twin = thermocouples[columnOf(id, 'class')]!;
      const { gain, position_error_m, ...same } = own;
      expect([gain, position_error_m]).toEqual([0, 0]);
      expect(twin).toMatchObject(same);
      expect(Math.abs(twin.gain)).toBeGreaterThan(0);
      expect(Math.abs(twin.position_error_m)).toBeGreaterThan(0);
    }
    expect(Object.keys(groups)).toHaveLength(6);
    for (const store of plant.geometry.stores) {
      for (const string of store.strings) {
        const twin = string.id.endsWith('~class');
        for (const t of string.thermocouples) expect(t.group === null).toBe(!twin);
      }
    }
  });

  it('places the single string at the area-mean radius, its thermocouples in equal parts', () => {
    for (const store of unitWith('five', 'class').stores) {
      const [string] = store.strings;
      expect(string!.area_share).toBe(1);
      // Mean of r over the area of a circle: 2 R/3.
      expect(string!.radius_m).toBeCloseTo(store.bed.diameter_m / 3, 12);
      const at = string!.thermocouples.map((t) => t.position_m);
      expect(at[0]).toBeCloseTo(store.bed.length_m / 10, 12);
      expect(at[4]! + at[0]!).toBeCloseTo(store.bed.length_m, 12);
    }
  });
});

describe('the columns of the truth', () => {
  const row = truthRow(plant, truths.at(-1)!);
  const value = (name: string) => row[TRUTH_COLUMNS.indexOf(name)]!;

  it('are as many as the values of a row, and hold what they say', () => {
    expect(row).toHaveLength(TRUTH_COLUMNS.length);
    const { hot, cold } = truths.at(-1)!.stores;
    expect(value('mode')).toBe(1);
    expect(value('hot.soc')).toBe(hot!.soc);
    expect(value('cold.stored_MWh_th')).toBe(cold!.stored_MWh_th);
    expect(value('cold.position_0')).toBe(cold!.fronts[0]!.position_m);
    expect(value('hot.width_0')).toBe(hot!.fronts[0]!.width_m);
    expect(value('hot.position_1')).toBeNaN();
    expect(value('cold.flow_rim')).toBe(cold!.strings.find((s) => s.id === 'rim')!.flow_factor);
  });

  it('see the rock along the strings close to the store, and exactly where all rings are alike', () => {
    const drawn = Math.abs(value('hot.seen_one') - value('hot.soc'));
    expect(drawn).toBeGreaterThan(0);
    expect(drawn).toBeLessThan(0.02);
    const even = createTruth({
      seed: 31,
      geometry: truthGeometry(),
      resolution: COARSE,
      physics: 'nominal',
      adjust: withTwins,
    });
    const truth = even.truth();
    const start = truthRow(even, truth);
    // Filled alike in all rings; the shells of the rock carry the table's rounding.
    expect(start[TRUTH_COLUMNS.indexOf('hot.seen_all')]).toBeCloseTo(truth.stores.hot!.soc, 9);
    expect(start[TRUTH_COLUMNS.indexOf('cold.seen_one')]).toBeCloseTo(truth.stores.cold!.soc, 9);
  });
});
