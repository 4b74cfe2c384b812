import type { Direction, Mode, OperationDefinition, UnitDefinition } from '../definitions.js';
import { CommandLine } from './commandLine.js';
import { descentFrom, type Part, partsOf, startFrom } from './commandParts.js';
import { rampWithin, SLIVER_S } from './commandRamp.js';
import { type Ceiling, type CommandCause, type Leg, requireLegs } from './leg.js';

/** A stretch of commanded power, linear in time. Pieces follow each other without gaps. */
export interface Piece {
  readonly from_s: number;
  readonly to_s: number;
  /** What flows through the beds; a start-up and a change-over stand. */
  readonly mode: Mode;
  /** Net power at the connection point at both ends [W], + = given. */
  readonly power0_W: number;
  readonly power1_W: number;
  /** Index of the leg it belongs to; -1 = none, as for what leads up to a leg. A ramp down belongs to the leg it ends. */
  readonly leg: number;
  readonly purpose: 'run' | 'ramp' | 'start_up' | 'change_over' | 'stand';
}

/** Part of a leg that the machine's own limits, the connection or an outage leave undone. */
export interface Unmet {
  readonly leg: number;
  readonly cause: CommandCause;
  readonly from_s: number;
  readonly to_s: number;
  /** Power asked for less that commanded [W], at least 0; its mean over that time. */
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
 * A start-up is done ahead of a leg where the unit stands long enough before it, and no earlier than
 * the change-over time after the end of the other direction; else the leg begins late, which is
 * unmet. Where it could not end before the leg does, the unit is not started. A ramp begins at the
 * edge of a leg, upwards and downwards: what a ramp up lacks within its leg, the ramp down gives
 * after it; a run that could not get to its least power is not begun. Ahead of a ceiling it ends in time: power is never above one. Power above the greatest
 * or a ceiling is cut down to it; a power below the least cannot be run at all, nor one that a
 * ceiling cuts below the least: the unit stands then. No start-up is made in an outage of its
 * direction, nor while less may be taken than it draws.
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
  const parts = partsOf(unit, legs, ceilings);
  const stand_W = -unit.machine.auxiliary_standing_W;
  const line = new CommandLine(operation, stand_W, before, end_s);
  parts.forEach((part, i) => {
    const { direction, index } = part;
    if (direction === null || part.given_W === 0) {
      line.idle(part);
      if (part.cause !== null) line.lacks(index, part.cause, part.from_s, part.to_s, part.asked_W);
      return;
    }
    // A pause between two legs is one the unit stands through.
    if (line.mode !== direction || part.from_s > line.at) {
      const ramped = line.rampDown();
      const from_s = Math.max(line.at, part.from_s);
      const cold = from_s - line.stoodFrom > operation.start.cold_after_s;
      const { time_s, energy_J } = operation.start[cold ? 'cold' : 'warm'];
      const turned = line.last !== null && line.last !== direction;
      const free_s = turned ? line.stoodFrom + operation.change_over_s : line.at;
      const draw_W = time_s > 0 ? energy_J / time_s : 0;
      const wanted_s = Math.max(line.at, free_s, part.from_s - time_s);
      const start = startFrom(ceilings, direction, wanted_s, time_s, draw_W);
      const ready_s = start.begins_s + time_s;
      const turns = turned && (ramped || free_s > line.at);
      line.late = start.cause ?? (turns ? 'change_over' : 'start_up');
      if (!reachesLeast(unit, ceilings, direction, ready_s, runsUntil(parts, i))) {
        const why = ready_s > part.from_s ? line.late : 'below_least_power';
        line.lacks(index, why, part.from_s, part.to_s, part.asked_W);
        line.idle(part);
        return;
      }
      if (turned) {
        const over_s = start.begins_s - operation.change_over_s;
        if (over_s - line.at > SLIVER_S) line.stand(over_s);
        line.put(start.begins_s, 'stand', line.stand_W, line.stand_W, -1, 'change_over');
      }
      line.stand(start.begins_s);
      line.put(ready_s, 'stand', -draw_W, -draw_W, -1, 'start_up');
      line.mode = direction;
      line.last = direction;
      line.power_W = 0;
    }
    line.leg = index;
    if (line.at > part.from_s) {
      line.lacks(index, line.late, part.from_s, Math.min(line.at, part.to_s), part.asked_W);
    }
    const missing_W = part.asked_W - part.given_W;
    if (part.cause !== null) {
      line.lacks(index, part.cause, Math.max(line.at, part.from_s), part.to_s, missing_W);
    }
    const rate = operation.ramp_W_s[direction];
    const descent = descentFrom(unit, ceilings, direction, part.to_s, rate ?? 0);
    const steps = rampWithin(line.at, line.power_W, part.given_W, part.to_s, rate, descent.level_W);
    for (const { to_s, power_W, purpose } of steps) {
      const from_s = line.at;
      const power0_W = purpose === 'run' ? power_W : line.power_W;
      const mean_W = line.run(to_s, power0_W, power_W, purpose);
      // Falling below what the leg has it does so ahead of a ceiling.
      if (power_W < Math.min(power0_W, part.given_W)) {
        line.lacks(index, descent.cause, from_s, line.at, part.given_W - mean_W);
      }
    }
  });
  line.rampDown();
  line.stand(end_s);
  return { pieces: line.pieces, unmet: line.unmet };
}

/** Whether a run that is ready at a time gets to its least power before it has to be over. */
function reachesLeast(
  unit: UnitDefinition,
  ceilings: readonly Ceiling[],
  direction: Direction,
  ready_s: number,
  to_s: number,
): boolean {
  const rate = unit.limits.operation?.ramp_W_s[direction] ?? null;
  if (!(ready_s < to_s) || rate === null) return ready_s < to_s;
  const { power_min_W } = unit.limits[direction];
  const at_s = ready_s + power_min_W / rate;
  // Within the run ceilings are above the least: only what comes after it can be in the way.
  const { level_W } = descentFrom(unit, ceilings, direction, to_s, rate);
  return at_s <= to_s && level_W - rate * at_s >= power_min_W;
}

/** Until when the unit could run on from a part without a pause [s]. */
function runsUntil(parts: readonly Part[], i: number): number {
  let last = parts[i] as Part;
  for (let k = i + 1; k < parts.length; k++) {
    const next = parts[k] as Part;
    if (next.from_s !== last.to_s || next.direction !== last.direction || next.given_W === 0) break;
    last = next;
  }
  return last.to_s;
}
