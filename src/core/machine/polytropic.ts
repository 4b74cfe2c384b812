import type { Fluid } from '../definitions.js';

/**
 * Temperature [K] after a polytropic change of pressure of an ideal gas with cp(T).
 *
 * With dh = v dp/eta (compression) or eta v dp (expansion) and v = R T/p:
 *
 *   integral of cp/T dT = s0(T2) - s0(T1) = R exponent,
 *   exponent = ln(p2/p1)/eta (compression) or eta ln(p2/p1) (expansion)
 *
 * Constant cp: T2 = T1 exp(R exponent/cp), which is also where the search starts, so that a
 * monatomic gas needs none. Newton's steps in ln T, whose slope is cp, settle at float spacing.
 *
 * @param gas with an entropy
 * @param exponent as above [-]
 */
export function polytropicEnd(gas: Fluid, start_K: number, exponent: number): number {
  const entropy = gas.entropy as (temperature_K: number) => number;
  const target = entropy(start_K) + gas.gasConstant_J_kgK * exponent;
  let T = start_K * Math.exp((gas.gasConstant_J_kgK * exponent) / gas.heatCapacity(start_K));
  // cp varies by tens of percent at most: four steps reach 1e-12, the rest is margin.
  for (let i = 0; i < 12; i++) {
    const step = (target - entropy(T)) / gas.heatCapacity(T);
    if (Math.abs(step) < 4 * Number.EPSILON) break;
    T *= Math.exp(step);
  }
  return T;
}
