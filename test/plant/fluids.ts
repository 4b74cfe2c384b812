/**
 * Fluids of the finer plant. Gases: polynomials in T/1000 K fitted to CoolProp 8.0.0 (air Lemmon
 * 2000, argon Tegeler 1999; transport Lemmon & Jacobsen 2004), valid 105-900 K, largest error
 * 0.2 %; what pressure adds comes from the second virial coefficient of Tsonopoulos (1974 [M]).
 * Salt: NaNO3/KNO3 60/40 after Pacheco et al. 2002, constants.
 */
export interface TruthFluid {
  readonly name: string;
  readonly liquid: boolean;
  heatCapacity(temperature_K: number): number;
  viscosity(temperature_K: number): number;
  conductivity(temperature_K: number): number;
  density(temperature_K: number): number;
}

type Property = (temperature_K: number) => number;

interface GasData {
  readonly molarMass_kg: number;
  readonly heatCapacity: Property;
  readonly viscosity: Property;
  readonly conductivity: Property;
  readonly critical_K: number;
  readonly critical_Pa: number;
  readonly acentric: number;
}

const R = 8.314462618;

function polynomial(scale: number, ...c: number[]): Property {
  return (T) => {
    const x = Math.min(Math.max(T, 105), 900) / 1000;
    let y = 0;
    for (let i = c.length - 1; i >= 0; i--) y = y * x + c[i]!;
    return scale * y;
  };
}

const GASES: Readonly<Record<string, GasData>> = {
  argon: {
    molarMass_kg: 0.039948,
    // 2.5 R/M: monatomic, so one number at every temperature.
    heatCapacity: () => 520.333,
    viscosity: polynomial(1e-6, -0.7757888, 97.46445, -78.15031, 53.50362, -16.46327),
    conductivity: polynomial(1e-3, -0.6295396, 76.47748, -60.92103, 40.98291, -12.40263),
    critical_K: 150.687,
    critical_Pa: 4.863e6,
    acentric: -0.0022,
  },
  air: {
    molarMass_kg: 0.0289655,
    heatCapacity: polynomial(1, 1007.208, -36.76615, -75.62033, 716.2563, -480.886),
    viscosity: polynomial(1e-6, -0.5568883, 85.88544, -102.448, 115.8416, -77.94239, 22.57647),
    conductivity: polynomial(1e-3, -0.945536, 112.8368, -91.3524, 69.99136, -23.03536),
    critical_K: 132.53,
    critical_Pa: 3.786e6,
    acentric: 0.0335,
  },
};

/** Terms (power of 1/Tr, factor) of B pc/(R Tc), Tsonopoulos: the simple part and that of w. */
const SIMPLE: readonly (readonly [number, number])[] = [
  [0, 0.1445],
  [1, -0.33],
  [2, -0.1385],
  [3, -0.0121],
  [8, -0.000607],
];
const ACENTRIC: readonly (readonly [number, number])[] = [
  [0, 0.0637],
  [2, 0.331],
  [3, -0.423],
  [8, -0.008],
];

/** B [m3/mol]. */
function virial(gas: GasData, T: number): number {
  const scale = (R * gas.critical_K) / gas.critical_Pa;
  const x = gas.critical_K / T;
  let B = 0;
  for (const [n, a] of SIMPLE) B += scale * a * x ** n;
  for (const [n, a] of ACENTRIC) B += scale * gas.acentric * a * x ** n;
  return B;
}

/** d2B/dT2 [m3/molK2]. */
function virialCurvature(gas: GasData, T: number): number {
  const scale = (R * gas.critical_K) / gas.critical_Pa;
  const x = gas.critical_K / T;
  let curvature = 0;
  for (const [terms, weight] of [
    [SIMPLE, 1],
    [ACENTRIC, gas.acentric],
  ] as const) {
    for (const [n, a] of terms) {
      curvature += (scale * weight * a * n * (n + 1) * x ** n) / (T * T);
    }
  }
  return curvature;
}

function realGas(name: string, gas: GasData, pressure_Pa: number): TruthFluid {
  // Below 90 K nothing is asked; held there so that the tables stay finite.
  const held = (T: number) => Math.max(T, 90);
  return {
    name,
    liquid: false,
    heatCapacity: (T) =>
      gas.heatCapacity(T) -
      (pressure_Pa * held(T) * virialCurvature(gas, held(T))) / gas.molarMass_kg,
    viscosity: gas.viscosity,
    conductivity: gas.conductivity,
    density: (T) => gas.molarMass_kg / ((R * T) / pressure_Pa + virial(gas, held(T))),
  };
}

/** A fluid at the pressure of its store: argon, air or salt; `air` and `argon` at 0 Pa are ideal. */
export function fluidAt(name: string, pressure_Pa: number): TruthFluid {
  const gas = GASES[name];
  if (gas) return realGas(name, gas, pressure_Pa);
  if (name !== 'salt') throw new RangeError(`fluid must be argon, air or salt, got ${name}`);
  return {
    name,
    liquid: true,
    heatCapacity: () => 1511.8,
    viscosity: () => 2.63e-3,
    conductivity: () => 0.52,
    density: () => 1835.6,
  };
}
