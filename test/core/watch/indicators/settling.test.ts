import { describe, expect, it } from 'vitest';
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

describe('gas that begins to enter at the top', () => {
  /** Cold gas stands above the bed; then hot gas enters at 18 kg/s, and `bare` readings leap with it. */
  function entry(bare: boolean, seed: number) {
    const rig = new Rig(SETTLING, TOP);
    const z = normals(seed);
    const reading = (value: number) =>
      Object.fromEntries(FIRST.map((id) => [id, value + 0.15 * z()]));
    let view = rig.step({ mode: 'stand' })[0]!;
    for (let n = 0; n < 2; n++) {
      rig.fill(0, () => 700);
      rig.run(0.5, () => ({ mode: 'stand', values: { hot_gas_top: 700, ...reading(700) } }));
      view = rig.run(0.3, (t) => {
        const share = bare ? 1 - Math.exp(-t / 0.03) : 0.25 * (1 - Math.exp(-t / 0.1));
        const values = { hot_gas_top: 730 + 0.2 * z(), ...reading(700 + 30 * share) };
        return { mode: 'charge', flow_kg_s: 18, values };
      })[0]!;
    }
    return view;
  }

  it('is followed at once by what hangs in gas, and late by rock', () => {
    expect(entry(true, 5).state).toBe('degraded');
    expect(entry(false, 6)).toMatchObject({ state: 'normal', score: 0 });
  });
});
