import type { Direction, Mode } from '../definitions.js';

/**
 * One stretch of a plan: what the unit is asked for at the connection point. Times are seconds from
 * the state that the plan starts from.
 */
export interface Leg {
  readonly mode: Mode;
  /** Net power [W], at least 0: taken while charging, given while discharging; 0 while standing. */
  readonly power_W: number;
  readonly from_s: number;
  /** Later than `from_s`; Infinity = until a rule ends it, for the last leg alone. */
  readonly to_s: number;
}

/** What the unit may take and give between two times, for whatever reason. */
export interface Ceiling {
  readonly from_s: number;
  readonly to_s: number;
  /** [W] at the connection point. */
  readonly charge_max_W: number;
  readonly discharge_max_W: number;
  readonly cause: 'connection' | 'outage';
}

/** Why a leg is not carried out as asked, though the beds could. */
export const COMMAND_CAUSES = [
  'start_up',
  'change_over',
  'below_least_power',
  'above_greatest_power',
  'connection',
  'outage',
] as const;
export type CommandCause = (typeof COMMAND_CAUSES)[number];

/** Signed net power of a leg at the connection point [W], + = given. */
export function signedPower(mode: Mode, power_W: number): number {
  if (mode === 'stand') return 0;
  return mode === 'discharge' ? power_W : -power_W;
}

/** Direction of a leg that runs; null while standing. */
export function directionOf(leg: Leg): Direction | null {
  return leg.mode === 'stand' || leg.power_W === 0 ? null : leg.mode;
}

/**
 * Holds a list of legs against what every plan needs.
 *
 * @throws RangeError naming the leg: out of order, overlapping, ending before it begins, a power below
 *   0 or not finite, an open end that is not the last
 */
export function requireLegs(legs: readonly Leg[]): void {
  let last = 0;
  legs.forEach((leg, i) => {
    const name = `legs[${i}]`;
    if (!(leg.from_s >= 0))
      throw new RangeError(`${name}.from_s = ${leg.from_s}: expected 0 or more`);
    if (!(leg.from_s >= last)) {
      throw new RangeError(
        `${name}.from_s = ${leg.from_s}: expected ${last} or later, legs in order`,
      );
    }
    if (!(leg.to_s > leg.from_s)) {
      throw new RangeError(
        `${name}.to_s = ${leg.to_s}: expected later than from_s = ${leg.from_s}`,
      );
    }
    if (!(leg.power_W >= 0 && Number.isFinite(leg.power_W))) {
      throw new RangeError(`${name}.power_W = ${leg.power_W}: expected a finite number, 0 or more`);
    }
    if (leg.to_s === Number.POSITIVE_INFINITY && i < legs.length - 1) {
      throw new RangeError(`${name}.to_s = Infinity: only the last leg may be open`);
    }
    last = leg.to_s;
  });
}
