import { describe, expect, it } from 'vitest';
import type { GasCycleDefinition, UnitDefinition } from '../../../src/core/definitions.js';
import { machineSpread, partLoadFactor } from '../../../src/core/dispatch/machineSpread.js';
import { createMachine } from '../../../src/core/machine/machine.js';
import { mulberry } from '../../support/random.js';
import { demoUnit } from '../../support/truthRun.js';

const unit = demoUnit();
const machine = unit.machine as GasCycleDefinition;
const withMachine = (over: Partial<GasCycleDefinition>): UnitDefinition => ({
  ...unit,
  machine: { ...machine, ...over },
});

/** ln w of a machine discharging full stores or charging empty ones. */
function lnWork(of: GasCycleDefinition, direction: 'charge' | 'discharge'): number {
  const [hot, cold] = unit.stores;
  const full = direction === 'discharge';
  const outlets = {
    hot_K: (full ? hot?.reference_hot_K : hot?.reference_cold_K) as number,
    cold_K: (full ? cold?.reference_cold_K : cold?.reference_hot_K) as number,
  };
  const { specificWork_J_kg } = createMachine(of).operate(direction, outlets, unit.ambient_K);
  return Math.log(specificWork_J_kg);
}

describe('the spread of a machine', () => {
  const spread = machineSpread(unit);

  it('has the configured sigma while discharging', () => {
    expect(Math.sqrt(spread.variance.discharge)).toBeCloseTo(
      unit.estimator.machine_factor_sigma,
      12,
    );
  });

  it('has the correlation of 4000 machines drawn within what a maker promises', () => {
    const random = mulberry(5);
    const within = (points: number): number => points * (2 * random() - 1);
    const drawn = Array.from({ length: 4000 }, () => {
      const one: GasCycleDefinition = {
        ...machine,
        compressor_polytropic_efficiency: machine.compressor_polytropic_efficiency + within(0.015),
        expander_polytropic_efficiency: machine.expander_polytropic_efficiency + within(0.015),
        loop_pressure_loss: machine.loop_pressure_loss + within(0.02),
        motor_efficiency: machine.motor_efficiency + within(0.01),
        generator_efficiency: machine.generator_efficiency + within(0.01),
      };
      return [
        lnWork(one, 'charge') - lnWork(machine, 'charge'),
        lnWork(one, 'discharge') - lnWork(machine, 'discharge'),
      ] as const;
    });
    const mean = (of: (d: (typeof drawn)[number]) => number): number =>
      drawn.reduce((sum, d) => sum + of(d), 0) / drawn.length;
    const c = mean((d) => d[0]);
    const e = mean((d) => d[1]);
    const cc = mean((d) => (d[0] - c) ** 2);
    const ee = mean((d) => (d[1] - e) ** 2);
    const ce = mean((d) => (d[0] - c) * (d[1] - e));
    const wanted =
      spread.covariance / Math.sqrt(spread.variance.charge * spread.variance.discharge);
    // Standard error of a correlation of 0.8 from 4000 draws: 0.36/sqrt(4000) = 0.006; three of them,
    // and a per cent for curvature.
    expect(Math.abs(ce / Math.sqrt(cc * ee) - wanted)).toBeLessThan(0.03);
    expect(Math.sqrt(cc / ee)).toBeCloseTo(
      Math.sqrt(spread.variance.charge / spread.variance.discharge),
      1,
    );
  });

  it('has charging and discharging opposed: a better machine takes less and gives more', () => {
    expect(spread.covariance).toBeLessThan(0);
  });

  it('gives more in part load, by the loss that then falls away, and nothing where it stays', () => {
    const flow = 0.6 * spread.ratedFlow_kg_s;
    const given = machineSpread(withMachine({ loss_follows_flow: 1 }));
    const least = { ...machine, loop_pressure_loss: machine.loop_pressure_loss * 0.36 };
    const exact = lnWork(least, 'discharge') - lnWork(machine, 'discharge');
    // One slope over 64 % of a loss of 4 %: to second order.
    expect(Math.log(partLoadFactor(given, 'discharge', flow)) / exact).toBeCloseTo(1, 1);
    const none = machineSpread(withMachine({ loss_follows_flow: 0 }));
    expect(partLoadFactor(none, 'discharge', flow)).toBe(1);
    expect(none.partLoadSigma).toBe(0);
    expect(partLoadFactor(spread, 'discharge', spread.ratedFlow_kg_s)).toBe(1);
  });
});
