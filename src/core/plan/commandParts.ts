import type { Direction, UnitDefinition } from '../definitions.js';
import { type Ceiling, type CommandCause, directionOf, type Leg } from './leg.js';

/** A stretch of a leg over which nothing that binds it changes. */
export interface Part {
  /** Index of the leg. */
  readonly index: number;
  readonly from_s: number;
  readonly to_s: number;
  /** null = the leg stands. */
  readonly direction: Direction | null;
  readonly asked_W: number;
  /** What machine and ceilings leave of it [W]; 0 = the unit cannot run. */
  readonly given_W: number;
  /** Why less is given than asked; null = it is not. */
  readonly cause: CommandCause | null;
}

/** The least of some ceilings at a time, and which of them it is. */
interface Least {
  readonly most_W: number;
  readonly cause: Ceiling['cause'];
}

function mostOf(ceiling: Ceiling, direction: Direction): number {
  return direction === 'charge' ? ceiling.charge_max_W : ceiling.discharge_max_W;
}

function leastAt(ceilings: readonly Ceiling[], direction: Direction, t_s: number): Least {
  let least: Least = { most_W: Number.POSITIVE_INFINITY, cause: 'connection' };
  for (const ceiling of ceilings) {
    const most_W = mostOf(ceiling, direction);
    if (ceiling.from_s > t_s || ceiling.to_s <= t_s || most_W >= least.most_W) continue;
    least = { most_W, cause: ceiling.cause };
  }
  return least;
}

function edgesOf(ceilings: readonly Ceiling[]): number[] {
  const all = ceilings.flatMap(({ from_s, to_s }) => [from_s, to_s]).filter(Number.isFinite);
  return [...new Set(all)].sort((a, b) => a - b);
}

/**
 * Legs cut where a ceiling begins or ends, each part with what is left of its power: above the
 * greatest or a ceiling it is cut down, below the least the unit cannot run.
 */
export function partsOf(
  unit: UnitDefinition,
  legs: readonly Leg[],
  ceilings: readonly Ceiling[],
): Part[] {
  const edges = edgesOf(ceilings);
  return legs.flatMap((leg, index) => {
    const direction = directionOf(leg);
    const inside = edges.filter((edge) => edge > leg.from_s && edge < leg.to_s);
    const cuts = direction === null ? [leg.from_s, leg.to_s] : [leg.from_s, ...inside, leg.to_s];
    return cuts.slice(1).map((to_s, i): Part => {
      const from_s = cuts[i] as number;
      const same = { index, from_s, to_s, direction, asked_W: leg.power_W };
      if (direction === null) return { ...same, given_W: 0, cause: null };
      return {
        ...same,
        ...leftOf(unit, direction, leg.power_W, leastAt(ceilings, direction, from_s)),
      };
    });
  });
}

function leftOf(
  unit: UnitDefinition,
  direction: Direction,
  asked_W: number,
  { most_W, cause }: Least,
): Pick<Part, 'given_W' | 'cause'> {
  const { power_min_W, power_max_W } = unit.limits[direction];
  const given_W = Math.min(asked_W, power_max_W, most_W);
  const why =
    given_W === asked_W ? null : most_W < power_max_W ? cause : ('above_greatest_power' as const);
  return given_W < power_min_W || given_W === 0
    ? { given_W: 0, cause: why ?? 'below_least_power' }
    : { given_W, cause: why };
}

/** The latest that a run may ramp down: power [W] stays at or below `level_W - rate t`. */
export interface Descent {
  readonly level_W: number;
  readonly cause: Ceiling['cause'];
}

/**
 * From a time on, the ramp down that keeps a run below every ceiling which begins then or later. A
 * ceiling below the least power has to be met standing.
 *
 * @param rate_W_s greatest change of power
 * @returns level [W] of that ramp carried back to second 0, Infinity = nothing binds
 */
export function descentFrom(
  unit: UnitDefinition,
  ceilings: readonly Ceiling[],
  direction: Direction,
  from_s: number,
  rate_W_s: number,
): Descent {
  const { power_min_W } = unit.limits[direction];
  let descent: Descent = { level_W: Number.POSITIVE_INFINITY, cause: 'connection' };
  for (const edge of edgesOf(ceilings)) {
    if (edge < from_s) continue;
    const { most_W, cause } = leastAt(ceilings, direction, edge);
    const level_W = (most_W < power_min_W ? 0 : most_W) + rate_W_s * edge;
    if (level_W < descent.level_W) descent = { level_W, cause };
  }
  return descent;
}

/**
 * When a start-up can begin: not while an outage leaves its direction nothing, nor while less may be
 * taken than it draws.
 *
 * @param from_s earliest [s]
 * @param draw_W power taken meanwhile
 * @returns begin [s], Infinity = never, and what holds it up, null = nothing does
 */
export function startFrom(
  ceilings: readonly Ceiling[],
  direction: Direction,
  from_s: number,
  time_s: number,
  draw_W: number,
): { readonly begins_s: number; readonly cause: Ceiling['cause'] | null } {
  let begins_s = from_s;
  let cause: Ceiling['cause'] | null = null;
  const closed = ceilings.filter(
    (ceiling) =>
      ceiling.charge_max_W < draw_W ||
      (ceiling.cause === 'outage' && mostOf(ceiling, direction) === 0),
  );
  // Later ones first found may push the begin into earlier ones of the list: until none is met.
  for (let met = time_s > 0; met; ) {
    const block = closed.find((c) => c.from_s < begins_s + time_s && c.to_s > begins_s);
    met = block !== undefined && Number.isFinite(begins_s);
    if (block === undefined) break;
    begins_s = block.to_s;
    cause = block.cause;
  }
  return { begins_s, cause };
}
