import { describe, expect, it } from 'vitest';
import { dewPoint_K } from '../../src/config/dewPoint.js';
import { fluidByName } from '../../src/core/bed/fluids.js';

describe('dew point', () => {
  // Normal boiling points and triple points of the equations of state named in dewPoint.ts; the
  // curves are good to 0.05 % in pressure there, which is 5 mK; bisection ends at 1 mK.
  it.each([
    ['argon', 101325, 87.302],
    ['argon', 68891, 83.8058],
    ['nitrogen', 101325, 77.355],
    ['nitrogen', 12520, 63.151],
    ['air', 101325, 81.72],
  ])('of %s at %d Pa is %d K', (name, pressure, temperature) => {
    expect(Math.abs(dewPoint_K(fluidByName(name), pressure)! - temperature)).toBeLessThan(0.02);
  });

  it('of argon at 10.5 bar is about 117 K', () => {
    expect(dewPoint_K(fluidByName('argon'), 10.5e5)!).toBeGreaterThan(116.5);
    expect(dewPoint_K(fluidByName('argon'), 10.5e5)!).toBeLessThan(118);
  });

  it('rises with pressure up to the critical temperature', () => {
    let last = 0;
    for (const bar of [0.5, 1, 2, 5, 10, 20, 40]) {
      const dew = dewPoint_K(fluidByName('argon'), bar * 1e5)!;
      expect(dew).toBeGreaterThan(last);
      last = dew;
    }
    expect(dewPoint_K(fluidByName('argon'), 60e5)).toBe(150.687);
  });

  it('is unknown for a liquid', () => {
    expect(dewPoint_K(fluidByName('solar_salt'), 1e5)).toBeNull();
  });

  it('refuses a pressure that cannot be', () => {
    expect(() => dewPoint_K(fluidByName('argon'), 0)).toThrow(RangeError);
  });
});
