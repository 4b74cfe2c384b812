import type { Direction, Mode, OperationDefinition, UnitDefinition } from '../definitions.js';
import {
  type Ceiling,
  type CommandCause,
  directionOf,
  type Leg,
  requireLegs,
  signedPower,
} from './leg.js';

/** A stretch of commanded power, linear in time. Pieces follow each other without gaps. */
export interface Piece {
  readonly from_s: number;
  readonly to_s: number;
  /** What flows through the beds; a start-up and a change-over stand. */
  readonly mode: Mode;
  /** Net power at the connection point at both ends [W], + = given. */
  readonly power0_W: number;
  readonly power1_W: number;
  /** Index of the leg that it serves; -1 = none. A ramp down belongs to the leg it ends. */
  readonly leg: number;
  readonly purpose: 'run' | 'ramp' | 'start_up' | 'change_over' | 'stand';
}

/** Part of a leg that the machine's own limits, the connection or an outage leave undone. */
export interface Unmet {
  readonly leg: number;
  readonly cause: CommandCause;
  readonly from_s: number;
  readonly to_s: number;
  /** Power asked for less that commanded [W], at least 0. */
  readonly missing_W: number;
}

/** How the unit runs when a plan begins. */
export interface RunningBefore {
  readonly mode: Mode;
  /** Signed net power [W]. */
  readonly power_W: number;
  /** Time since it last ran [s]: 0 while it runs; Infinity = unknown or never. */
  readonly stood_s: number;
  /** Direction it ran in last; null = unknown. */
  readonly last: Direction | null;
}

export interface Command {
  readonly pieces: readonly Piece[];
  readonly unmet: readonly Unmet[];
}

/** What a machine does without `operation` in its configuration: everything at once. */
export const AT_ONCE: OperationDefinition = {
  ramp_W_s: { charge: null, discharge: null },
  start: {
    warm: { time_s: 0, energy_J: 0 },
    cold: { time_s: 0, energy_J: 0 },
    cold_after_s: Number.POSITIVE_INFINITY,
  },
  change_over_s: 0,
};

/**
 * What the machine is told to do so that a plan is met as well as its limits allow, before any bed
 * is asked.
 *
 * A start-up (or change-over) is done ahead of a leg where the unit stands long enough before it;
 * else the leg begins late, which is unmet. A ramp begins at the edge of a leg, upwards and
 * downwards: what a ramp up lacks within its leg, the ramp down gives after it. Power above the
 * greatest or a ceiling is cut down to it; a power below the least cannot be run at all, nor one
 * that a ceiling cuts below the least: the unit stands then.
 *
 * @param legs see `requireLegs`; between them the unit stands
 * @param ceilings in any order; where several hold, the least counts
 * @param end_s where the command ends at the latest [s]; open legs are cut there
 * @throws RangeError for legs that no plan can have
 */
export function commandOf(
  unit: UnitDefinition,
  legs: readonly Leg[],
  ceilings: readonly Ceiling[],
  before: RunningBefore,
  end_s: number,
): Command {
  requireLegs(legs);
  const operation = unit.limits.operation ?? AT_ONCE;
  const stand_W = -unit.machine.auxiliary_standing_W;
  const pieces: Piece[] = [];
  const unmet: Unmet[] = [];
  let at = 0;
  let mode: Mode = before.mode;
  let power = before.mode === 'stand' ? 0 : before.power_W;
  let leg = -1;
  let last: Direction | null = before.mode === 'stand' ? before.last : before.mode;
  /** When the unit came to stand, seen from the plan's start. */
  let stoodFrom = -before.stood_s;

  const put = (
    to_s: number,
    own: Mode,
    power0_W: number,
    power1_W: number,
    of: number,
    purpose: Piece['purpose'],
  ): void => {
    const cut = Math.min(to_s, end_s);
    if (!(cut > at)) return;
    const share = (cut - at) / (to_s - at);
    const last_W = to_s === cut ? power1_W : power0_W + (power1_W - power0_W) * share;
    pieces.push({ from_s: at, to_s: cut, mode: own, power0_W, power1_W: last_W, leg: of, purpose });
    at = cut;
  };
  const rampDown = (): void => {
    if (mode === 'stand') return;
    const rate = operation.ramp_W_s[mode];
    if (rate !== null) put(at + Math.abs(power) / rate, mode, power, 0, leg, 'ramp');
    last = mode;
    mode = 'stand';
    power = 0;
    stoodFrom = at;
  };
  const standUntil = (to_s: number, of = -1): void => {
    rampDown();
    put(to_s, 'stand', stand_W, stand_W, of, 'stand');
  };

  for (const part of cutAtCeilings(legs, ceilings)) {
    const direction = directionOf(part.leg);
    if (direction === null) {
      standUntil(part.from_s);
      standUntil(part.to_s, part.index);
      continue;
    }
    const asked = part.leg.power_W;
    const limits = unit.limits[direction];
    let given = asked;
    let cause: CommandCause | null = null;
    if (given > limits.power_max_W) {
      given = limits.power_max_W;
      cause = 'above_greatest_power';
    }
    const ceiling = direction === 'charge' ? part.charge_max_W : part.discharge_max_W;
    if (given > ceiling) {
      given = ceiling;
      cause = part.cause ?? 'connection';
    }
    if (given < limits.power_min_W || given === 0) {
      unmet.push({
        leg: part.index,
        cause: cause ?? 'below_least_power',
        from_s: part.from_s,
        to_s: part.to_s,
        missing_W: asked,
      });
      standUntil(part.from_s);
      standUntil(part.to_s, part.index);
      continue;
    }
    // A pause between two legs is one the unit stands through.
    if (mode !== direction || part.from_s > at) {
      if (part.from_s > at || mode !== direction) rampDown();
      const cold = part.from_s - stoodFrom > operation.start.cold_after_s;
      const start = operation.start[cold ? 'cold' : 'warm'];
      const over_s = last !== null && last !== direction ? operation.change_over_s : 0;
      const lead_s = over_s + start.time_s;
      const begins = Math.max(at, part.from_s - lead_s);
      put(begins, 'stand', stand_W, stand_W, -1, 'stand');
      put(begins + over_s, 'stand', stand_W, stand_W, -1, 'change_over');
      const draw_W = start.time_s > 0 ? -start.energy_J / start.time_s : 0;
      put(begins + lead_s, 'stand', draw_W, draw_W, -1, 'start_up');
      if (at > part.from_s) {
        unmet.push({
          leg: part.index,
          cause: over_s > 0 ? 'change_over' : 'start_up',
          from_s: part.from_s,
          to_s: Math.min(at, part.to_s),
          missing_W: asked,
        });
      }
      mode = direction;
      power = 0;
    }
    leg = part.index;
    last = direction;
    if (cause !== null && part.to_s > at) {
      const missing_W = asked - given;
      unmet.push({ leg, cause, from_s: Math.max(at, part.from_s), to_s: part.to_s, missing_W });
    }
    const target = signedPower(direction, given);
    const rate = operation.ramp_W_s[direction];
    if (rate !== null && power !== target) {
      const until = at + Math.abs(target - power) / rate;
      const to_s = Math.min(until, Math.max(at, part.to_s));
      const reached = power + ((target - power) * (to_s - at)) / (until - at);
      put(to_s, direction, power, reached, leg, 'ramp');
      power = reached;
    } else power = target;
    put(part.to_s, direction, power, power, leg, 'run');
    if (at >= end_s) break;
  }
  standUntil(end_s);
  return { pieces, unmet };
}

interface Part {
  readonly leg: Leg;
  readonly index: number;
  readonly from_s: number;
  readonly to_s: number;
  readonly charge_max_W: number;
  readonly discharge_max_W: number;
  readonly cause: Ceiling['cause'] | null;
}

/** Legs cut where a ceiling begins or ends, each part with the least that holds there. */
function cutAtCeilings(legs: readonly Leg[], ceilings: readonly Ceiling[]): Part[] {
  const edges = [...new Set(ceilings.flatMap((c) => [c.from_s, c.to_s]))].sort((a, b) => a - b);
  return legs.flatMap((leg, index) => {
    const inside = edges.filter((edge) => edge > leg.from_s && edge < leg.to_s);
    const cuts = [leg.from_s, ...inside, leg.to_s];
    return cuts.slice(1).map((to_s, i): Part => {
      const from_s = cuts[i] as number;
      let charge_max_W = Number.POSITIVE_INFINITY;
      let discharge_max_W = Number.POSITIVE_INFINITY;
      let cause: Ceiling['cause'] | null = null;
      for (const ceiling of ceilings) {
        if (ceiling.from_s > from_s || ceiling.to_s <= from_s) continue;
        const own = leg.mode === 'charge' ? ceiling.charge_max_W : ceiling.discharge_max_W;
        const most = leg.mode === 'charge' ? charge_max_W : discharge_max_W;
        if (own < most) cause = ceiling.cause;
        charge_max_W = Math.min(charge_max_W, ceiling.charge_max_W);
        discharge_max_W = Math.min(discharge_max_W, ceiling.discharge_max_W);
      }
      return { leg, index, from_s, to_s, charge_max_W, discharge_max_W, cause };
    });
  });
}
