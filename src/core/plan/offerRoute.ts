import { type Command, commandOf, type Piece } from './command.js';
import type { PlanContext } from './context.js';
import { energyBetween, runsOf } from './course.js';
import type { CommandCause, Leg } from './leg.js';
import { longestOffer, type OffersAsk } from './offerAsk.js';
import type { OfferEnd } from './offers.js';

/** Part of what was asked that is left undone, though the beds could. */
export interface Limited {
  readonly cause: CommandCause;
  readonly from_s: number;
  readonly to_s: number;
  readonly missing_MW_el: number;
}

/** Part of the plan until the start that is left undone; `leg` counts the legs asked for from 0. */
export interface PlanLimited extends Limited {
  readonly leg: number;
}

/** The way to one offered discharge and through it; seconds from the state. */
export interface OfferRoute {
  readonly power_W: number;
  readonly start_s: number;
  readonly begins_s: number;
  /** End of the power as commanded, and of the ramp down. */
  readonly ends_s: number;
  readonly closes_s: number;
  /** What ends it where no rule does. */
  readonly ending: OfferEnd;
  readonly refused: string | null;
  readonly limited: readonly Limited[];
  readonly planLimited: readonly PlanLimited[];
  /** What start-up and change-over draw before the start and after it [J]. */
  readonly startUp_J: { readonly before: number; readonly after: number };
  /** Everything until the discharge closes; `head` until its run, `tail` its run. */
  readonly command: Command;
  readonly head: Command;
  readonly tail: Command;
  /** Mean power of the plan over rated power; 1 where nothing is planned. */
  readonly headLoad: number;
}

/** Commands of the discharges at all powers asked for from one start, with the plan before. */
export function offerRoutes(context: PlanContext, ask: OffersAsk, start_s: number): OfferRoute[] {
  const { unit } = context.model;
  const plan = planUntil(ask, context.now_ms, start_s);
  return ask.powers_W.map((power_W) => {
    const longest_s = longestOffer(unit, ask, power_W);
    const to_s = start_s + longest_s;
    const end_s = to_s + RAMP_MOST_S;
    const offered: Leg = { mode: 'discharge', power_W, from_s: start_s, to_s };
    const legs = [...plan, offered];
    const command = commandOf(unit, legs, context.ceilings(end_s), context.before, end_s);
    return routeOf(context, command, power_W, start_s, plan);
  });
}

/** A ramp down after the horizon is given to its end. */
const RAMP_MOST_S = 6 * 3600;

/** A leg of the plan, and which it is of those asked for. */
interface LegUntil extends Leg {
  readonly index: number;
}

/** Legs until the start: those past are gone, one that runs now or at the start is cut there. */
function planUntil(ask: OffersAsk, now_ms: number, start_s: number): LegUntil[] {
  return (ask.legs ?? []).flatMap((leg, index): LegUntil[] => {
    const from_s = Math.max(0, (leg.from_ms - now_ms) / 1000);
    const to_s = Math.min(start_s, (leg.to_ms - now_ms) / 1000);
    return to_s > from_s ? [{ mode: leg.mode, power_W: leg.power_W, from_s, to_s, index }] : [];
  });
}

function routeOf(
  context: PlanContext,
  command: Command,
  power_W: number,
  start_s: number,
  plan: readonly LegUntil[],
): OfferRoute {
  const { unit } = context.model;
  const index = plan.length;
  const groups = runsOf(command.pieces);
  const at = groups.findIndex((group) =>
    group.some((piece) => piece.leg === index && piece.mode === 'discharge'),
  );
  const undone = command.unmet.map(({ leg, cause, from_s, to_s, missing_W }) => ({
    ...{ leg, cause, from_s, to_s, missing_MW_el: missing_W / 1e6 },
  }));
  const limited = undone
    .filter((part) => part.leg === index)
    .map(({ leg: _, ...part }): Limited => part);
  const planLimited = undone.flatMap(({ leg, ...part }): PlanLimited[] => {
    const own = plan[leg];
    return own === undefined ? [] : [{ leg: own.index, ...part }];
  });
  const group = groups[at] ?? [];
  const own = group.filter((piece) => piece.leg === index);
  const begins_s = own[0]?.from_s ?? start_s;
  const powered = own.filter((piece) => !rampsDown(piece, own));
  const ends_s = powered[powered.length - 1]?.to_s ?? begins_s;
  const closes_s = own[own.length - 1]?.to_s ?? begins_s;
  const pieces = groups.slice(0, at + 1).flat();
  const blocking = limited.find((part) => part.from_s <= start_s && !isLead(part.cause));
  const first = own[0];
  const after = limited.find((part) => part.from_s >= ends_s && !isLead(part.cause))?.cause;
  const whole: Command = { pieces, unmet: command.unmet };
  const leads = command.pieces.filter(
    ({ purpose, from_s, to_s }) =>
      (purpose === 'start_up' || purpose === 'change_over') &&
      to_s <= begins_s + 1e-6 &&
      from_s >= lastRunBefore(command.pieces, begins_s),
  );
  const drawn = (from: number, to: number): number => 0 - energyBetween(leads, from, to);
  return {
    ...{ power_W, start_s, begins_s, ends_s, closes_s },
    ending: after === 'connection' || after === 'outage' ? after : 'horizon',
    refused: refusalOf(unit.limits.discharge, power_W, first === undefined, blocking?.cause),
    limited,
    planLimited,
    startUp_J: {
      before: drawn(Number.NEGATIVE_INFINITY, start_s),
      after: drawn(start_s, Number.POSITIVE_INFINITY),
    },
    command: whole,
    head: { pieces: groups.slice(0, Math.max(0, at)).flat(), unmet: [] },
    tail: { pieces: group, unmet: [] },
    headLoad: loadOf(plan, unit.rated_power_W),
  };
}

function isLead(cause: CommandCause): boolean {
  return cause === 'start_up' || cause === 'change_over';
}

function rampsDown(piece: Piece, own: readonly Piece[]): boolean {
  return (
    piece === own[own.length - 1] &&
    piece.purpose === 'ramp' &&
    Math.abs(piece.power1_W) < Math.abs(piece.power0_W) &&
    piece.power1_W === 0
  );
}

/** When the last run before a time ended; start-ups before that belong to it. */
function lastRunBefore(pieces: readonly Piece[], begins_s: number): number {
  const runs = pieces.filter((piece) => piece.mode !== 'stand' && piece.from_s < begins_s);
  return runs[runs.length - 1]?.to_s ?? Number.NEGATIVE_INFINITY;
}

function refusalOf(
  limits: { readonly power_min_W: number; readonly power_max_W: number },
  power_W: number,
  never: boolean,
  cause: CommandCause | undefined,
): string | null {
  const mw = (power: number): string => (power / 1e6).toFixed(3);
  const range = `the unit discharges at ${mw(limits.power_min_W)} to ${mw(limits.power_max_W)} MW_el`;
  if (power_W > limits.power_max_W || power_W < limits.power_min_W) {
    const which = power_W > limits.power_max_W ? 'above_greatest_power' : 'below_least_power';
    return `${which}: ${range}, not at ${mw(power_W)}`;
  }
  if (!never) return null;
  if (cause === 'connection' || cause === 'outage') {
    return `${cause}: what is left at the start is less than the least power; ${range}`;
  }
  return `${cause ?? 'start_up'}: the unit is not ready within the time asked about`;
}

/** Mean power of a plan over rated power, for the meter and machine factors of its marches. */
function loadOf(plan: readonly Leg[], rated_W: number): number {
  let energy = 0;
  let time = 0;
  for (const leg of plan) {
    if (leg.power_W === 0 || leg.mode === 'stand') continue;
    energy += leg.power_W * (leg.to_s - leg.from_s);
    time += leg.to_s - leg.from_s;
  }
  return time > 0 ? energy / time / rated_W : 1;
}
