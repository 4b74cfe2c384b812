import {
  celsiusFromMillivolt,
  millivoltFromCelsius,
  type ThermocoupleReason,
  type ThermocoupleType,
  thermocoupleRange_degC,
} from './its90.js';

/**
 * What a thermocouple reads [degC] after its two wires change places at the terminals: the voltage
 * changes sign there, the junction of the terminals is taken into account as before,
 *
 *   E(T') = E(T_junction) - (E(T) - E(T_junction)).
 *
 * Its own inverse: from what one with reversed wires reads it gives what it measures, and from what
 * it measures what it will read. The mirror image 2 T_junction - T is off by the bend of the curve:
 * for type K at 100 degC with a junction at 25 degC by 6 K, at 200 degC by 68 K. From about 180 degC
 * (T, J, N) or 210 degC (K) on the voltage of reversed wires lies below all that the type can give:
 * there is no reading then.
 *
 * @param celsius what is read (or measured) [degC]
 * @param coldJunction_degC temperature of the terminals, as measured in the same scan
 * @returns a number, or the reason why there is none; a reading beyond its type's range is
 *          `not_a_number`, since no voltage makes it
 * Source: reference functions of NIST Monograph 175 (1993), IEC 60584-1.
 */
export function celsiusReversed(
  type: ThermocoupleType,
  celsius: number,
  coldJunction_degC: number,
): number | ThermocoupleReason {
  const [low, high] = thermocoupleRange_degC(type);
  if (!(celsius >= low && celsius <= high)) return 'not_a_number';
  if (Number.isNaN(coldJunction_degC)) return 'not_a_number';
  if (coldJunction_degC < low || coldJunction_degC > high) return 'cold_junction_out_of_range';
  const terminals =
    millivoltFromCelsius(type, celsius) - millivoltFromCelsius(type, coldJunction_degC);
  return celsiusFromMillivolt(type, -terminals, coldJunction_degC);
}
