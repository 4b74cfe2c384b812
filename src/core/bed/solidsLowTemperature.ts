import { requirePositive } from '../misuse.js';

/**
 * Heat capacity of a solid below the range of its fit.
 *
 * A fit to calorimetry above 298 K says nothing of what lies below: its terms in 1/T^2 and
 * 1/sqrt(T) soon turn negative. What is known there is the shape: lattice vibrations freeze out,
 * and c_s tends to 0. The continuation is a continuum of harmonic vibrations up to one cut-off,
 *
 *   c(T) = A * integral_0^1 E(theta u/T) n u^(n-1) du,   E(x) = x^2 exp(-x)/(1 - exp(-x))^2
 *
 * with n = 1 for silicates and spinels, whose chains and frameworks give a flat spectrum
 * (Tarasov's form of Debye's model), and n = 2 for the stiff, close-packed oxides (corundum,
 * periclase, hematite). Debye's own n = 3 falls too steeply for all of them. n was chosen on the
 * low-temperature values of quartz, alumina and magnetite; the tests state how well each is met.
 *
 * A and theta follow from the value and the slope of the fit at its lower end. The slope there is
 * the weakest point of a fit, and a straight line fitted up to 650 degC has far too small a one, so
 * for n = 1 the relative slope T c'/c at 298 K is held to the band of minerals that are measured
 * on both sides (magnetite 0.53, quartz 0.68, basalt 0.77); outside it the value stays continuous
 * and the slope steps. The heat capacity at -150 degC is then 0.44-0.50 of that at 25 degC.
 *
 * The integral is a five-point Gauss sum, which makes the enthalpy a closed form of the same sum.
 */
export type LowTemperatureShape = 'silicate' | 'close_packed_oxide';

export interface LowTemperatureForm {
  heatCapacity(temperature_K: number): number;
  enthalpy(temperature_K: number): number;
  /** False where the relative slope had to be held to the band. */
  readonly slopeContinuous: boolean;
}

/** Nodes on [0, 1] and weights of the five-point Gauss-Legendre rule. */
const NODES = [0.046910077030668, 0.23076534494715845, 0.5, 0.7692346550528415, 0.953089922969332];
const WEIGHTS = [
  0.11846344252809454, 0.23931433524968324, 0.28444444444444444, 0.23931433524968324,
  0.11846344252809454,
];

const SHAPES = {
  silicate: { order: 1, slopeBand: [0.52, 0.77] },
  close_packed_oxide: { order: 2, slopeBand: [0.1, 1.6] },
} as const;

/** Einstein's function of x = theta/T; 1 at x = 0, and 0 to the last bit beyond 700. */
function einstein(x: number): number {
  if (x > 700) return 0;
  const q = x / -Math.expm1(-x);
  return Math.exp(-x) * q * q;
}

function weightsOf(order: number): number[] {
  return WEIGHTS.map((w, i) => w * order * (NODES[i] as number) ** (order - 1));
}

function shapeSum(weights: readonly number[], x: number): number {
  let sum = 0;
  for (let i = 0; i < 5; i++) sum += (weights[i] as number) * einstein((NODES[i] as number) * x);
  return sum;
}

/** T c'/c of the shape at x = theta/T, from d ln E/d ln x = 2 - x coth(x/2). */
function relativeSlope(weights: readonly number[], x: number): number {
  let sum = 0;
  for (let i = 0; i < 5; i++) {
    const y = (NODES[i] as number) * x;
    sum += (weights[i] as number) * einstein(y) * (y / Math.tanh(y / 2) - 2);
  }
  return sum / shapeSum(weights, x);
}

/**
 * Continuation of a heat capacity below the lower end of its fit.
 *
 * @param shape which spectrum of vibrations the solid has
 * @param end_K lower end of the fit [K]
 * @param value c_s there [J/kgK]
 * @param slope dc_s/dT there [J/kgK2]
 * @returns c_s(T) [J/kgK] and its exact integral [J/kg], which is 0 at T = 0
 */
export function lowTemperatureForm(
  shape: LowTemperatureShape,
  end_K: number,
  value: number,
  slope: number,
): LowTemperatureForm {
  requirePositive('end_K', end_K);
  requirePositive('value', value);
  const { order, slopeBand } = SHAPES[shape];
  const weights = weightsOf(order);
  const wanted = (end_K * slope) / value;
  const target = Math.min(Math.max(wanted, slopeBand[0]), slopeBand[1]);

  // The relative slope of the shape grows with x throughout (0, 10]; halve until the spacing of floats.
  let low = 1e-3;
  let high = 10;
  for (let i = 0; i < 60; i++) {
    const middle = (low + high) / 2;
    if (relativeSlope(weights, middle) < target) low = middle;
    else high = middle;
  }
  const theta = low * end_K;
  const scale = value / shapeSum(weights, low);

  return {
    slopeContinuous: target === wanted,
    heatCapacity: (temperature_K) => scale * shapeSum(weights, theta / temperature_K),
    enthalpy(temperature_K) {
      let sum = 0;
      for (let i = 0; i < 5; i++) {
        const t = theta * (NODES[i] as number);
        sum += ((weights[i] as number) * t) / Math.expm1(t / temperature_K);
      }
      return scale * sum;
    },
  };
}
