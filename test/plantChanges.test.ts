import { describe, expect, it } from 'vitest';
import { DEMO_GEOMETRY } from './plant/demoGeometry.js';
import type { PlantChange } from './plant/faults.js';
import { type PlantGeometry, withTopThermocouples } from './plant/geometry.js';
import { createTruth, type Segment } from './plant/truth.js';

const GEOMETRY: PlantGeometry = { ...DEMO_GEOMETRY, scan_period_s: 60 };
const H = 3600;
const NOMINAL = { physics: 'nominal', machine: 'known', sensors: 'exact', meter: 'exact' } as const;
const STAND: Segment[] = [{ mode: 'stand', duration_s: 2 * H }];
const CHARGE: Segment[] = [{ mode: 'charge', flow_kg_s: 18, duration_s: 0.5 * H }];

function plant(changes: readonly PlantChange[] = [], geometry = GEOMETRY) {
  return createTruth({
    ...NOMINAL,
    seed: 7,
    geometry,
    changes,
    resolution: { cells: 50, shells: 1 },
    initial: { hot: { front_m: 5, width_m: 0.6 }, cold: { front_m: 5, width_m: 0.6 } },
  });
}

describe('changes of the finer plant', () => {
  it('lose twice the heat through mantle and ends where the insulation is half as good', () => {
    const lost = (changes: PlantChange[]) => {
      const a = plant(changes);
      a.run(STAND, () => undefined);
      return a.stores.map((s) => s.bed.lostHeat_J);
    };
    const [sound, worse] = [
      lost([]),
      lost([{ kind: 'insulation', at_s: 0, store: 'hot', factor: 2 }]),
    ];
    // Less than twice, as wall and lids cool sooner: by 0.6 W/m2K over 12 of the rock, and a third more.
    expect(worse[0]! / sound[0]!).toBeGreaterThan(1.85);
    expect(worse[0]! / sound[0]!).toBeLessThan(2);
    expect(worse[1]).toBe(sound[1]);
  });

  it('raise the pressure drop by dust always, by frost only while rock is cold enough', () => {
    const drop = (changes: PlantChange[]) => {
      const a = plant(changes);
      const { readings } = a.run(CHARGE).scans.at(-1)!;
      return [readings.hot_drop!, readings.cold_drop!] as const;
    };
    const frost = (below_K: number): PlantChange[] => [
      { kind: 'pressure_drop', at_s: 0, store: 'cold', factor: 1.3, below_K },
    ];
    const sound = drop([]);
    const dusty = drop([{ kind: 'pressure_drop', at_s: 0, store: 'hot', factor: 1.5 }]);
    expect(dusty[0] / sound[0]).toBeCloseTo(1.5, 9);
    expect(dusty[1]).toBe(sound[1]);
    // The cold end is at -129 degC.
    expect(drop(frost(250))[1] / sound[1]).toBeCloseTo(1.3, 9);
    expect(drop(frost(140))[1]).toBe(sound[1]);
  });

  it('let gas out over a while: pressure falls with it, and the same flow meets thinner gas', () => {
    const loss = { kind: 'gas_loss', at_s: 0, store: 'hot', share: 0.1, ramp_s: 0.5 * H } as const;
    const [a, sound] = [plant([loss]), plant()];
    const gone = a.run([...CHARGE, ...CHARGE]).scans;
    const full = sound.run([...CHARGE, ...CHARGE]).scans;
    const ratio = (n: number, id: string) => gone[n]!.readings[id]! / full[n]!.readings[id]!;
    expect(ratio(14, 'hot_pressure')).toBeCloseTo(0.95, 2);
    expect(ratio(59, 'hot_pressure')).toBeCloseTo(0.9, 9);
    expect(ratio(59, 'hot_drop')).toBeCloseTo(1 / 0.9, 9);
    expect(ratio(59, 'cold_pressure')).toBe(1);
    expect(a.truth().stores).toEqual(sound.truth().stores);
  });

  it('turn the weather, for the whole plant', () => {
    const a = plant([{ kind: 'weather', at_s: H, offset_K: -8, ramp_s: 2 * H }]);
    const { truths } = a.run([{ mode: 'stand', duration_s: 4 * H }]);
    const at = (hour: number) => truths[60 * hour - 1]!.ambient_K;
    expect([at(1), at(2), at(3), at(4)].map((K) => Math.round(10 * (K - at(1))) / 10)).toEqual([
      0, -4, -8, -8,
    ]);
  });

  it('go on in a copy, and begin in it without touching what it was copied from', () => {
    const changes: PlantChange[] = [
      { kind: 'insulation', at_s: 0, store: 'hot', factor: 2 },
      { kind: 'pressure_drop', at_s: 0, store: 'cold', factor: 1.5 },
      { kind: 'gas_loss', at_s: 0, store: 'cold', share: 0.1 },
      { kind: 'settled', at_s: 0, store: 'hot', depth_m: 0.6 },
    ];
    const a = plant();
    a.run(CHARGE, () => undefined);
    const changed = a.clone({ changes });
    const fromCopy = changed.run(CHARGE);
    expect(a.stores[0]!.bed.lossFactor).toBe(1);
    expect(a.run(CHARGE)).not.toEqual(fromCopy);
    expect(changed.clone({ changes: [] }).run(CHARGE)).toEqual(changed.run(CHARGE));
  });

  it('uncover, by 150 mm of settling, a thermocouple 0.10 m below the top and no other', () => {
    const geometry = withTopThermocouples(GEOMETRY, 0.1);
    for (const [store, top, gas, next] of [
      ['hot', 'hot_axis_00', 'hot_gas_top', 'hot_axis_01'],
      ['cold', 'cold_rim_15', 'cold_gas_top', 'cold_rim_14'],
    ] as const) {
      const run = (changes: PlantChange[]) => plant(changes, geometry).run(STAND).scans.at(-1)!;
      const sunk = run([{ kind: 'settled', at_s: 0, store, depth_m: 0.15 }]).readings;
      const sound = run([]).readings;
      expect(Math.abs(sunk[top]! - sunk[gas]!)).toBeLessThan(1);
      expect(sunk[top]).not.toBe(sound[top]);
      expect(sunk[next]).toBe(sound[next]);
    }
    expect(geometry.stores[1]!.strings[2]!.thermocouples.at(-1)!.position_m).toBeCloseTo(9.1, 12);
  });
});
