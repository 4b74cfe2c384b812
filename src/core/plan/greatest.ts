import type { Direction } from '../definitions.js';
import { flowWithin } from '../dispatch/stepStore.js';
import { type AheadModel, type BedsAhead, outletsOf, powerOf } from './bedsAhead.js';
import { seenAt } from './limitToLimit.js';

/** What keeps a power from being greater. */
export const POWER_LIMITS = ['power', 'connection', 'flow', 'pressure_drop'] as const;
export type PowerLimit = (typeof POWER_LIMITS)[number];

export interface GreatestPower {
  /** Net at the connection point, at least 0 in either direction [W]. */
  readonly power_W: number;
  readonly limited_by: PowerLimit;
}

/** The most that machine and connection let through at any time, windows and outages left out [W]. */
export function nominalCeiling(model: AheadModel, direction: Direction): GreatestPower {
  const { limits } = model.unit;
  const machine = limits[direction].power_max_W;
  const through =
    direction === 'charge' ? limits.connection?.import_max_W : limits.connection?.export_max_W;
  return through !== undefined && through < machine
    ? { power_W: through, limited_by: 'connection' }
    : { power_W: machine, limited_by: 'power' };
}

/**
 * Greatest net power in a direction with the gas that the stores give at one moment of a run: that of
 * the greatest flow, or of the flow at which a store drops the pressure that is allowed, P = m w(T)
 * -/+ auxiliaries, and no more than machine and connection allow.
 *
 * @param running_s how long the run has lasted: until the plena are swept the beds' own gas counts
 */
export function greatestPower(
  model: AheadModel,
  ahead: BedsAhead,
  direction: Direction,
  running_s: number,
): GreatestPower {
  const outlets = outletsOf(model, seenAt(ahead, direction, running_s));
  const work = model.machine.operate(direction, outlets, model.ambient_K).specificWork_J_kg;
  const ceiling = nominalCeiling(model, direction);
  const most = model.unit.limits[direction].flow_max_kg_s;
  const { pressure_drop_max_Pa } = model.unit.limits;
  const allowed = flowWithin(model.stores, ahead.beds, pressure_drop_max_Pa, most);
  const power_W = Math.max(0, powerOf(model, direction, Math.min(most, allowed), work));
  if (power_W >= ceiling.power_W) return ceiling;
  return { power_W, limited_by: allowed < most ? 'pressure_drop' : 'flow' };
}
