import { cyclePower_W } from '../../core/cycle/settledCycle.js';
import type { Direction, UnitDefinition } from '../../core/definitions.js';
import { type Command, commandOf, type RunningBefore } from '../../core/plan/command.js';
import { energyBetween } from '../../core/plan/course.js';
import { signedPower } from '../../core/plan/leg.js';

/** What limits of the machine make of one direction at its power in the cycle. */
export interface DirectionLimitFacts {
  readonly power_min_MW_el: number;
  readonly power_max_MW_el: number;
  /** From the command to that power: warm, cold, and out of the other direction at its own. */
  readonly from_warm_min: number;
  readonly from_cold_min: number;
  readonly from_other_direction_min: number;
  /** From that power down to none. */
  readonly ramp_down_min: number;
  /** What the first hour after a command lacks of that power [MWh_el], its draw before included. */
  readonly first_hour_lacks_warm_MWh_el: number;
  readonly first_hour_lacks_cold_MWh_el: number;
  /** Hours of a day in which the connection lets that power through; null without a connection. */
  readonly connected_h_d: number | null;
}

export interface LimitFacts {
  readonly charge: DirectionLimitFacts;
  readonly discharge: DirectionLimitFacts;
  readonly cold_after_h: number | null;
  readonly standing_MWh_el_d: number;
  readonly time_zone: string | null;
  readonly outages: number;
  readonly availability: number | null;
}

const J_PER_MWH = 3.6e9;
const DAY_MIN = 1440;
/** Longer than any start-up and ramp that a configuration may have. */
const LONG_S = 10 * 86400;

/** What follows from ramps, start-ups, change-over, connection and auxiliaries, by the machine's command. */
export function limitFacts(unit: UnitDefinition): LimitFacts {
  const { operation, connection, outages, availability } = unit.limits;
  const cold = operation?.start.cold_after_s ?? Number.POSITIVE_INFINITY;
  return {
    charge: directionFacts(unit, 'charge'),
    discharge: directionFacts(unit, 'discharge'),
    cold_after_h: Number.isFinite(cold) ? cold / 3600 : null,
    standing_MWh_el_d: (unit.machine.auxiliary_standing_W * 86400) / J_PER_MWH,
    time_zone: connection?.time_zone ?? null,
    outages: outages?.length ?? 0,
    availability: availability ?? null,
  };
}

function directionFacts(unit: UnitDefinition, direction: Direction): DirectionLimitFacts {
  const power_W = cyclePower_W(unit, direction);
  const other = direction === 'charge' ? 'discharge' : 'charge';
  const stood = (stood_s: number): RunningBefore => ({
    mode: 'stand',
    power_W: 0,
    stood_s,
    last: direction,
  });
  const otherWay: RunningBefore = {
    mode: other,
    power_W: signedPower(other, cyclePower_W(unit, other)),
    stood_s: 0,
    last: other,
  };
  const command = (before: RunningBefore): Command => {
    const leg = { mode: direction, power_W, from_s: 0, to_s: LONG_S };
    return commandOf(unit, [leg], [], before, LONG_S);
  };
  const minutes = ({ pieces }: Command): number =>
    (pieces.find((piece) => piece.purpose === 'run')?.from_s ?? Number.NaN) / 60;
  const lacks = ({ pieces }: Command): number => {
    const asked = signedPower(direction, power_W) * 3600;
    return Math.abs(asked - energyBetween(pieces, 0, 3600)) / J_PER_MWH;
  };
  const warm = command(stood(0));
  const cold = command(stood(Number.POSITIVE_INFINITY));
  const { power_min_W, power_max_W } = unit.limits[direction];
  const rate = unit.limits.operation?.ramp_W_s[direction] ?? null;
  return {
    power_min_MW_el: power_min_W / 1e6,
    power_max_MW_el: power_max_W / 1e6,
    from_warm_min: minutes(warm),
    from_cold_min: minutes(cold),
    from_other_direction_min: minutes(command(otherWay)),
    ramp_down_min: rate === null ? 0 : power_W / rate / 60,
    first_hour_lacks_warm_MWh_el: lacks(warm),
    first_hour_lacks_cold_MWh_el: lacks(cold),
    connected_h_d: connectedHours(unit, direction, power_W),
  };
}

/** Of a day of 24 hours, those in which neither connection nor a window is below a power. */
function connectedHours(
  unit: UnitDefinition,
  direction: Direction,
  power_W: number,
): number | null {
  const { connection } = unit.limits;
  if (connection === undefined) return null;
  const side = direction === 'charge' ? 'import_max_W' : 'export_max_W';
  if (connection[side] < power_W) return 0;
  const closed = connection.windows.reduce((sum, window) => {
    if (window[side] >= power_W) return sum;
    const over = window.to_min <= window.from_min ? DAY_MIN : 0;
    return sum + window.to_min + over - window.from_min;
  }, 0);
  return (DAY_MIN - closed) / 60;
}
