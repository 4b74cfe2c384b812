import { describe, expect, it } from 'vitest';
import { createBedWork, stepBed } from '../../../../src/core/bed/kernel.js';
import { temperatureAt } from '../../../../src/core/bed/tables.js';
import type { UnitDefinition } from '../../../../src/core/definitions.js';
import { SETTLING } from '../../../../src/core/watch/indicators/settling.js';
import { normals } from '../normals.js';
import { demo, Rig } from './rig.js';

/** The demonstration with its topmost thermocouples at 0.1 m. */
const TOP: UnitDefinition = {
  ...demo,
  stores: demo.stores.map((store) => ({
    ...store,
    strings: store.strings.map((string) => ({
      ...string,
      thermocouples: string.thermocouples.map((t, i) => {
        const last = string.thermocouples.length - 1;
        if (store.kind === 'hot') return i === 0 ? { ...t, position_m: 0.1 } : t;
        return i === last ? { ...t, position_m: store.bed.length_m - 0.1 } : t;
      }),
    })),
  })),
};
const FIRST = ['hot_axis_01', 'hot_middle_01', 'hot_rim_01'];
const SECOND = ['hot_axis_02', 'hot_middle_02', 'hot_rim_02'];

/** Rests of a hot store whose gas under the lid cools by 18 K; `bare` thermocouples hang in it. */
function rests(unit: UnitDefinition, seed: number) {
  const rig = new Rig(SETTLING, unit);
  rig.fill(0, () => 730);
  const z = normals(seed);
  const offset = new Map([...FIRST, ...SECOND].map((id) => [id, 1.5 * z()]));
  const rest = (hours: number, bare: readonly string[], falls_K = 18) => {
    rig.step({ mode: 'charge', flow_kg_s: 18 });
    return rig.run(hours, (t) => {
      const gas = 730 - falls_K * (1 - Math.exp(-t / 1.2));
      const values: Record<string, number> = { hot_gas_top: gas + 0.2 * z() };
      for (const [id, off] of offset) {
        const seen = bare.includes(id) ? gas : 730 - 0.6 * t;
        values[id] = seen + off + 0.15 * z();
      }
      return { mode: 'stand', values };
    })[0]!;
  };
  return { rig, rest };
}

describe('settling', () => {
  it('is found in one rest where all topmost thermocouples hang in gas, and says between which', () => {
    const { rest } = rests(TOP, 1);
    expect(rest(2, [])).toMatchObject({ state: 'normal', value: 0, limit: 0.1 });
    const sunk = rest(2, FIRST);
    expect(sunk).toMatchObject({ state: 'degraded', score: 1, unit: 'm' });
    expect(sunk.value!).toBeCloseTo(0.1, 6);
    expect(sunk.sentence).toMatch(/hot_axis_01, .* hang in gas.*sunk by 0\.10 to 1\.09 m/);
    expect(rest(2, [...FIRST, ...SECOND]).value!).toBeCloseTo(1.09, 6);
  });

  it('takes two rests or more for one string alone', () => {
    const { rest } = rests(TOP, 2);
    expect(rest(1, ['hot_rim_01']).state).toBe('normal');
    rest(2, ['hot_rim_01']);
    const sunk = rest(2, ['hot_rim_01']);
    expect(sunk.state).toBe('degraded');
    expect(sunk.sentence).toMatch(/hot_rim_01 hangs in gas/);
    expect(sunk.sentence).not.toMatch(/axis/);
  });

  it('stays quiet over healthy rests, and is not exercised where gas and rock stay together', () => {
    const { rest } = rests(TOP, 3);
    expect(rest(3, [], 2)).toMatchObject({ state: 'undetermined', reason: 'not_exercised' });
    for (let n = 0; n < 15; n++) expect(rest(2, [])).toMatchObject({ state: 'normal', score: 0 });
  });

  it('is not misled where, over a day and a half, gas and rock cool together faster than modelled', () => {
    const { rig } = rests(TOP, 7);
    const z = normals(8);
    for (let n = 0; n < 3; n++) {
      rig.step({ mode: 'charge', flow_kg_s: 18 });
      const [view] = rig.run(36, (t) => {
        const rock = 730 - 1.2 * t;
        const values = Object.fromEntries(FIRST.map((id) => [id, rock + 0.15 * z()]));
        return {
          mode: 'stand',
          values: { ...values, hot_gas_top: rock - 18 * (1 - Math.exp(-t)) - t },
        };
      });
      expect(view).toMatchObject({ state: 'normal', score: 0 });
    }
  });

  it('says where the topmost thermocouple hangs too deep, and goes by the judgement there', () => {
    const { rig, rest } = rests(demo, 4);
    const view = rest(2, []);
    expect(view).toMatchObject({ state: 'undetermined', reason: 'not_instrumented', limit: 0.45 });
    expect(view.sentence).toMatch(/topmost thermocouple hangs 0\.45 m below/);
    rig.state.stores[0]!.sensors[0]![0]!.verdict = 'uncovered';
    expect(rest(1, [])).toMatchObject({ state: 'degraded', value: 0.45 });
  });
});

const COLD_TOP = ['cold_axis_14', 'cold_middle_14', 'cold_rim_14'];

describe('gas that begins to enter at the top', () => {
  /**
   * Discharges of half an hour whose gas enters a cold store `leap_K` warmer than its rock, at 300 K.
   * Rock 0.1 m down by the bed model with other transfer and flow than the filter has, read with a
   * share of the gas above it and a lag of its own; or bare junctions in that gas.
   */
  function entries(bare: boolean, leap_K: number, times: number, seed: number) {
    const rig = new Rig(SETTLING, TOP);
    const z = normals(seed);
    const reading = (value: number) =>
      Object.fromEntries(COLD_TOP.map((id, i) => [id, value + 2 * (i - 1) + 0.15 * z()]));
    const { store, tables, tubes } = rig.model.stores[1]!;
    let view = rig.step({ mode: 'stand' })[1]!;
    for (let n = 0; n < times; n++) {
      rig.fill(1, () => 300);
      const bed = rig.state.stores[1]!.tubes[0]!.enthalpy.slice();
      const work = createBedWork(bed.length);
      const cell = Math.floor((1 - 0.1 / store.bed.length_m) * bed.length);
      rig.run(0.5, () => ({
        ...{ mode: 'stand' },
        values: { cold_gas_top: 300 + 0.2 * z(), ...reading(300) },
      }));
      let shown = 300;
      rig.run(0.5, () => {
        const inlet_K = 300 + leap_K;
        const step = { massFlux_kg_m2s: -15.5 / store.bed.area_m2, inlet_K, ambient_K: 288 };
        const own = { heatTransferFactor: 0.8, wallLoss_W_m3K: tubes[0]!.wallLoss_W_m3K };
        stepBed(tables, bed, { ...step, ...own, dt_s: 60 }, work);
        const seen = bare ? inlet_K : temperatureAt(tables, bed[cell]!);
        shown = seen + (shown - seen) * Math.exp(-60 / 150);
        const values = { cold_gas_top: inlet_K + 0.7 + 0.2 * z(), ...reading(shown) };
        return { mode: 'discharge', flow_kg_s: -16, values };
      });
      view = rig.step({ mode: 'stand' })[1]!;
    }
    return { view, level: rig.own.stores[1]! };
  }

  it('is followed at once by what hangs in gas, and late by rock: one discharge tells', () => {
    const { view } = entries(true, 15, 1, 5);
    expect(view).toMatchObject({ state: 'degraded', subject: 'cold' });
    expect(view.value!).toBeCloseTo(0.1, 6);
    expect(entries(false, 15, 3, 6).view).toMatchObject({ state: 'normal', value: 0 });
  });

  it('tells by a few kelvins too, over several discharges', () => {
    expect(entries(true, 4, 1, 7).view.state).not.toBe('degraded');
    expect(entries(true, 4, 4, 8).view.state).toBe('degraded');
    expect(entries(false, 4, 8, 9).view).toMatchObject({ state: 'normal' });
  });

  it('is honest about its sigma, in gas and in rock', () => {
    for (const [bare, leap_K] of [
      [true, 15],
      [true, 4],
      [false, 15],
      [false, 4],
    ] as const) {
      const { tops } = entries(bare, leap_K, 1, 10 + leap_K).level;
      for (const { followed } of tops.filter(({ first }) => first)) {
        expect(Math.abs(followed.value! - Number(bare))).toBeLessThan(2.5 * followed.sigma!);
        expect(followed.sigma!).toBeLessThan(0.45);
      }
    }
  });

  it('is left open where gas and rock are as warm as each other', () => {
    const { view } = entries(true, 0.3, 6, 20);
    expect(view).toMatchObject({ state: 'undetermined', reason: 'not_exercised', value: null });
    const { view: vague } = entries(true, 2, 1, 21);
    expect(vague).toMatchObject({ state: 'undetermined', reason: 'too_uncertain' });
    expect(vague.sentence).toMatch(/share of gas .* known to 0\.\d only/);
  });
});
