import type { Fluid } from '../core/definitions.js';

/**
 * Vapour pressure on the dew line, ln(p/pc) = (Tc/T) sum a_i theta^(n_i), theta = 1 - T/Tc.
 * Argon: Tegeler, Span & Wagner, J. Phys. Chem. Ref. Data 28 (1999) 779. Nitrogen: Span et al.,
 * J. Phys. Chem. Ref. Data 29 (2000) 1361. Air, dew line: Lemmon et al., J. Phys. Chem. Ref. Data
 * 29 (2000) 331. Coefficients from memory; a test holds them against published boiling points.
 */
interface DewLine {
  readonly critical_K: number;
  readonly critical_Pa: number;
  readonly terms: readonly (readonly [coefficient: number, exponent: number])[];
}

const DEW_LINES: Readonly<Record<string, DewLine>> = {
  argon: {
    critical_K: 150.687,
    critical_Pa: 4.863e6,
    terms: [
      [-5.9409785, 1],
      [1.3553888, 1.5],
      [-0.46497607, 2],
      [-1.5399043, 4.5],
    ],
  },
  nitrogen: {
    critical_K: 126.192,
    critical_Pa: 3.3958e6,
    terms: [
      [-6.12445284, 1],
      [1.2632722, 1.5],
      [-0.765910082, 2.5],
      [-1.77570564, 5],
    ],
  },
  air: {
    critical_K: 132.6312,
    critical_Pa: 3.78502e6,
    terms: [
      [-0.1567266, 0.5],
      [-5.539635, 1],
      [0.7567212, 2.5],
      [-3.514322, 4],
    ],
  },
};

function vapourPressure_Pa(line: DewLine, temperature_K: number): number {
  const theta = 1 - temperature_K / line.critical_K;
  const sum = line.terms.reduce((s, [a, n]) => s + a * theta ** n, 0);
  return line.critical_Pa * Math.exp((line.critical_K / temperature_K) * sum);
}

/**
 * Temperature [K] at which a gas begins to liquefy at a pressure [Pa]: the root of the vapour
 * pressure curve, by bisection to 1 mK. The critical temperature where the pressure is above the
 * critical one (below it the fluid is dense there, not a gas); null for a fluid without a curve.
 */
export function dewPoint_K(fluid: Fluid, pressure_Pa: number): number | null {
  const line = Object.hasOwn(DEW_LINES, fluid.name) ? DEW_LINES[fluid.name] : undefined;
  if (line === undefined || fluid.phase !== 'gas') return null;
  if (!(pressure_Pa > 0)) throw new RangeError(`pressure_Pa must be above 0, got ${pressure_Pa}`);
  if (pressure_Pa >= line.critical_Pa) return line.critical_K;
  let low = 30;
  let high = line.critical_K;
  while (high - low > 1e-3) {
    const middle = (low + high) / 2;
    if (vapourPressure_Pa(line, middle) < pressure_Pa) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}
