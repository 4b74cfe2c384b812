/**
 * Fluids of the finer plant. Gases: polynomials in T/1000 K fitted to CoolProp 8.0.0 (air Lemmon
 * 2000, argon Tegeler 1999; transport Lemmon & Jacobsen 2004), valid 105-900 K, largest error
 * 0.2 %. Salt: NaNO3/KNO3 60/40 after Pacheco et al. 2002, constants.
 */
export interface TruthFluid {
  readonly name: string;
  readonly liquid: boolean;
  readonly gasConstant_J_kgK: number;
  heatCapacity(temperature_K: number): number;
  viscosity(temperature_K: number): number;
  conductivity(temperature_K: number): number;
  density(temperature_K: number, pressure_Pa: number): number;
}

function polynomial(scale: number, ...c: number[]) {
  return (T: number) => {
    const x = Math.min(Math.max(T, 105), 900) / 1000;
    let y = 0;
    for (let i = c.length - 1; i >= 0; i--) y = y * x + c[i]!;
    return scale * y;
  };
}

function gas(
  name: string,
  R: number,
  cp: (T: number) => number,
  mu: number[],
  k: number[],
): TruthFluid {
  return {
    name,
    liquid: false,
    gasConstant_J_kgK: R,
    heatCapacity: cp,
    viscosity: polynomial(1e-6, ...mu),
    conductivity: polynomial(1e-3, ...k),
    density: (T, p) => p / (R * T),
  };
}

export const FLUIDS: Readonly<Record<string, TruthFluid>> = {
  argon: gas(
    'argon',
    208.132,
    // 2.5 R/M: monatomic, so one number at every temperature.
    () => 520.333,
    [-0.7757888, 97.46445, -78.15031, 53.50362, -16.46327],
    [-0.6295396, 76.47748, -60.92103, 40.98291, -12.40263],
  ),
  air: gas(
    'air',
    287.05,
    polynomial(1, 1007.208, -36.76615, -75.62033, 716.2563, -480.886),
    [-0.5568883, 85.88544, -102.448, 115.8416, -77.94239, 22.57647],
    [-0.945536, 112.8368, -91.3524, 69.99136, -23.03536],
  ),
  salt: {
    name: 'salt',
    liquid: true,
    gasConstant_J_kgK: 0,
    heatCapacity: () => 1511.8,
    viscosity: () => 2.63e-3,
    conductivity: () => 0.52,
    density: () => 1835.6,
  },
};
