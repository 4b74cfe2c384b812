import type { Fluid } from '../definitions.js';
import { requirePositive } from '../misuse.js';
import { derivativeOf, integralOf, polynomial } from '../polynomial.js';
import { type CriticalPoint, secondVirial } from './fluidsVirial.js';

/** Polynomials in x = T/1000 K; the three gases are those of fixtures/gas_property_fits_105_900K.csv. */
interface GasFit {
  readonly gasConstant_J_kgK: number;
  readonly critical: CriticalPoint;
  /** Ideal-gas heat capacity [J/kgK]. */
  readonly heatCapacity: readonly number[];
  /** At 1 atm [uPa s]. */
  readonly viscosity: readonly number[];
  /** At 1 atm [mW/mK]. */
  readonly conductivity: readonly number[];
}

const FIT_RANGE_K = [105, 900] as const;

const GAS_FITS = {
  air: {
    // R/M, R = 8.31451 J/molK as in the equations of state, M = 28.96546 g/mol of CoolProp's air.
    gasConstant_J_kgK: 8.31451 / 0.02896546,
    critical: { temperature_K: 132.53, pressure_Pa: 3.786e6, acentric: 0.0335 },
    heatCapacity: [1007.208, -36.76615, -75.62033, 716.2563, -480.886],
    viscosity: [-0.5568883, 85.88544, -102.448, 115.8416, -77.94239, 22.57647],
    conductivity: [-0.945536, 112.8368, -91.3524, 69.99136, -23.03536],
  },
  nitrogen: {
    // M = 28.01348 g/mol, Span et al. 2000.
    gasConstant_J_kgK: 8.31451 / 0.02801348,
    critical: { temperature_K: 126.192, pressure_Pa: 3.3958e6, acentric: 0.0372 },
    heatCapacity: [1034.462, 91.93513, -591.1764, 1355.29, -734.5741],
    viscosity: [-0.3749862, 82.07122, -97.22656, 108.4103, -71.73172, 20.45811],
    conductivity: [-0.971851, 112.6925, -96.37287, 74.36455, -24.54406],
  },
  argon: {
    // A monatomic gas: cp0 = 2.5 R/M, so that the isentropic exponent is 5/3 to the last bit.
    gasConstant_J_kgK: 520.3333 / 2.5,
    critical: { temperature_K: 150.687, pressure_Pa: 4.863e6, acentric: -0.0022 },
    heatCapacity: [520.3333],
    viscosity: [-0.7757888, 97.46445, -78.15031, 53.50362, -16.46327],
    conductivity: [-0.6295396, 76.47748, -60.92103, 40.98291, -12.40263],
  },
} as const satisfies Record<string, GasFit>;

const GAS_SOURCE =
  'polynomial fit 105-900 K to CoolProp 8.0.0 (air Lemmon 2000, nitrogen Span 2000, argon Tegeler 1999; ' +
  'transport Lemmon & Jacobsen 2004); heat capacity of the ideal gas, transport at 1 atm';

/**
 * Value of a transport polynomial [its own unit]; beyond the fit's ends it goes on as the power
 * law a T^n with the value and slope of that end, since viscosity and conductivity of a dilute
 * gas follow about T^0.7, where the polynomial itself would soon turn.
 */
function transport(
  coefficients: readonly number[],
  scale: number,
): (temperature_K: number) => number {
  const slopeOf = derivativeOf(coefficients);
  const [low, high] = FIT_RANGE_K;
  const end = (at: number) => {
    const x = at / 1000;
    const value = polynomial(coefficients, x);
    return { at, value, exponent: (x * polynomial(slopeOf, x)) / value };
  };
  const below = end(low);
  const above = end(high);
  return (temperature_K) => {
    if (temperature_K >= low && temperature_K <= high) {
      return scale * polynomial(coefficients, temperature_K / 1000);
    }
    const from = temperature_K < low ? below : above;
    return scale * from.value * (temperature_K / from.at) ** from.exponent;
  };
}

/**
 * Gas at one pressure. The ideal gas has no `virial`; with it, per kilogram of gas,
 *
 *   h = h0 + p (B - T B'),  cp = cp0 - p T B'',  s = s0 - p B',  rho = p/(R T + p B)
 */
function gasOf(name: string, fit: GasFit, pressure_Pa: number | null): Fluid {
  const [low, high] = FIT_RANGE_K;
  const R = fit.gasConstant_J_kgK;
  const integral = integralOf(fit.heatCapacity);
  // Integral of cp/T: c0 ln T + c1 x + c2 x^2/2 + ...
  const entropyTail = [0, ...fit.heatCapacity.slice(1).map((c, i) => c / (i + 1))];
  const virial = pressure_Pa === null ? null : secondVirial(R, fit.critical);
  const p = pressure_Pa ?? 0;

  const cpWithin = (T: number): number => {
    const ideal = polynomial(fit.heatCapacity, T / 1000);
    return virial ? ideal - p * T * virial.curvature(T) : ideal;
  };
  const hWithin = (T: number): number => {
    const ideal = 1000 * polynomial(integral, T / 1000);
    return virial ? ideal + p * (virial.value(T) - T * virial.slope(T)) : ideal;
  };
  const sWithin = (T: number): number => {
    const ideal = (fit.heatCapacity[0] as number) * Math.log(T) + polynomial(entropyTail, T / 1000);
    return virial ? ideal - p * virial.slope(T) : ideal;
  };
  const cpLow = cpWithin(low);
  const cpHigh = cpWithin(high);
  const hLow = hWithin(low);
  const hHigh = hWithin(high);
  const sLow = sWithin(low);
  const sHigh = sWithin(high);
  return Object.freeze({
    name,
    source: virial ? `${GAS_SOURCE}; second virial coefficient at ${p} Pa` : GAS_SOURCE,
    phase: 'gas' as const,
    range_K: FIT_RANGE_K,
    gasConstant_J_kgK: R,
    heatCapacity(temperature_K: number) {
      if (temperature_K < low) return cpLow;
      return temperature_K > high ? cpHigh : cpWithin(temperature_K);
    },
    enthalpy(temperature_K: number) {
      if (temperature_K < low) return hLow + cpLow * (temperature_K - low);
      if (temperature_K > high) return hHigh + cpHigh * (temperature_K - high);
      return hWithin(temperature_K);
    },
    entropy(temperature_K: number) {
      if (temperature_K < low) return sLow + cpLow * Math.log(temperature_K / low);
      if (temperature_K > high) return sHigh + cpHigh * Math.log(temperature_K / high);
      return sWithin(temperature_K);
    },
    viscosity_Pa_s: transport(fit.viscosity, 1e-6),
    conductivity: transport(fit.conductivity, 1e-3),
    density_kg_m3(temperature_K: number, at_Pa: number) {
      const B = virial ? virial.value(Math.max(temperature_K, low)) : 0;
      return at_Pa / (R * temperature_K + at_Pa * B);
    },
  });
}

export interface LiquidProperties {
  readonly name: string;
  readonly density_kg_m3: number;
  readonly heat_capacity_J_kgK: number;
  readonly viscosity_Pa_s: number;
  readonly conductivity_W_mK: number;
  readonly source?: string;
  /** Temperatures at which the constants are meant to be used [K]. */
  readonly range_K?: readonly [number, number];
}

/**
 * Liquid of constant properties; its enthalpy is cp T and its density does not know the pressure.
 *
 * @returns a frozen Fluid with a gas constant of 0
 * @throws RangeError for a property that is not above 0
 */
export function liquidOf(properties: LiquidProperties): Fluid {
  const density = requirePositive('density_kg_m3', properties.density_kg_m3);
  const cp = requirePositive('heat_capacity_J_kgK', properties.heat_capacity_J_kgK);
  const viscosity = requirePositive('viscosity_Pa_s', properties.viscosity_Pa_s);
  const conductivity = requirePositive('conductivity_W_mK', properties.conductivity_W_mK);
  return Object.freeze({
    name: properties.name,
    source: properties.source ?? 'given by the configuration',
    phase: 'liquid' as const,
    range_K: properties.range_K ?? ([0, Number.POSITIVE_INFINITY] as const),
    gasConstant_J_kgK: 0,
    heatCapacity: () => cp,
    enthalpy: (temperature_K: number) => cp * temperature_K,
    viscosity_Pa_s: () => viscosity,
    conductivity: () => conductivity,
    density_kg_m3: () => density,
  });
}

const SOLAR_SALT = liquidOf({
  name: 'solar_salt',
  density_kg_m3: 1835.6,
  heat_capacity_J_kgK: 1511.8,
  viscosity_Pa_s: 2.63e-3,
  conductivity_W_mK: 0.52,
  source: 'NaNO3/KNO3 60/40 at about 340 degC, Pacheco, Showalter & Kolb 2002',
  range_K: [563.15, 669.15],
});

type GasName = keyof typeof GAS_FITS;
const GAS_NAMES = Object.keys(GAS_FITS) as GasName[];

const FLUIDS: ReadonlyMap<string, Fluid> = new Map<string, Fluid>([
  ...GAS_NAMES.map((name) => [name, gasOf(name, GAS_FITS[name], null)] as const),
  ['solar_salt', SOLAR_SALT],
]);

/** Names that `fluidByName` knows. */
export const FLUID_NAMES: readonly string[] = Object.freeze([...FLUIDS.keys()]);

/**
 * Named heat-carrying fluid: the gases air, nitrogen and argon (ideal-gas density p/(R T) and heat
 * capacity, transport at 1 atm), and solar_salt at constant properties. Below 105 K and above
 * 900 K the heat capacity of a gas keeps its end value, and its enthalpy goes on as the integral.
 *
 * The ideal gas leaves out what pressure adds to cp: at 10.5 bar 2 % at ambient temperature, and far
 * more below -100 degC; at 1 atm 1 % at -120 degC. `gasAtPressure` brings that in.
 *
 * @throws RangeError for a name that is not in FLUID_NAMES
 */
export function fluidByName(name: string): Fluid {
  const fluid = FLUIDS.get(name);
  if (!fluid) {
    throw new RangeError(`name must be one of ${FLUID_NAMES.join(', ')}, got ${name}`);
  }
  return fluid;
}

/** Gases at the pressures asked for: stores that are alike have the same one. */
const AT_PRESSURE = new Map<string, Fluid>();
const MOST_PRESSURES = 64;

/**
 * The same fluid with the heat capacity, enthalpy and density that a real gas has at one pressure,
 * by its second virial coefficient: for a store, whose pressure is fixed. cp stays the exact
 * derivative of the enthalpy. A liquid is returned as it is. A gas cycle takes the ideal gas of
 * `fluidByName`: its polytropic relation is that of an ideal gas.
 *
 * Good to 0.5 % of cp and 0.2 % of density where the density is within 5 % of the ideal gas's (at
 * 10.5 bar: above -100 degC); nearer to the dew point it still halves the error.
 *
 * @param pressure_Pa above 0
 * @throws RangeError for an unknown name or an impossible pressure
 */
export function gasAtPressure(name: string, pressure_Pa: number): Fluid {
  requirePositive('pressure_Pa', pressure_Pa);
  const gas = GAS_NAMES.find((known) => known === name);
  if (!gas) return fluidByName(name);
  const key = `${name} ${pressure_Pa}`;
  const made = AT_PRESSURE.get(key) ?? gasOf(name, GAS_FITS[gas], pressure_Pa);
  AT_PRESSURE.set(key, made);
  if (AT_PRESSURE.size > MOST_PRESSURES) AT_PRESSURE.clear();
  return made;
}
