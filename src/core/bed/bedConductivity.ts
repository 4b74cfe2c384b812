import type { BedDefinition } from '../definitions.js';

/** Stefan-Boltzmann constant [W/m2K4], exact in the SI of 2019. */
const STEFAN_BOLTZMANN = 5.670374419e-8;

/**
 * Deformation factor C_f and flattened contact share phi of the unit cell, VDI Heat Atlas D6.3:
 * spheres 1.25 and 0.0077; broken material 1.4 and 0.001.
 */
const SHAPES = {
  sphere: { form: 1.25, contact: 0.0077 },
  crushed: { form: 1.4, contact: 0.001 },
} as const;

export interface ParticleBed {
  /** Conductivity of the fluid and of one piece [W/mK]. */
  readonly fluid_W_mK: number;
  readonly solid_W_mK: number;
  readonly particle_diameter_m: number;
  readonly void_fraction: number;
  /** Emissivity of the pieces [-]; 0 = no radiation (a liquid that takes it up). */
  readonly emissivity: number;
  readonly temperature_K: number;
  readonly shape: 'crushed' | 'sphere';
}

/**
 * Conductivity of a bed without flow after Zehner, Bauer and Schluender, with radiation [W/mK]:
 *
 *   k/k_f = (1 - s) (1 + eps k_r) + s (phi k_p + (1 - phi) k_c),  s = sqrt(1 - eps)
 *   k_r = 4 sigma T^3 d/((2/e - 1) k_f),  k_p = k_s/k_f,  B = C_f ((1 - eps)/eps)^(10/9)
 *   N = 1 + (k_r - B)/k_p
 *   k_c = 2/N (B (k_p + k_r - 1)/(N^2 k_p) ln((k_p + k_r)/B) + (B + 1)/(2 B) (k_r - B) - (B - 1)/N)
 *
 * The jump of temperature at a wall (Smoluchowski) is left out: the free path of a gas at 1 bar
 * and 900 K is 0.3 um, against gaps of millimetres. Range: 0 < eps < 1.
 *
 * Source: Zehner & Schluender 1970, Bauer & Schluender 1978, as in the VDI Heat Atlas D6.3.
 */
export function zehnerBauerSchluender(bed: ParticleBed): number {
  const { fluid_W_mK: kf, void_fraction: eps, emissivity } = bed;
  const { form, contact } = SHAPES[bed.shape];
  const kp = bed.solid_W_mK / kf;
  const kr =
    emissivity > 0
      ? ((4 * STEFAN_BOLTZMANN) / (2 / emissivity - 1)) *
        bed.temperature_K ** 3 *
        (bed.particle_diameter_m / kf)
      : 0;
  const B = form * ((1 - eps) / eps) ** (10 / 9);
  const N = 1 + (kr - B) / kp;
  const cell =
    (2 / N) *
    (((B * (kp + kr - 1)) / (N * N * kp)) * Math.log((kp + kr) / B) +
      ((B + 1) / (2 * B)) * (kr - B) -
      (B - 1) / N);
  const s = Math.sqrt(1 - eps);
  return kf * ((1 - s) * (1 + eps * kr) + s * (contact * kp + (1 - contact) * cell));
}

/**
 * Conductivity of a bed without flow [W/mK] from its definition, before the tuned factor. Between
 * pieces in a gas heat also passes by radiation; a liquid is taken as opaque.
 */
export function stagnantConductivity(bed: BedDefinition, temperature_K: number): number {
  return zehnerBauerSchluender({
    fluid_W_mK: bed.fluid.conductivity(temperature_K),
    solid_W_mK: bed.solid.conductivity(temperature_K),
    particle_diameter_m: bed.particle_diameter_m,
    void_fraction: bed.void_fraction,
    emissivity: bed.fluid.phase === 'gas' ? bed.solid.emissivity : 0,
    temperature_K,
    shape: bed.particle_shape,
  });
}

/**
 * Mixing along the flow 0.5 Re Pr k_f = 0.5 |G| cf d [W/mK] (Wakao & Kaguei 1982).
 *
 * @param massFlux_kg_m2s G, of either sign
 */
export function mixingConductivity(
  bed: BedDefinition,
  massFlux_kg_m2s: number,
  temperature_K: number,
): number {
  const cf = bed.fluid.heatCapacity(temperature_K);
  return 0.5 * Math.abs(massFlux_kg_m2s) * cf * bed.particle_diameter_m;
}

/**
 * Conductivity along the flow [W/mK]: conductivity_factor k_bed + 0.5 Re Pr k_f.
 *
 * @param massFlux_kg_m2s G, of either sign; 0 while standing
 */
export function axialConductivity(
  bed: BedDefinition,
  massFlux_kg_m2s: number,
  temperature_K: number,
): number {
  return (
    bed.conductivity_factor * stagnantConductivity(bed, temperature_K) +
    mixingConductivity(bed, massFlux_kg_m2s, temperature_K)
  );
}
