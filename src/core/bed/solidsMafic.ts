import { integralOf, polynomial } from '../polynomial.js';
import type { LowTemperatureForm } from './solidsLowTemperature.js';

/**
 * Heat capacity of basaltic rock from 20 K to the foot of its fit at about 298 K, by the curve that
 * Hayne et al., JGR Planets 122 (2017) 2371, table A1, lay through the calorimetry of Hemingway,
 * Robie & Wilson (Proc. Lunar Sci. Conf. 4, 1973) on basalt and basaltic soil, 90-350 K:
 *
 *   c(T) = c0 + c1 T + c2 T^2 + c3 T^3 + c4 T^4 [J/kgK]
 *
 * Feldspar and pyroxene hold more heat in the cold than quartz and spinel, whose values chose the
 * continuum of `lowTemperatureForm`: that lies 3.3 % lower at 150 K. Two other curves through
 * measurements on such rock (Winter & Saari 1969; Ledlow et al. 1992) give c(150 K)/c(298 K) = 0.54
 * and 0.57, this one 0.55.
 */
const COEFFICIENTS = [-3.6125, 2.7431, 2.3616e-3, -1.234e-5, 8.9093e-9];
/** The curve is fitted to nothing colder; from here c falls in line with T to 0 [K]. */
const FOOT_K = 20;

/**
 * The curve scaled to a value at the lower end of a fit; the slope steps there.
 *
 * @param end_K lower end of the fit [K]
 * @param value c_s there [J/kgK]
 * @returns c_s(T) [J/kgK] and its exact integral [J/kg], which is 0 at T = 0
 */
export function maficForm(end_K: number, value: number): LowTemperatureForm {
  const scale = value / polynomial(COEFFICIENTS, end_K);
  const integral = integralOf(COEFFICIENTS);
  const atFoot = polynomial(COEFFICIENTS, FOOT_K);
  const shift = (atFoot * FOOT_K) / 2 - polynomial(integral, FOOT_K);
  return {
    slopeContinuous: false,
    heatCapacity: (T) => scale * (T < FOOT_K ? (atFoot * T) / FOOT_K : polynomial(COEFFICIENTS, T)),
    enthalpy: (T) =>
      scale * (T < FOOT_K ? (atFoot * T * T) / (2 * FOOT_K) : polynomial(integral, T) + shift),
  };
}
