import { polynomial } from '../polynomial.js';
import { type ReferencePiece, THERMOCOUPLE_TABLES } from './its90Tables.js';

export type ThermocoupleType = keyof typeof THERMOCOUPLE_TABLES;
export const THERMOCOUPLE_TYPES = ['K', 'N', 'T', 'J'] as const;

/** Why a voltage has no temperature. */
export const THERMOCOUPLE_REASONS = [
  'not_a_number',
  'below_range',
  'above_range',
  'cold_junction_out_of_range',
] as const;
export type ThermocoupleReason = (typeof THERMOCOUPLE_REASONS)[number];

/** Range [degC] that a reference junction can have; beyond it the junction's own sensor is at fault. */
const COLD_JUNCTION_RANGE = [-50, 100] as const;

/** A voltage this little beyond an end [mV] is the end: rounding of the polynomial, 1e-6 K at most. */
const END_ROUNDING_mV = 1e-9;

function pieceAt(type: ThermocoupleType, celsius: number): ReferencePiece {
  const { reference } = THERMOCOUPLE_TABLES[type];
  const first = reference[0] as ReferencePiece;
  return celsius <= first.to ? first : ((reference[1] ?? first) as ReferencePiece);
}

function voltageIn(piece: ReferencePiece, celsius: number): number {
  const sum = polynomial(piece.c, celsius);
  if (!piece.a) return sum;
  const distance = celsius - piece.a[2];
  return sum + piece.a[0] * Math.exp(piece.a[1] * distance * distance);
}

function slopeIn(piece: ReferencePiece, celsius: number): number {
  let slope = 0;
  for (let i = piece.c.length - 1; i >= 1; i--)
    slope = slope * celsius + i * (piece.c[i] as number);
  if (!piece.a) return slope;
  const distance = celsius - piece.a[2];
  return (
    slope + 2 * piece.a[0] * piece.a[1] * distance * Math.exp(piece.a[1] * distance * distance)
  );
}

/** Range of a type's reference function [degC]. */
export function thermocoupleRange_degC(type: ThermocoupleType): readonly [number, number] {
  const { reference } = THERMOCOUPLE_TABLES[type];
  return [
    (reference[0] as ReferencePiece).from,
    (reference[reference.length - 1] as ReferencePiece).to,
  ];
}

/**
 * Voltage E(T) [mV] of a thermocouple whose reference junction is at 0 degC.
 *
 * @param celsius temperature of the measuring junction [degC], within `thermocoupleRange_degC`
 * @throws RangeError outside the range of the reference function
 * Source: NIST Monograph 175 (1993), IEC 60584-1.
 */
export function millivoltFromCelsius(type: ThermocoupleType, celsius: number): number {
  const [low, high] = thermocoupleRange_degC(type);
  if (!(celsius >= low && celsius <= high)) {
    throw new RangeError(`celsius must lie between ${low} and ${high} for ${type}, got ${celsius}`);
  }
  return voltageIn(pieceAt(type, celsius), celsius);
}

/** Seebeck coefficient dE/dT [mV/K] at a temperature [degC]. */
export function seebeck_mV_K(type: ThermocoupleType, celsius: number): number {
  return slopeIn(pieceAt(type, celsius), celsius);
}

/** The approximate inverse, taken at its nearest end beyond its range. */
function approximateInverse(type: ThermocoupleType, millivolt: number): number {
  const { inverse } = THERMOCOUPLE_TABLES[type];
  let last = inverse[0] as (typeof inverse)[number];
  for (const piece of inverse) {
    last = piece;
    if (millivolt <= piece.to) break;
  }
  return polynomial(last.d, Math.min(Math.max(millivolt, last.from), last.to));
}

/**
 * Temperature [degC] at a voltage against a reference junction at 0 degC.
 *
 * The inverse of `millivoltFromCelsius`, which grows over its whole range: Newton's steps from the
 * approximate inverse, held inside a shrinking bracket, to below 1e-9 K. Near -270 degC the slope
 * is a few uV/K only, and so much less is the voltage worth there.
 */
export function celsiusFromCompensated(
  type: ThermocoupleType,
  millivolt: number,
): number | ThermocoupleReason {
  if (!Number.isFinite(millivolt)) return 'not_a_number';
  let [low, high] = thermocoupleRange_degC(type);
  if (millivolt < voltageIn(pieceAt(type, low), low) - END_ROUNDING_mV) return 'below_range';
  if (millivolt > voltageIn(pieceAt(type, high), high) + END_ROUNDING_mV) return 'above_range';
  let T = Math.min(Math.max(approximateInverse(type, millivolt), low), high);
  for (let i = 0; i < 60; i++) {
    const piece = pieceAt(type, T);
    const miss = voltageIn(piece, T) - millivolt;
    if (miss > 0) high = T;
    else low = T;
    let next = T - miss / slopeIn(piece, T);
    if (!(next >= low && next <= high)) next = (low + high) / 2;
    if (Math.abs(next - T) < 1e-9) return next;
    T = next;
  }
  return T;
}

/**
 * Temperature [degC] of the measuring junction from the voltage at the terminals:
 * E(T) = E_terminals + E(T_junction).
 *
 * @param millivolt at the terminals [mV]; NaN gives a reason, not an error: a bad reading is data
 * @param coldJunction_degC temperature of the terminals
 * @returns a number, or the reason why there is none
 */
export function celsiusFromMillivolt(
  type: ThermocoupleType,
  millivolt: number,
  coldJunction_degC: number,
): number | ThermocoupleReason {
  if (Number.isNaN(millivolt) || Number.isNaN(coldJunction_degC)) return 'not_a_number';
  if (coldJunction_degC < COLD_JUNCTION_RANGE[0] || coldJunction_degC > COLD_JUNCTION_RANGE[1]) {
    return 'cold_junction_out_of_range';
  }
  return celsiusFromCompensated(
    type,
    millivolt + voltageIn(pieceAt(type, coldJunction_degC), coldJunction_degC),
  );
}
