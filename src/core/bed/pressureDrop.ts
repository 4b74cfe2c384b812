import type { BedDefinition } from '../definitions.js';

/** Coefficients of the viscous and the inertial term. */
export interface DropCoefficients {
  readonly viscous: number;
  readonly inertial: number;
}

/** Ergun 1952. */
export const ERGUN: DropCoefficients = { viscous: 150, inertial: 1.75 };
/** Rough crushed rock, in the spread that Macdonald et al. 1979 found between smooth and rough. */
export const ROUGH_ROCK: DropCoefficients = { viscous: 217, inertial: 1.83 };

/**
 * Pressure gradient [Pa/m] at one temperature, before the tuned factor:
 *
 *   dp/dx = A mu (1-eps)^2/(eps^3 d^2) u + B rho (1-eps)/(eps^3 d) u^2,   u = G/rho
 *
 * @param massFlux_kg_m2s superficial G; the gradient has its sign
 * @param coefficients A and B, Ergun's by default
 * Source: Ergun 1952; for `ROUGH_ROCK` Macdonald et al. 1979.
 */
export function pressureGradient(
  bed: BedDefinition,
  massFlux_kg_m2s: number,
  temperature_K: number,
  coefficients: DropCoefficients = ERGUN,
): number {
  const { void_fraction: eps, particle_diameter_m: d, fluid } = bed;
  const solid = 1 - eps;
  const rho = fluid.density_kg_m3(temperature_K, bed.pressure_Pa);
  const mu = fluid.viscosity_Pa_s(temperature_K);
  const G = massFlux_kg_m2s;
  const viscous = (coefficients.viscous * mu * solid * solid) / (eps ** 3 * d * d);
  const inertial = (coefficients.inertial * solid * Math.abs(G)) / (eps ** 3 * d);
  return ((viscous + inertial) * G) / rho;
}

/**
 * Pressure drop over a store [Pa] >= 0: phi_p times the mean gradient over cells of equal length,
 * at the store's pressure (the drop itself is thousandths of it).
 *
 * @param massFlux_kg_m2s superficial G, of either sign
 * @param profile_K gas temperatures of cells of equal length, at least one
 * @param coefficients Ergun's by default; the tuned factor carries roughness and dust
 * @throws RangeError for an empty profile
 */
export function pressureDrop(
  bed: BedDefinition,
  massFlux_kg_m2s: number,
  profile_K: ArrayLike<number>,
  coefficients: DropCoefficients = ERGUN,
): number {
  const n = profile_K.length;
  if (n === 0) throw new RangeError('profile_K must hold at least one temperature, got 0');
  const G = Math.abs(massFlux_kg_m2s);
  let sum = 0;
  for (let i = 0; i < n; i++) sum += pressureGradient(bed, G, profile_K[i] as number, coefficients);
  return (bed.pressure_drop_factor * bed.length_m * sum) / n;
}
