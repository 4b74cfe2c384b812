import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  axialConductivity,
  mixingConductivity,
  stagnantConductivity,
  zehnerBauerSchluender,
} from '../../../src/core/bed/bedConductivity.js';
import { fluidByName } from '../../../src/core/bed/fluids.js';
import {
  biot,
  filmCoefficient,
  filmFlow,
  filmStill,
  particleResistance,
  prandtl,
  reynolds,
  surfacePerVolume,
  volumetricHeatTransfer,
  wakaoCovers,
  wakaoNusselt,
} from '../../../src/core/bed/heatTransfer.js';
import { pressureDrop, pressureGradient, ROUGH_ROCK } from '../../../src/core/bed/pressureDrop.js';
import { voidFractionOfSpheres } from '../../../src/core/bed/voidFraction.js';
import { bedOf } from '../../support/beds.js';

/** Seeded, so that a run can be repeated. */
fc.configureGlobal({ seed: 20020518 });

const flux = fc.double({ min: 0.01, max: 3, noNaN: true });
const kelvin = fc.double({ min: 110, max: 890, noNaN: true });
const bed = bedOf({ heat_transfer_factor: 0.7 });

describe('heat transfer', () => {
  it('splits into parts of temperature alone that give hv exactly', () => {
    fc.assert(
      fc.property(flux, kelvin, (G, T) => {
        const h = filmStill(bed, T) + filmFlow(bed, T) * G ** 0.6;
        const whole = volumetricHeatTransfer({ bed, massFlux_kg_m2s: G, temperature_K: T });
        const parts = (0.7 * surfacePerVolume(bed)) / (1 / h + particleResistance(bed, T));
        expect(Math.abs(parts / whole - 1)).toBeLessThan(1e-14);
        // The same by the textbook: Nu, h = Nu k/d, h_eff = h/(1 + Bi/5).
        const k = bed.fluid.conductivity(T);
        const film = (wakaoNusselt(reynolds(bed, G, T), prandtl(bed, T)) * k) / 0.02;
        const Bi = (film * 0.02) / (2 * bed.solid.conductivity(T));
        const textbook = (0.7 * (film / (1 + Bi / 5)) * 6 * 0.6) / 0.02;
        expect(Math.abs(textbook / whole - 1)).toBeLessThan(1e-13);
        expect(Math.abs(Bi / biot(bed, G, T) - 1)).toBeLessThan(1e-13);
      }),
    );
  });

  it('does not know the direction of flow, and without flow is conduction from a sphere', () => {
    const at = (G: number) =>
      volumetricHeatTransfer({ bed, massFlux_kg_m2s: G, temperature_K: 500 });
    expect(at(-0.3)).toBe(at(0.3));
    expect(filmCoefficient(bed, 0, 500)).toBe((2 * bed.fluid.conductivity(500)) / 0.02);
  });

  it('tells where Wakao was measured: not in a bed of salt at a few millimetres a second', () => {
    const salt = bedOf({
      fluid: fluidByName('solar_salt'),
      particle_diameter_m: 0.015,
      void_fraction: 0.22,
    });
    expect(wakaoCovers(reynolds(bed, 0.225, 773))).toBe(true);
    expect(wakaoCovers(reynolds(salt, 7 / 7.07, 600))).toBe(false);
  });
});

describe('bed conductivity', () => {
  const piece = {
    fluid_W_mK: 0.03,
    solid_W_mK: 0.03,
    particle_diameter_m: 0.02,
    void_fraction: 0.4,
    emissivity: 0,
    temperature_K: 300,
    shape: 'crushed',
  } as const;

  it('is that of the fluid where solid and fluid conduct alike and nothing radiates', () => {
    // The unit cell itself is 0/0 at k_s = k_f exactly; it tends there like k_s/k_f - 1.
    const near = zehnerBauerSchluender({ ...piece, solid_W_mK: 0.03 * (1 + 1e-6) });
    expect(near / 0.03).toBeCloseTo(1, 5);
  });

  it('lies between fluid and solid, and grows with either, with temperature and with emissivity', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1.2, max: 5000, noNaN: true }),
        fc.double({ min: 0.25, max: 0.6, noNaN: true }),
        kelvin,
        (ratio, eps, T) => {
          const still = { ...piece, solid_W_mK: 0.03 * ratio, void_fraction: eps };
          const k = zehnerBauerSchluender(still);
          expect(k).toBeGreaterThan(0.03);
          expect(k).toBeLessThan(0.03 * ratio);
          expect(zehnerBauerSchluender({ ...still, solid_W_mK: 0.033 * ratio })).toBeGreaterThan(k);
          const shining = { ...still, emissivity: 0.5, temperature_K: T };
          const kr = zehnerBauerSchluender(shining);
          expect(kr).toBeGreaterThan(k);
          expect(zehnerBauerSchluender({ ...shining, emissivity: 0.9 })).toBeGreaterThan(kr);
          expect(zehnerBauerSchluender({ ...shining, temperature_K: 1.1 * T })).toBeGreaterThan(kr);
        },
      ),
    );
  });

  it('adds the mixing of the flow, 0.5 Re Pr k_f, and tunes only the standing part', () => {
    const tuned = bedOf({ conductivity_factor: 1.5 });
    fc.assert(
      fc.property(flux, kelvin, (G, T) => {
        const RePr = reynolds(tuned, G, T) * prandtl(tuned, T);
        const mixing = 0.5 * RePr * tuned.fluid.conductivity(T);
        expect(Math.abs(mixingConductivity(tuned, -G, T) / mixing - 1)).toBeLessThan(1e-13);
        const sum = 1.5 * stagnantConductivity(tuned, T) + mixing;
        expect(Math.abs(axialConductivity(tuned, G, T) / sum - 1)).toBeLessThan(1e-13);
      }),
    );
  });

  it('lets nothing radiate through a liquid', () => {
    const salt = { fluid: fluidByName('solar_salt') };
    expect(stagnantConductivity(bedOf(salt), 900)).toBe(stagnantConductivity(bedOf(salt), 600));
  });
});

describe('pressure drop', () => {
  it('is linear in a creeping and square in a fast flow, and turns with it', () => {
    const slow = pressureGradient(bed, 2e-6, 400) / pressureGradient(bed, 1e-6, 400);
    const fast = pressureGradient(bed, 2000, 400) / pressureGradient(bed, 1000, 400);
    // The other term's share: 1.75/150 Re/(1-eps) = 2e-5 here, and its inverse 0.04 %.
    expect(slow).toBeCloseTo(2, 4);
    expect(Math.abs(fast - 4)).toBeLessThan(0.01);
    expect(pressureGradient(bed, -0.3, 400)).toBe(-pressureGradient(bed, 0.3, 400));
  });

  it('averages the gradient over the profile and multiplies length and factor', () => {
    const dusty = bedOf({ pressure_drop_factor: 2 });
    const mean = (pressureGradient(dusty, 0.2, 300) + pressureGradient(dusty, 0.2, 700)) / 2;
    expect(pressureDrop(dusty, -0.2, new Float64Array([300, 700]))).toBeCloseTo(2 * 1.2 * mean, 9);
    expect(pressureDrop(dusty, 0, [300])).toBe(0);
    expect(pressureDrop(dusty, 0.2, [300], ROUGH_ROCK)).toBeGreaterThan(
      pressureDrop(dusty, 0.2, [300]),
    );
    expect(() => pressureDrop(dusty, 0.2, [])).toThrow(/profile_K .* got 0/);
  });

  it('of the void fraction refuses a tube narrower than two pieces', () => {
    expect(voidFractionOfSpheres(0)).toBe(0.375);
    expect(() => voidFractionOfSpheres(0.7)).toThrow(/ratio .* got 0.7/);
  });
});
