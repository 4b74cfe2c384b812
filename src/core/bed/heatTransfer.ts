import type { BedDefinition } from '../definitions.js';

/**
 * Nusselt number of a particle in a bed, Nu = 2 + 1.1 Pr^(1/3) Re^0.6.
 *
 * Measured for 15 < Re < 8500. Below 15 the formula is used as it stands: its limit of 2 is
 * conduction from a sphere, and the lower values that are measured there come from mixing along
 * the flow, which this model carries as a conductivity of its own. Such a bed (a liquid) should
 * have its heat_transfer_factor tuned; `wakaoCovers` tells.
 *
 * @param reynolds G d/mu with the superficial mass flux G, at least 0
 * @param prandtl mu cf/k_f
 * Source: Wakao & Kaguei 1982.
 */
export function wakaoNusselt(reynolds: number, prandtl: number): number {
  return 2 + 1.1 * Math.cbrt(prandtl) * reynolds ** 0.6;
}

/** Whether a Reynolds number lies inside the measured range of `wakaoNusselt`. */
export function wakaoCovers(reynolds: number): boolean {
  return reynolds > 15 && reynolds < 8500;
}

/** Re = |G| d/mu with the superficial mass flux G [kg/m2s]. */
export function reynolds(
  bed: BedDefinition,
  massFlux_kg_m2s: number,
  temperature_K: number,
): number {
  return (
    (Math.abs(massFlux_kg_m2s) * bed.particle_diameter_m) / bed.fluid.viscosity_Pa_s(temperature_K)
  );
}

/** Pr = mu cf/k_f of the bed's fluid. */
export function prandtl(bed: BedDefinition, temperature_K: number): number {
  const { fluid } = bed;
  return (
    (fluid.viscosity_Pa_s(temperature_K) * fluid.heatCapacity(temperature_K)) /
    fluid.conductivity(temperature_K)
  );
}

/** Surface of the pieces in a volume of bed, 6 (1 - eps)/d [1/m]. */
export function surfacePerVolume(bed: BedDefinition): number {
  return (6 * (1 - bed.void_fraction)) / bed.particle_diameter_m;
}

/**
 * The part A [W/m2K] of the film coefficient h = A + B |G|^0.6 that does not know the flow.
 * `filmStill`, `filmFlow` and `particleResistance` depend on temperature alone: tabulated, they give
 *
 *   hv = phi_h a/(1/(A + B |G|^0.6) + R)
 *
 * exactly, with a = `surfacePerVolume` and R = `particleResistance`.
 */
export function filmStill(bed: BedDefinition, temperature_K: number): number {
  return (2 * bed.fluid.conductivity(temperature_K)) / bed.particle_diameter_m;
}

/** The factor B of |G|^0.6 in the film coefficient; see `filmStill`. */
export function filmFlow(bed: BedDefinition, temperature_K: number): number {
  const d = bed.particle_diameter_m;
  const k = bed.fluid.conductivity(temperature_K);
  const Pr = prandtl(bed, temperature_K);
  return ((1.1 * k) / d) * Math.cbrt(Pr) * (d / bed.fluid.viscosity_Pa_s(temperature_K)) ** 0.6;
}

/**
 * Resistance d/(10 k_s) [m2K/W] that the inside of a piece adds to its film: the same as
 * h_eff = h/(1 + Bi/5) with Bi = h d/(2 k_s) (Jeffreson 1972, cited from memory).
 */
export function particleResistance(bed: BedDefinition, temperature_K: number): number {
  return bed.particle_diameter_m / (10 * bed.solid.conductivity(temperature_K));
}

/** Film coefficient h [W/m2K] between fluid and piece. */
export function filmCoefficient(
  bed: BedDefinition,
  massFlux_kg_m2s: number,
  temperature_K: number,
): number {
  return (
    filmStill(bed, temperature_K) + filmFlow(bed, temperature_K) * Math.abs(massFlux_kg_m2s) ** 0.6
  );
}

/** Bi = h d/(2 k_s): film against the inside of a piece. */
export function biot(bed: BedDefinition, massFlux_kg_m2s: number, temperature_K: number): number {
  return (
    5 *
    filmCoefficient(bed, massFlux_kg_m2s, temperature_K) *
    particleResistance(bed, temperature_K)
  );
}

/**
 * Heat transfer between fluid and solid per volume of bed [W/m3K],
 * hv = phi_h h_eff 6 (1 - eps)/d, h_eff = h/(1 + Bi/5), h from `wakaoNusselt`.
 *
 * @param args.massFlux_kg_m2s superficial G, of either sign; 0 leaves conduction alone (Nu = 2)
 * @param args.temperature_K of the film
 */
export function volumetricHeatTransfer(args: {
  readonly bed: BedDefinition;
  readonly massFlux_kg_m2s: number;
  readonly temperature_K: number;
}): number {
  const { bed, massFlux_kg_m2s: G, temperature_K: T } = args;
  const resistance = 1 / filmCoefficient(bed, G, T) + particleResistance(bed, T);
  return (bed.heat_transfer_factor * surfacePerVolume(bed)) / resistance;
}
