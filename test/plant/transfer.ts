/** Transfer laws of the finer plant, written for it alone. */

const STEFAN_BOLTZMANN = 5.670374419e-8;

/**
 * Conductivity of a bed with standing fluid [W/mK], Zehner-Bauer-Schluender with radiation:
 * k/kf = 1 - sqrt(1-e) + e (1 - sqrt(1-e)) kr + sqrt(1-e) [phi kp + (1-phi) kc],
 * kc = 2/N { B (kp+kr-1)/(N^2 kp) ln((kp+kr)/B) + (B+1)/(2B) (kr-B) - (B-1)/N },
 * N = 1 + (kr-B)/kp, B = Cf ((1-e)/e)^(10/9), kr = 4 sigma T^3 d/((2/emissivity - 1) kf).
 * Crushed rock: Cf = 1.4, flattened contact phi = 0.001; spheres: 1.25, 0.0077.
 */
export function bedConductivity(
  temperature_K: number,
  fluid_W_mK: number,
  solid_W_mK: number,
  diameter_m: number,
  voidFraction: number,
  emissivity: number,
  shape: 'crushed' | 'sphere' = 'crushed',
): number {
  const [form, flat] = shape === 'crushed' ? [1.4, 0.001] : [1.25, 0.0077];
  const kp = solid_W_mK / fluid_W_mK;
  const kr =
    (4 * STEFAN_BOLTZMANN * temperature_K ** 3 * diameter_m) / ((2 / emissivity - 1) * fluid_W_mK);
  const B = form * ((1 - voidFraction) / voidFraction) ** (10 / 9);
  const N = 1 + (kr - B) / kp;
  const core =
    (2 / N) *
    (((B * (kp + kr - 1)) / (N * N * kp)) * Math.log((kp + kr) / B) +
      ((B + 1) / (2 * B)) * (kr - B) -
      (B - 1) / N);
  const root = Math.sqrt(1 - voidFraction);
  return (
    fluid_W_mK * ((1 - root) * (1 + voidFraction * kr) + root * (flat * kp + (1 - flat) * core))
  );
}

/** Pressure gradient [Pa/m], Ergun 1952 for smooth grains. */
export function pressureGradient(
  massFlux_kg_m2s: number,
  density_kg_m3: number,
  viscosity_Pa_s: number,
  diameter_m: number,
  voidFraction: number,
): number {
  const G = Math.abs(massFlux_kg_m2s);
  const open = voidFraction ** 3;
  const laminar = (150 * (1 - voidFraction) ** 2 * viscosity_Pa_s * G) / (open * diameter_m ** 2);
  const turbulent = (1.75 * (1 - voidFraction) * G * G) / (open * diameter_m);
  return (laminar + turbulent) / density_kg_m3;
}

/** A property over temperature as a dense table: one look-up instead of powers in every cell. */
export class TemperatureTable {
  readonly values: Float64Array;
  static readonly LOW_K = 70;
  static readonly STEP_K = 0.5;
  constructor(property: (temperature_K: number) => number) {
    this.values = Float64Array.from({ length: 2460 }, (_, i) =>
      property(TemperatureTable.LOW_K + i * TemperatureTable.STEP_K),
    );
  }
  at(temperature_K: number): number {
    return this.values[((temperature_K - 70) * 2 + 0.5) | 0]!;
  }
}
