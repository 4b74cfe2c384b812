import type { BedDefinition } from '../core/definitions.js';

/**
 * Transfer laws of the demonstration plant: the published ones, written apart from those of the
 * estimator, so that a slip in one of the two shows as a difference.
 */

const STEFAN_BOLTZMANN = 5.670374419e-8;

/** Film coefficient as still + flow G^0.6 [W/m2K], Nu = 2 + 1.1 Pr^(1/3) Re^0.6 (Wakao & Kaguei 1982). */
export function film(bed: BedDefinition, temperature_K: number): { still: number; flow: number } {
  const { fluid, particle_diameter_m: d } = bed;
  const k = fluid.conductivity(temperature_K);
  const mu = fluid.viscosity_Pa_s(temperature_K);
  const prandtl = (mu * fluid.heatCapacity(temperature_K)) / k;
  return { still: (2 * k) / d, flow: ((1.1 * k) / d) * Math.cbrt(prandtl) * (d / mu) ** 0.6 };
}

/** Surface of the pieces per volume of bed [1/m]. */
export function surfacePerVolume(bed: BedDefinition): number {
  return (6 * (1 - bed.void_fraction)) / bed.particle_diameter_m;
}

/** Resistance of the inside of a piece [m2K/W]: h_eff = h/(1 + Bi/5), Bi = h d/(2 k) (Jeffreson 1972 [M]). */
export function insideResistance(bed: BedDefinition, temperature_K: number): number {
  return bed.particle_diameter_m / (10 * bed.solid.conductivity(temperature_K));
}

/** Conductivity of the standing bed [W/mK]: Zehner, Bauer & Schluender, with radiation in a gas. */
export function standingConductivity(bed: BedDefinition, temperature_K: number): number {
  const { fluid, solid, void_fraction: eps, particle_diameter_m: d } = bed;
  const [form, flat] = bed.particle_shape === 'crushed' ? [1.4, 0.001] : [1.25, 0.0077];
  const kf = fluid.conductivity(temperature_K);
  const kp = solid.conductivity(temperature_K) / kf;
  const radiant = (4 * STEFAN_BOLTZMANN * temperature_K ** 3 * d) / (2 / solid.emissivity - 1);
  const kr = fluid.phase === 'gas' ? radiant / kf : 0;
  const B = form * ((1 - eps) / eps) ** (10 / 9);
  const N = 1 + (kr - B) / kp;
  const log = ((B * (kp + kr - 1)) / (N * N * kp)) * Math.log((kp + kr) / B);
  const core = (2 / N) * (log + ((B + 1) / (2 * B)) * (kr - B) - (B - 1) / N);
  const root = Math.sqrt(1 - eps);
  return kf * ((1 - root) * (1 + eps * kr) + root * (flat * kp + (1 - flat) * core));
}

/** Every so many cells are enough for a mean over the bed: densities change slowly along it. */
const STRIDE = 8;

/** Pressure drop of a bed [Pa] for gas temperatures of equal lengths (Ergun 1952, times the tuned factor). */
export function pressureDrop(bed: BedDefinition, flux: number, gas_K: Float64Array): number {
  const { fluid, void_fraction: eps, particle_diameter_m: d } = bed;
  const G = Math.abs(flux);
  const viscous = (150 * (1 - eps) ** 2) / (eps ** 3 * d * d);
  const inertial = (1.75 * (1 - eps)) / (eps ** 3 * d);
  let sum = 0;
  let count = 0;
  for (let i = STRIDE >> 1; i < gas_K.length; i += STRIDE) {
    const T = gas_K[i] as number;
    count++;
    sum +=
      (viscous * fluid.viscosity_Pa_s(T) * G + inertial * G * G) /
      fluid.density_kg_m3(T, bed.pressure_Pa);
  }
  return (bed.pressure_drop_factor * bed.length_m * sum) / count;
}
