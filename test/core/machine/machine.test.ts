import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { fluidByName } from '../../../src/core/bed/fluids.js';
import type { GasCycleDefinition } from '../../../src/core/definitions.js';
import { createMachine } from '../../../src/core/machine/machine.js';
import { polytropicEnd } from '../../../src/core/machine/polytropic.js';

/** Seeded, so that a run can be repeated. */
fc.configureGlobal({ seed: 20020518 });

const cycle = (change: Partial<GasCycleDefinition> = {}): GasCycleDefinition => ({
  kind: 'gas_cycle',
  gas: fluidByName('argon'),
  high_pressure_Pa: 7.9e5,
  low_pressure_Pa: 1.04e5,
  compressor_polytropic_efficiency: 0.9,
  expander_polytropic_efficiency: 0.9,
  loop_pressure_loss: 0,
  cooler_approach_K: 0,
  motor_efficiency: 1,
  generator_efficiency: 1,
  auxiliary_running_W: 0,
  auxiliary_standing_W: 0,
  ...change,
});

const AMBIENT = 298.15;
const share = (min: number, max: number) => fc.double({ min, max, noNaN: true });
const gasName = fc.constantFrom('argon', 'air', 'nitrogen');
const direction = fc.constantFrom('charge' as const, 'discharge' as const);
/** Any plant within what is built, and any temperatures that its stores may show. */
const anyPlant = fc.record({
  gas: gasName.map(fluidByName),
  high_pressure_Pa: share(4e5, 14e5),
  compressor_polytropic_efficiency: share(0.7, 1),
  expander_polytropic_efficiency: share(0.7, 1),
  loop_pressure_loss: share(0, 0.1),
  cooler_approach_K: share(0, 15),
  motor_efficiency: share(0.9, 1),
  generator_efficiency: share(0.9, 1),
});
const anyOutlets = fc.record({ hot_K: share(290, 850), cold_K: share(110, 310) });
const charged = fc.record({ hot_K: share(600, 850), cold_K: share(110, 170) });

describe('polytropic change', () => {
  it('of a monatomic gas is the closed form T r^(R/cp)', () => {
    const argon = fluidByName('argon');
    fc.assert(
      fc.property(share(110, 900), share(-2.2, 2.2), (T, exponent) => {
        expect(polytropicEnd(argon, T, exponent) / (T * Math.exp(0.4 * exponent)) - 1).toBeCloseTo(
          0,
          13,
        );
      }),
    );
  });

  it('of a gas with cp(T) is the sum of many small steps with the cp of each', () => {
    for (const [T0, exponent] of [
      [298.15, 2.2],
      [734, -1.8],
      [144, 2.2],
    ] as const) {
      const air = fluidByName('air');
      const R = air.gasConstant_J_kgK;
      // Runge-Kutta of fourth order on dT/dx = R T/cp: error of 400 steps about (1/400)^4.
      const f = (T: number) => (R * T) / air.heatCapacity(T);
      const step = exponent / 400;
      let T: number = T0;
      for (let i = 0; i < 400; i++) {
        const k1 = f(T);
        const k2 = f(T + (step * k1) / 2);
        const k3 = f(T + (step * k2) / 2);
        const k4 = f(T + step * k3);
        T += (step * (k1 + 2 * k2 + 2 * k3 + k4)) / 6;
      }
      expect(polytropicEnd(air, T0, exponent) / T - 1).toBeCloseTo(0, 9);
    }
  });

  it('undoes itself', () => {
    fc.assert(
      fc.property(gasName, share(110, 900), share(-2.2, 2.2), (name, T, exponent) => {
        const gas = fluidByName(name);
        const back = polytropicEnd(gas, polytropicEnd(gas, T, exponent), -exponent);
        expect(Math.abs(back / T - 1)).toBeLessThan(1e-12);
      }),
    );
  });
});

describe('gas cycle', () => {
  it('gives the closed form of an ideal gas of constant cp in both directions', () => {
    const machine = createMachine(cycle());
    const cp = 520.3333;
    const r = 7.9 / 1.04;
    const hot = AMBIENT * r ** (0.4 / 0.9);
    const cold = AMBIENT * r ** (-0.4 * 0.9);
    const charge = machine.operate('charge', { hot_K: AMBIENT, cold_K: AMBIENT }, AMBIENT);
    expect(charge.inlets.hot_K).toBeCloseTo(hot, 9);
    expect(charge.inlets.cold_K).toBeCloseTo(cold, 9);
    expect(charge.specificWork_J_kg).toBeCloseTo(cp * (hot - AMBIENT - (AMBIENT - cold)), 6);
    const discharge = machine.operate('discharge', { hot_K: hot, cold_K: cold }, AMBIENT);
    const expansion = cp * hot * (1 - r ** (-0.4 * 0.9));
    const compression = cp * cold * (r ** (0.4 / 0.9) - 1);
    expect(discharge.specificWork_J_kg).toBeCloseTo(expansion - compression, 6);
    // Both machines end above ambient, and both coolers bring the gas there.
    expect(discharge.inlets).toEqual({ hot_K: AMBIENT, cold_K: AMBIENT });
  });

  it('closes the first law around the loop', () => {
    fc.assert(
      fc.property(anyPlant, direction, anyOutlets, share(260, 310), (plant, way, out, ambient) => {
        const definition = cycle(plant);
        const point = createMachine(definition).operate(way, out, ambient);
        const h = (T: number) => definition.gas.enthalpy(T);
        const intoHot = h(point.inlets.hot_K) - h(out.hot_K);
        const intoCold = h(point.inlets.cold_K as number) - h(out.cold_K);
        const taken = way === 'charge' ? point.shaftWork_J_kg : -point.shaftWork_J_kg;
        // Differences of enthalpies of some 5e5 J/kg: a few float spacings each.
        expect(Math.abs(taken - intoHot - intoCold - point.heatRejected_J_kg)).toBeLessThan(1e-8);
        expect(point.heatRejected_J_kg).toBeGreaterThanOrEqual(0);
      }),
    );
  });

  it('returns all of the work with perfect machines, whatever the gas', () => {
    fc.assert(
      fc.property(gasName, share(4e5, 14e5), (name, high_pressure_Pa) => {
        const machine = createMachine(
          cycle({
            gas: fluidByName(name),
            high_pressure_Pa,
            compressor_polytropic_efficiency: 1,
            expander_polytropic_efficiency: 1,
          }),
        );
        const charge = machine.operate('charge', { hot_K: AMBIENT, cold_K: AMBIENT }, AMBIENT);
        const discharge = machine.operate('discharge', charge.inlets, AMBIENT);
        const roundTrip = discharge.specificWork_J_kg / charge.specificWork_J_kg;
        expect(Math.abs(roundTrip - 1)).toBeLessThan(1e-11);
        expect(Math.abs(discharge.heatRejected_J_kg)).toBeLessThan(1e-6);
      }),
    );
  });

  it('never returns more than was put in, and less with every loss', () => {
    const roundTrip = (change: Partial<GasCycleDefinition>) => {
      const machine = createMachine(cycle(change));
      const charge = machine.operate('charge', { hot_K: AMBIENT, cold_K: AMBIENT }, AMBIENT);
      const discharge = machine.operate('discharge', charge.inlets, AMBIENT);
      return discharge.specificWork_J_kg / charge.specificWork_J_kg;
    };
    const base = {
      compressor_polytropic_efficiency: 0.9,
      expander_polytropic_efficiency: 0.9,
      loop_pressure_loss: 0.02,
      motor_efficiency: 0.97,
      generator_efficiency: 0.97,
    };
    fc.assert(
      fc.property(anyPlant, (plant) => {
        expect(roundTrip(plant)).toBeLessThan(1 + 1e-12);
      }),
    );
    for (const key of [
      'compressor_polytropic_efficiency',
      'expander_polytropic_efficiency',
      'motor_efficiency',
      'generator_efficiency',
    ] as const) {
      expect(roundTrip({ ...base, [key]: base[key] + 0.01 })).toBeGreaterThan(roundTrip(base));
    }
    expect(roundTrip({ ...base, loop_pressure_loss: 0.03 })).toBeLessThan(roundTrip(base));
  });

  it('discharges more per kilogram from hotter heat, colder cold and better machines', () => {
    fc.assert(
      fc.property(anyPlant, charged, (plant, out) => {
        const work = (change: Partial<GasCycleDefinition>, hot: number, cold: number) =>
          createMachine(cycle({ ...plant, ...change })).operate(
            'discharge',
            { hot_K: out.hot_K + hot, cold_K: out.cold_K + cold },
            AMBIENT,
          ).specificWork_J_kg;
        const now = work({}, 0, 0);
        expect(work({}, 1, 0)).toBeGreaterThan(now);
        expect(work({}, 0, 1)).toBeLessThan(now);
        for (const key of [
          'compressor_polytropic_efficiency',
          'expander_polytropic_efficiency',
        ] as const) {
          if (plant[key] > 0.995) continue;
          expect(work({ [key]: plant[key] + 0.005 }, 0, 0)).toBeGreaterThan(now);
        }
      }),
    );
  });

  it('only cools in its coolers', () => {
    const machine = createMachine(cycle({ cooler_approach_K: 8 }));
    const cool = machine.operate('charge', { hot_K: 290, cold_K: 280 }, AMBIENT);
    expect(cool.loop.compressor_in_K).toBe(280);
    expect(cool.loop.expander_in_K).toBe(290);
    expect(cool.heatRejected_J_kg).toBe(0);
    const warm = machine.operate('charge', { hot_K: 400, cold_K: 320 }, AMBIENT);
    expect(warm.loop.compressor_in_K).toBe(AMBIENT + 8);
    expect(warm.loop.expander_in_K).toBe(AMBIENT + 8);
  });

  it('loses half of the pressure loss on each level, on the expander side', () => {
    const machine = createMachine(cycle({ loop_pressure_loss: 0.04 }));
    const { loop } = machine.operate('charge', { hot_K: AMBIENT, cold_K: AMBIENT }, AMBIENT);
    const ratio = (7.9 / 1.04) * 0.98 ** 2;
    expect(loop.expander_out_K).toBeCloseTo(AMBIENT * ratio ** (-0.4 * 0.9), 9);
    expect(loop.compressor_out_K).toBeCloseTo(AMBIENT * (7.9 / 1.04) ** (0.4 / 0.9), 9);
  });

  it('refuses what cannot be, naming argument and value', () => {
    expect(() => createMachine(cycle({ gas: fluidByName('solar_salt') }))).toThrow(/solar_salt/);
    expect(() => createMachine(cycle({ expander_polytropic_efficiency: 1.1 }))).toThrow(/1.1/);
    expect(() => createMachine(cycle({ low_pressure_Pa: 7.9e5 }))).toThrow(/high_pressure_Pa/);
    expect(() => createMachine(cycle({ loop_pressure_loss: 1 }))).toThrow(/loop_pressure_loss.*1/);
    expect(() => createMachine(cycle({ auxiliary_standing_W: -1 }))).toThrow(/auxiliary/);
    const machine = createMachine(cycle());
    expect(() => machine.operate('charge', { hot_K: 300, cold_K: null }, 298)).toThrow(/cold_K/);
    expect(() => machine.operate('charge', { hot_K: Number.NaN, cold_K: 300 }, 298)).toThrow(
      /outlets.hot_K .* got NaN/,
    );
    const outlets = { hot_K: 700, cold_K: 150 };
    expect(() => machine.flowForPower('discharge', -1, outlets, 298)).toThrow(/power_W.*-1/);
    expect(() => machine.powerForFlow('discharge', -1, outlets, 298)).toThrow(/flow_kg_s.*-1/);
  });
});

describe('power and flow', () => {
  it('are inverse to each other, with auxiliaries and a learned factor', () => {
    fc.assert(
      fc.property(
        anyPlant,
        direction,
        charged,
        share(1e5, 2e7),
        share(0.8, 1.2),
        (plant, way, full, power, factor) => {
          const machine = createMachine(cycle({ ...plant, auxiliary_running_W: 5e4 }));
          const outlets = way === 'charge' ? { hot_K: 300, cold_K: 295 } : full;
          const answer = machine.flowForPower(way, power, outlets, AMBIENT, factor);
          if ('reason' in answer) {
            expect(answer.reason).toBe('no_work');
            const { specificWork_J_kg } = machine.operate(way, outlets, AMBIENT);
            expect(specificWork_J_kg).toBeLessThanOrEqual(0);
            return;
          }
          expect(answer.flow_kg_s).toBeGreaterThan(0);
          const back = machine.powerForFlow(way, answer.flow_kg_s, outlets, AMBIENT, factor);
          expect(Math.abs(back / power - 1)).toBeLessThan(1e-12);
        },
      ),
    );
  });

  it('say why there is no flow: empty stores, or less power than the auxiliaries take', () => {
    const machine = createMachine(cycle({ auxiliary_running_W: 5e4 }));
    const empty = { hot_K: AMBIENT, cold_K: AMBIENT };
    expect(machine.flowForPower('discharge', 1e6, empty, AMBIENT)).toEqual({ reason: 'no_work' });
    expect(machine.flowForPower('charge', 4e4, empty, AMBIENT)).toEqual({
      reason: 'power_below_auxiliaries',
    });
    expect(machine.powerForFlow('discharge', 0, empty, AMBIENT)).toBe(-5e4);
  });
});

describe('efficiency table', () => {
  const air = fluidByName('air');
  const table = {
    kind: 'efficiency_table',
    fluid: air,
    outlet_K: [700, 800, 900],
    efficiency: [0.2, 0.3, 0.34],
    return_K: 400,
    charge_inlet_K: 950,
    charge_efficiency: 0.95,
    auxiliary_running_W: 2e4,
    auxiliary_standing_W: 1e3,
  } as const;
  const machine = createMachine(table);

  it('turns the heat between outlet and return into electricity', () => {
    const point = machine.operate('discharge', { hot_K: 850, cold_K: null }, AMBIENT);
    const heat = air.enthalpy(850) - air.enthalpy(400);
    expect(point.specificWork_J_kg).toBeCloseTo(0.32 * heat, 6);
    expect(point.heatRejected_J_kg).toBeCloseTo(0.68 * heat, 6);
    expect(point.inlets).toEqual({ hot_K: 400, cold_K: null });
    expect(point.clamped).toBe(false);
  });

  it('meets its own points and says where it is asked beyond its ends', () => {
    const efficiencyAt = (T: number) => {
      const point = machine.operate('discharge', { hot_K: T, cold_K: null }, AMBIENT);
      return [point.specificWork_J_kg / (air.enthalpy(T) - air.enthalpy(400)), point.clamped];
    };
    const expected: [number, number, boolean][] = [
      [600, 0.2, true],
      [700, 0.2, false],
      [800, 0.3, false],
      [900, 0.34, false],
      [950, 0.34, true],
    ];
    for (const [T, eta, clamped] of expected) {
      expect(efficiencyAt(T)[0]).toBeCloseTo(eta, 12);
      expect(efficiencyAt(T)[1]).toBe(clamped);
    }
  });

  it('charges from the outlet to the heater, and takes nothing for gas that is hotter', () => {
    const point = machine.operate('charge', { hot_K: 420, cold_K: null }, AMBIENT);
    const heat = air.enthalpy(950) - air.enthalpy(420);
    expect(point.specificWork_J_kg).toBeCloseTo(heat / 0.95, 6);
    expect(point.inlets.hot_K).toBe(950);
    expect(point.heatRejected_J_kg).toBeCloseTo(heat / 0.95 - heat, 6);
    const hot = { hot_K: 980, cold_K: null };
    expect(machine.operate('charge', hot, AMBIENT).specificWork_J_kg).toBe(0);
    expect(machine.operate('charge', hot, AMBIENT).inlets.hot_K).toBe(980);
    expect(machine.flowForPower('charge', 1e6, hot, AMBIENT)).toEqual({ reason: 'no_work' });
  });

  it('has no work below the return temperature', () => {
    const cold = { hot_K: 390, cold_K: null };
    expect(machine.flowForPower('discharge', 1e6, cold, AMBIENT)).toEqual({ reason: 'no_work' });
  });

  it('refuses lists that do not fit', () => {
    expect(() => createMachine({ ...table, efficiency: [0.2] })).toThrow(/\(3\), got 1/);
    expect(() => createMachine({ ...table, efficiency: [0.2, 0.3, 1.4] })).toThrow(/got 1.4/);
    expect(() => createMachine({ ...table, outlet_K: [800, 700, 900] })).toThrow(/outlet_K/);
    expect(() => createMachine({ ...table, outlet_K: [], efficiency: [] })).toThrow(/got 0/);
  });
});

describe('tuned work factors', () => {
  it('scale the electricity of their direction alone, and power and flow stay inverse', () => {
    const plain = createMachine(cycle({ auxiliary_running_W: 3e4 }));
    const tuned = createMachine(
      cycle({ auxiliary_running_W: 3e4, work_factor: { charge: 0.95, discharge: 1.06 } }),
    );
    for (const [way, factor, outlets] of [
      ['charge', 0.95, { hot_K: 298, cold_K: 298 }],
      ['discharge', 1.06, { hot_K: 733, cold_K: 150 }],
    ] as const) {
      const a = plain.operate(way, outlets, AMBIENT);
      const b = tuned.operate(way, outlets, AMBIENT);
      expect(b.specificWork_J_kg / a.specificWork_J_kg).toBeCloseTo(factor, 12);
      expect(b.inlets).toEqual(a.inlets);
      const power_W = tuned.powerForFlow(way, 15, outlets, AMBIENT);
      const flow = tuned.flowForPower(way, power_W, outlets, AMBIENT);
      expect(flow).toEqual({ flow_kg_s: expect.closeTo(15, 9) });
    }
    expect(() => createMachine(cycle({ work_factor: { charge: 0, discharge: 1 } }))).toThrow(
      'work_factor.charge',
    );
  });
});
