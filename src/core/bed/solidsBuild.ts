import type { Solid } from '../definitions.js';
import { requireAscending, requireEfficiency, requirePositive } from '../misuse.js';
import { integralOf, polynomial } from '../polynomial.js';
import { type LowTemperatureShape, lowTemperatureForm } from './solidsLowTemperature.js';
import { maficForm } from './solidsMafic.js';

/** Below its range c_s keeps its end value, or follows the vibrations of the lattice or measured basalt. */
export type BelowRange = 'end_value' | 'mafic_rock' | LowTemperatureShape;

/** What every way of making a solid asks for. */
export interface SolidFacts {
  readonly name: string;
  readonly source?: string;
  readonly density_kg_m3: number;
  /** Conductivity of one piece [W/mK], a constant or a function of T [K]. */
  readonly conductivity_W_mK: number | ((temperature_K: number) => number);
  readonly emissivity: number;
  /** Default `end_value`: data of the configuration are taken as they are. */
  readonly below?: BelowRange;
}

/** c_s over its range, and the exact antiderivative of the same function. */
interface Curve {
  readonly range_K: readonly [number, number];
  heatCapacity(temperature_K: number): number;
  enthalpy(temperature_K: number): number;
  /** dc_s/dT just above the lower end [J/kgK2]. */
  readonly slopeAtLow: number;
}

function solidOf(facts: SolidFacts, curve: Curve): Solid {
  const density = requirePositive('density_kg_m3', facts.density_kg_m3);
  const k = facts.conductivity_W_mK;
  if (typeof k === 'number') requirePositive('conductivity_W_mK', k);
  requireEfficiency('emissivity', facts.emissivity);
  const [low, high] = curve.range_K;
  const cLow = requirePositive(`heat capacity at ${low} K`, curve.heatCapacity(low));
  const cHigh = requirePositive(`heat capacity at ${high} K`, curve.heatCapacity(high));
  const hLow = curve.enthalpy(low);
  const hHigh = curve.enthalpy(high);
  const below = facts.below ?? 'end_value';
  const lattice =
    below === 'end_value'
      ? null
      : below === 'mafic_rock'
        ? maficForm(low, cLow)
        : lowTemperatureForm(below, low, cLow, curve.slopeAtLow);
  const hShift = lattice ? hLow - lattice.enthalpy(low) : 0;
  return Object.freeze({
    name: facts.name,
    source: facts.source ?? 'given by the configuration',
    range_K: curve.range_K,
    density_kg_m3: density,
    emissivity: facts.emissivity,
    heatCapacity(temperature_K: number) {
      if (temperature_K < low) return lattice ? lattice.heatCapacity(temperature_K) : cLow;
      return temperature_K > high ? cHigh : curve.heatCapacity(temperature_K);
    },
    enthalpy(temperature_K: number) {
      if (temperature_K < low) {
        return lattice
          ? lattice.enthalpy(temperature_K) + hShift
          : hLow + cLow * (temperature_K - low);
      }
      if (temperature_K > high) return hHigh + cHigh * (temperature_K - high);
      return curve.enthalpy(temperature_K);
    },
    conductivity: typeof k === 'number' ? () => k : k,
  });
}

export interface PolynomialFacts extends SolidFacts {
  /** c_s = sum of coefficients[i] x^i + inverse_square/x^2 + inverse_root/sqrt(x) [J/kgK], x = T - zero_K. */
  readonly coefficients: readonly number[];
  readonly inverse_square?: number;
  readonly inverse_root?: number;
  /** Temperature at which x is 0: 0 for a polynomial in kelvin (default), 273.15 for one in degC. */
  readonly zero_K?: number;
  readonly range_K: readonly [number, number];
}

/**
 * Solid whose heat capacity is a polynomial, with the terms 1/T^2 and 1/sqrt(T) of the usual
 * mineralogical forms. The enthalpy is its closed-form integral.
 *
 * Above the range c_s keeps its end value; below it as `below` says.
 *
 * @throws RangeError where the range does not ascend, c_s is not above 0 at one of 200 temperatures
 *   over it, an inverse term meets a zero_K, or density, conductivity or emissivity is impossible
 */
export function solidFromPolynomial(facts: PolynomialFacts): Solid {
  const { coefficients } = facts;
  const zero = facts.zero_K ?? 0;
  const a = facts.inverse_square ?? 0;
  const b = facts.inverse_root ?? 0;
  requireAscending('range_K', facts.range_K);
  requirePositive('range_K[0]', facts.range_K[0]);
  if ((a !== 0 || b !== 0) && zero !== 0) {
    throw new RangeError(`zero_K must be 0 beside inverse terms, got ${zero}`);
  }
  const integral = integralOf(coefficients);
  const inverse = a !== 0 || b !== 0;
  const heatCapacity = (T: number): number => {
    const sum = polynomial(coefficients, T - zero);
    return inverse ? sum + a / (T * T) + b / Math.sqrt(T) : sum;
  };
  const [low, high] = facts.range_K;
  for (let i = 0; i < 200; i++) {
    const T = low + ((high - low) * i) / 199;
    requirePositive(`heat capacity at ${T.toFixed(1)} K`, heatCapacity(T));
  }
  const step = 1e-3;
  return solidOf(facts, {
    range_K: facts.range_K,
    heatCapacity,
    enthalpy(T) {
      const sum = polynomial(integral, T - zero);
      return inverse ? sum - a / T + 2 * b * Math.sqrt(T) : sum;
    },
    slopeAtLow: (heatCapacity(low + step) - heatCapacity(low)) / step,
  });
}

export interface TableFacts extends SolidFacts {
  /** Ascending [K]. */
  readonly temperatures_K: readonly number[];
  /** c_s at each of them [J/kgK]; straight lines between. */
  readonly heatCapacities_J_kgK: readonly number[];
}

/**
 * Solid whose heat capacity runs in straight lines between the points of a table; the enthalpy is
 * the exact integral of those lines. Beyond the last point the end value goes on; below the first
 * as `below` says.
 *
 * @throws RangeError where the lists differ in length, hold fewer than two points, do not ascend,
 *   or a heat capacity is not above 0
 */
export function solidFromTable(facts: TableFacts): Solid {
  const n = facts.temperatures_K.length;
  requireAscending('temperatures_K', facts.temperatures_K);
  if (n < 2) throw new RangeError(`temperatures_K must hold at least two points, got ${n}`);
  if (facts.heatCapacities_J_kgK.length !== n) {
    throw new RangeError(
      `heatCapacities_J_kgK must be as long as temperatures_K (${n}), got ${facts.heatCapacities_J_kgK.length}`,
    );
  }
  facts.heatCapacities_J_kgK.forEach((c, i) => {
    requirePositive(`heatCapacities_J_kgK[${i}]`, c);
  });
  const T = Float64Array.from(facts.temperatures_K);
  requirePositive('temperatures_K[0]', T[0] as number);
  const c = Float64Array.from(facts.heatCapacities_J_kgK);
  const h = new Float64Array(n);
  for (let i = 1; i < n; i++) {
    const dT = (T[i] as number) - (T[i - 1] as number);
    h[i] = (h[i - 1] as number) + (dT * ((c[i] as number) + (c[i - 1] as number))) / 2;
  }
  const slope = new Float64Array(n - 1);
  for (let i = 0; i < n - 1; i++) {
    slope[i] =
      ((c[i + 1] as number) - (c[i] as number)) / ((T[i + 1] as number) - (T[i] as number));
  }
  /** Index of the interval that holds `at`. */
  const interval = (at: number): number => {
    let low = 0;
    let high = n - 1;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if ((T[middle] as number) <= at) low = middle;
      else high = middle;
    }
    return low;
  };
  return solidOf(facts, {
    range_K: [T[0] as number, T[n - 1] as number],
    heatCapacity(at) {
      const i = interval(at);
      return (c[i] as number) + (slope[i] as number) * (at - (T[i] as number));
    },
    enthalpy(at) {
      const i = interval(at);
      const d = at - (T[i] as number);
      return (h[i] as number) + d * ((c[i] as number) + ((slope[i] as number) * d) / 2);
    },
    slopeAtLow: slope[0] as number,
  });
}
