import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { StoreDefinition, StringDefinition } from '../../../src/core/definitions.js';
import type { TubeDrive } from '../../../src/core/track/tube.js';
import { weighSensors } from '../../../src/core/worth/sensorWorth.js';
import { mulberry } from '../../support/random.js';
import { hotBed, hotStore, modelOf, stringOf } from '../track/plants.js';
import { randomDrive, randomStore } from '../track/randomStore.js';
import { courseThrough, frontAt, weighed } from './courses.js';

/**
 * Relative room for round-off: a temperature's variance falls from that of half the span (217 K)^2 to
 * (0.05 K)^2, so 2e-16 of the first is 4e-9 of the last; some hundred updates add up to 4e-7.
 */
const ROUND_OFF = 1e-6;

/** Charge, stand, discharge of a bed 4 m long and 2 m2 wide. */
function cycle(steps: number, over: Partial<TubeDrive> = {}): TubeDrive[] {
  const drive = (flux: number, inlet_K: number): TubeDrive => ({
    massFlux_kg_m2s: flux,
    inlet_K,
    inletSigma_K: 0,
    ambient_K: 288.15,
    dt_s: 300,
    travelSigma_m: 0,
    ...over,
  });
  return [
    ...Array.from({ length: steps }, () => drive(0.25, 733.15)),
    ...Array.from({ length: steps / 2 }, () => drive(0, 733.15)),
    ...Array.from({ length: steps }, () => drive(-0.25, 298.15)),
  ];
}

const placed = (id: string, positions_m: readonly number[], group: string | null = null) => ({
  ...stringOf(id, positions_m.length, 4),
  thermocouples: positions_m.map((position_m, i) => ({ id: `${id}_${i + 1}`, position_m, group })),
});

describe('what thermocouples are worth, on drawn geometries', () => {
  // The flow goes on as it began: where the gas lag jumps again and again, the bound on what a
  // place's variance may grow to takes hold, and fewer readings may leave less room to grow.
  it('sigma of a string never falls when a thermocouple is lost, never rises when one is added', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1e6 }), (seed) => {
        const random = mulberry(seed);
        const store = randomStore(random);
        const one = randomDrive(store, random);
        const drives = Array.from({ length: 40 }, (_, i) => ({
          ...one,
          dt_s: [30, 60, 300][i % 3] as number,
        }));
        const course = courseThrough(frontAt(store, random()), drives, {
          loss_at: 15,
          weigh_from: 20,
        });
        const worth = weighed(store, course, { places: 2 });
        for (const string of worth.strings) {
          const { soc_sigma_rms: all, position_sigma_rms_m: front } = string.all;
          for (const lost of worth.sensors.filter((s) => s.string_id === string.id)) {
            expect(lost.string.soc_sigma_rms).toBeGreaterThanOrEqual(all * (1 - ROUND_OFF));
            expect(string.string.soc_sigma_rms).toBeGreaterThanOrEqual(
              lost.string.soc_sigma_rms * (1 - ROUND_OFF),
            );
            if (front === null) continue;
            expect(lost.string.position_sigma_rms_m).toBeGreaterThanOrEqual(
              front * (1 - ROUND_OFF),
            );
          }
          for (const more of string.one_more) {
            expect(more.string.soc_sigma_rms).toBeLessThanOrEqual(all * (1 + ROUND_OFF));
            if (front === null) continue;
            expect(more.string.position_sigma_rms_m).toBeLessThanOrEqual(front * (1 + ROUND_OFF));
          }
        }
      }),
      { numRuns: 12, seed: 20261201 },
    );
  });
});

describe('what a thermocouple is worth', () => {
  // None at the edge of a cell, which belongs to one side of it.
  const positions = [0.5, 1.25, 2.05, 2.75, 3.5];
  const storeOf = (strings: StringDefinition[], over: Partial<StoreDefinition> = {}) =>
    modelOf(hotStore({ strings, ...over }), { group_offset_sigma_K: 0 });
  const drives = [...cycle(20), ...cycle(20)];
  const when = { loss_at: 50, weigh_from: 60 };

  it('two at the same place are worth less each than one alone, and together more than either', () => {
    const alone = storeOf([placed('h', positions)]);
    const twins = storeOf([
      {
        ...placed('h', positions),
        thermocouples: [
          ...placed('h', positions).thermocouples.map((t, i) =>
            i === 2 ? { ...t, group: 'twins' } : t,
          ),
          { id: 'twin', position_m: 2.05, group: 'twins' },
        ],
      },
    ]);
    const course = courseThrough(frontAt(alone, 0.15), drives, { weigh_from: 60 });
    const one = weighed(alone, course).sensors.find((s) => s.id === 'h_3')!;
    const two = weighed(twins, course);
    const first = two.sensors.find((s) => s.id === 'h_3')!;
    const second = two.sensors.find((s) => s.id === 'twin')!;
    expect(first.rise).toBeCloseTo(second.rise, 6);
    expect(first.rise).toBeLessThan(0.5 * one.rise);
    const [both] = two.groups;
    expect(both).toMatchObject({ id: 'twins', thermocouples: 2, strings: ['h'] });
    expect(both!.rise).toBeGreaterThan(2 * first.rise);
    // Without both it is the string that has none there.
    expect(both!.string!.soc_sigma_rms / one.string.soc_sigma_rms).toBeCloseTo(1, 6);
  });

  it('a bed turned end for end, with its flow, gives the same worth to each place', () => {
    const wall = { wall_loss_W_m2K: 0.3, wall_capacity_J_m2K: 0 };
    const bed = hotBed({ ...wall, end_loss_W_m2K: { charge_inlet: 0.4, discharge_inlet: 0.2 } });
    const turnedBed = hotBed({
      ...wall,
      end_loss_W_m2K: { charge_inlet: 0.2, discharge_inlet: 0.4 },
    });
    const plain = storeOf([placed('h', positions)], { bed });
    const turned = storeOf(
      [
        placed(
          'h',
          positions.map((x) => 4 - x),
        ),
      ],
      { bed: turnedBed },
    );
    const start = frontAt(plain, 0.3);
    const course = courseThrough(start, drives, when);
    const back = courseThrough(
      start.map((h) => h.slice().reverse()),
      drives.map((d) => ({ ...d, massFlux_kg_m2s: -d.massFlux_kg_m2s })),
      when,
    );
    const a = weighed(plain, course, { places: 4 });
    const b = weighed(turned, back, { places: 4 });
    expect(b.sensors.map((s) => s.id)).toEqual(a.sensors.map((s) => s.id));
    for (const [i, s] of a.sensors.entries()) {
      expect(b.sensors[i]!.rise / s.rise).toBeCloseTo(1, 5);
    }
    const more = b.strings[0]!.one_more.map((m) => m.rise).reverse();
    for (const [i, m] of a.strings[0]!.one_more.entries()) {
      expect(more[i]! / m.rise).toBeCloseTo(1, 5);
    }
    expect(a.sensors[0]!.rise).toBeGreaterThan(10 * ROUND_OFF);
  });

  it('a standing bed that is symmetric gives the same worth to both sides of its middle', () => {
    // Uniform in temperature: nothing tells its ends apart.
    const bed = hotBed({ end_loss_W_m2K: { charge_inlet: 0.2, discharge_inlet: 0.2 } });
    const store = storeOf([placed('h', [0.4, 1.1, 2, 2.9, 3.6])], { bed });
    const standing = cycle(20).map((d) => ({ ...d, massFlux_kg_m2s: 0 }));
    const uniform = frontAt(store, 30);
    const { sensors } = weighed(
      store,
      courseThrough(uniform, standing, { loss_at: 10, weigh_from: 20 }),
    );
    const rise = (id: string) => sensors.find((s) => s.id === id)!.rise;
    expect(rise('h_5') / rise('h_1')).toBeCloseTo(1, 5);
    expect(rise('h_4') / rise('h_2')).toBeCloseTo(1, 5);
    expect(rise('h_1')).toBeGreaterThan(10 * ROUND_OFF);
  });

  it('a card of two strings costs the store more than its part on either', () => {
    const strings = ['a', 'b'].map((id, k) => ({
      ...placed(id, positions, null),
      radius_m: 0.4 * k,
      area_share: 0.5,
      thermocouples: placed(id, positions).thermocouples.map((t, i) => ({
        ...t,
        group: i === 2 ? 'card' : null,
      })),
    }));
    const store = storeOf(strings);
    const worth = weighed(store, courseThrough(frontAt(store, 0.15), drives, when));
    const [card] = worth.groups;
    expect(card).toMatchObject({ thermocouples: 2, strings: ['a', 'b'], string: null });
    for (const id of ['a_3', 'b_3']) {
      expect(card!.rise).toBeGreaterThan(worth.sensors.find((s) => s.id === id)!.rise);
    }
  });

  it('one that is out of use is weighed as repaired, to the sigma of a string that had it', () => {
    const store = storeOf([placed('h', positions)]);
    const course = courseThrough(frontAt(store, 0.15), drives);
    const all = weighed(store, course);
    const without = weighed(store, course, { out_of_use: new Set(['h_2']) });
    const out = without.sensors.find((s) => s.id === 'h_2')!;
    expect(out.in_use).toBe(false);
    expect(out.rise).toBeLessThan(0);
    expect(out.store).toEqual(all.all);
    expect(without.all).toEqual(all.sensors.find((s) => s.id === 'h_2')!.store);
  });

  it('one more at the place of a lost one gives back what an unknown offset allows', () => {
    const store = storeOf([placed('h', [0.5, 1.25, 2, 2.75, 3.5])]);
    const course = courseThrough(frontAt(store, 0.15), drives);
    const out_of_use = new Set(['h_3']);
    const { strings, sensors } = weighed(store, course, { out_of_use, places: 1 });
    // The middle of the bed, where h_3 stands: the same prior, so the same gain.
    const [more] = strings[0]!.one_more;
    expect(more!.position_m).toBe(2);
    expect(more!.rise).toBeCloseTo(sensors.find((s) => s.id === 'h_3')!.rise, 9);
  });

  it('tells its progress from nothing to about all, and refuses what it cannot weigh', () => {
    const store = storeOf([placed('h', positions)]);
    const course = courseThrough(frontAt(store, 0.15), drives, when);
    const options = { places: 3, out_of_use: new Set<string>() };
    const told = [...weighSensors(store, 0, course, options)];
    expect(told).toHaveLength(drives.length);
    expect(told.every((share, i) => i === 0 || share > told[i - 1]!)).toBe(true);
    expect(told.at(-1)).toBeGreaterThan(0.8);
    expect(told.at(-1)).toBeLessThanOrEqual(1);
    const run = (over: object, s = 0) => [
      ...weighSensors(store, s, { ...course, ...over }, options),
    ];
    expect(() => run({ weigh_from: drives.length })).toThrow(/weigh_from = 100/);
    expect(() => run({ loss_at: 70 })).toThrow(RangeError);
    expect(() => run({}, 1)).toThrow(/store 1/);
  });
});
