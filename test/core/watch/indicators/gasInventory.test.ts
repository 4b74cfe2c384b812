import { describe, expect, it } from 'vitest';
import { GAS_INVENTORY } from '../../../../src/core/watch/indicators/gasInventory.js';
import { normals } from '../normals.js';
import { demo, Rig } from './rig.js';

/**
 * A day's work over and over: beds warm and cool in turn. Pressures are held, or follow the gas's
 * temperature as in a closed loop; `share` of the gas is there.
 */
function unitWith(closed: boolean) {
  const rig = new Rig(GAS_INVENTORY);
  const z = normals(closed ? 8 : 9);
  const day = (n: number, share: number) => {
    let view = rig.step({ mode: 'stand' })[0]!;
    for (const [mode, part] of [
      ['charge', 1],
      ['stand', 1],
      ['discharge', 0],
    ] as const) {
      const warmer = part + 0.3 * Math.sin(n + part);
      rig.fill(0, () => 400 + 200 * warmer);
      rig.fill(1, () => 260 - 80 * warmer);
      const hotGas = (315 * 7.9e5) / (400 + 200 * warmer);
      const coldGas = (486 * 1.04e5) / (260 - 80 * warmer);
      const displaced = closed ? 9e5 / (hotGas + coldGas) : 1;
      view = rig.run(5, () => ({
        mode,
        values: {
          hot_pressure: demo.stores[0]!.bed.pressure_Pa * share * displaced * (1 + 0.001 * z()),
          cold_pressure: demo.stores[1]!.bed.pressure_Pa * share * displaced * (1 + 0.001 * z()),
        },
      }))[0]!;
    }
    return view;
  };
  return { rig, day };
}

describe('gas inventory', () => {
  for (const closed of [false, true]) {
    const words = closed ? 'in a closed loop, by the temperatures of its gas' : 'held by a buffer';
    it(`finds 5 % of the gas lost where pressures are ${words}`, () => {
      const { day } = unitWith(closed);
      for (let n = 0; n < 6; n++) expect(day(n, 1).state).not.toBe('degraded');
      const healthy = day(6, 1);
      expect(healthy.state).toBe('normal');
      expect(Math.abs(healthy.value!)).toBeLessThan(closed ? 0.03 : 0.002);
      const lost = [7, 8].map((n) => day(n, 0.95)).at(-1)!;
      expect(lost).toMatchObject({ state: 'degraded', unit: '-', subject: 'vellmoor' });
      expect(lost.sentence).toMatch(closed ? /closed loop/ : /that the plant keeps/);
    });
  }

  it('is not told without pressures', () => {
    const channels = demo.channels.filter(({ role }) => role.kind !== 'pressure');
    const [view] = new Rig(GAS_INVENTORY, { ...demo, channels }).step({ mode: 'stand' });
    expect(view).toMatchObject({
      state: 'undetermined',
      reason: 'not_instrumented',
      healthy: null,
    });
  });
});
