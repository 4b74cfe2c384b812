import { describe, expect, it } from 'vitest';
import { fluidByName } from '../../src/core/bed/fluids.js';
import { createMachine } from '../../src/core/machine/machine.js';

/** Argon from 25 degC; the pressures and efficiencies of each case. */
const temperatures_degC = (ratio: number, efficiency: number) => {
  const machine = createMachine({
    kind: 'gas_cycle',
    gas: fluidByName('argon'),
    high_pressure_Pa: ratio * 1.04e5,
    low_pressure_Pa: 1.04e5,
    compressor_polytropic_efficiency: efficiency,
    expander_polytropic_efficiency: efficiency,
    loop_pressure_loss: 0,
    cooler_approach_K: 0,
    motor_efficiency: 1,
    generator_efficiency: 1,
    auxiliary_running_W: 0,
    auxiliary_standing_W: 0,
  });
  const { inlets } = machine.operate('charge', { hot_K: 298.15, cold_K: 298.15 }, 298.15);
  return [inlets.hot_K - 273.15, (inlets.cold_K as number) - 273.15] as const;
};

describe('cycle temperatures', () => {
  it('a monatomic gas by 12 from 25 degC without losses: 532 degC, and -163 degC back (theory)', () => {
    const [hot, cold] = temperatures_degC(12, 1);
    expect(hot).toBeCloseTo(298.15 * 12 ** 0.4 - 273.15, 9);
    // 12^0.4 = 2.7019: 532.4 degC and -162.8 degC.
    expect(Math.round(hot)).toBe(532);
    expect(Math.round(cold)).toBe(-163);
  });

  it('lies by the -160 degC and 500 degC of common practice (no source), within 35 K', () => {
    const [hot, cold] = temperatures_degC(12, 1);
    expect(Math.abs(hot - 500)).toBeLessThan(35);
    expect(Math.abs(cold + 160)).toBeLessThan(35);
  });

  it('7.9 over 1.04 bar at 0.90 polytropic gives 461 degC and -129 degC', () => {
    // (7.9/1.04)^(0.4/0.9) = 2.4625 and (7.9/1.04)^(-0.36) = 0.48193, by hand.
    const [hot, cold] = temperatures_degC(7.9 / 1.04, 0.9);
    expect(Math.round(hot)).toBe(461);
    expect(Math.round(cold)).toBe(-129);
  });
});
