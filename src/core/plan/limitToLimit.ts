import type { Direction } from '../definitions.js';
import { SWEEP_MOST_S } from '../dispatch/rollout.js';
import { endOfBed } from '../dispatch/stepStore.js';
import type { EndCause } from '../estimate.js';
import type { StoreTemperatures } from '../machine/machine.js';
import {
  type AheadModel,
  type BedsAhead,
  copyAhead,
  OUTLET,
  outletsOf,
  stepAhead,
} from './bedsAhead.js';
import type { Piece } from './command.js';
import { energyBetween } from './course.js';
import { type Delivered, type Episode, type MarchOptions, marchEpisode } from './episode.js';

/** One run in one direction, from beds as they are to the rule that ends it, or to what was enough. */
export interface LimitRun {
  readonly direction: Direction;
  readonly hours: number;
  /** Given or taken at the connection point, at least 0 in either direction [J]. */
  readonly energy_J: number;
  /** The rule that ended it; null: it had enough, or nothing did within the time looked ahead. */
  readonly ends_by: EndCause | null;
  /** When the first rule broke, the greatest flow included [h]; Infinity = none did. */
  readonly first_h: number;
  /** Net power meanwhile, from time 0 [W], + = given. */
  readonly delivered: readonly Delivered[];
  /** Beds exactly at its end. */
  readonly end: BedsAhead;
}

/** What is enough; whichever comes first. */
export interface Enough {
  readonly time_s: number;
  /** At the connection point, start-up left out [J]. */
  readonly energy_J?: number;
}

/** Longest step of beds that stand [s]. */
const STAND_STEP_S = 900;
/** A rule breaks between two steps, seen a step later at most, or at the very start of a run. */
const LAST_MOMENTS = 12;
/** Rules that stop a run by themselves; the greatest flow derates it first. */
const STOPPING: readonly { readonly rule: number; readonly cause: EndCause }[] = [
  { rule: 0, cause: 'hot_outlet' },
  { rule: 1, cause: 'cold_outlet' },
  { rule: 3, cause: 'pressure_drop' },
  { rule: 4, cause: 'empty' },
];

/**
 * Gas temperatures at the outlets that count at a time of a run [K]: until the plena are swept, 10
 * minutes at most, those of the beds.
 */
export function seenAt(beds: BedsAhead, direction: Direction, t_s: number): number[] {
  const end = OUTLET[direction];
  return t_s > SWEEP_MOST_S ? beds.ends_K.map((ends) => ends[end]) : beds.left_K;
}

/** What is seen of a run on its way. */
export interface Moment {
  /** From the start of the run [s]. */
  readonly t_s: number;
  /** Metered, mean of the step that ends here, at least 0; 0 at the start [kg/s]. */
  readonly flow_kg_s: number;
  /** Copies: nobody else's. */
  readonly beds: BedsAhead;
}

/**
 * Runs at a power from beds as they are, which stay as they are. The beds end exactly where the run
 * does, so that what was taken out of them is what was delivered: a step too far would be a per cent
 * of a run.
 *
 * @param power_W net at the connection point, above 0
 */
export function runToLimit(
  model: AheadModel,
  from: BedsAhead,
  direction: Direction,
  power_W: number,
  enough: Enough,
  options: MarchOptions,
): LimitRun {
  const keep = enough.energy_J === undefined ? LAST_MOMENTS : Number.POSITIVE_INFINITY;
  return march(model, from, direction, power_W, enough, options, keep).run;
}

/** The same with all its moments, from start to end. */
export function watchToLimit(
  ...[model, from, direction, power_W, enough, options]: Parameters<typeof runToLimit>
): LimitRun & { readonly moments: readonly Moment[] } {
  const all = Number.POSITIVE_INFINITY;
  const { run, moments } = march(model, from, direction, power_W, enough, options, all);
  return { ...run, moments };
}

/** @param keep so many of the last moments are kept on the way */
function march(
  model: AheadModel,
  from: BedsAhead,
  direction: Direction,
  power_W: number,
  enough: Enough,
  { step_s, works }: MarchOptions,
  keep: number,
): { run: LimitRun; moments: Moment[] } {
  if (!(power_W > 0)) throw new RangeError(`power_W = ${power_W}: expected above 0`);
  const start = copyAhead(from);
  model.stores.forEach((store, i) => {
    start.left_K[i] = endOfBed(store, start.beds[i] as Float64Array[], OUTLET[direction]);
  });
  const seen: Moment[] = [{ t_s: 0, flow_kg_s: 0, beds: start }];
  const options = { step_s, works, beyond_s: 0 };
  const { episode, delivered } = marchEpisode(
    model,
    copyAhead(from),
    [pieceOf(direction, power_W, enough.time_s)],
    {
      ...options,
      each: (t_s, beds, flow_kg_s) => {
        seen.push({ t_s, flow_kg_s, beds: copyAhead(beds) });
        // The first stays: a run that its rule does not let begin ends there.
        if (seen.length > keep) seen.splice(1, 1);
      },
    },
  );
  const stop = episode.stopped_s ?? enough.time_s;
  const until = Math.min(stop, timeOf(delivered, enough.energy_J ?? Number.POSITIVE_INFINITY));
  // The march saw its end up to a step too late: the last bit is made anew, with the flow it had.
  const moments = seen.filter(({ t_s }) => t_s <= until);
  const last = moments[moments.length - 1] as Moment;
  const next = seen[moments.length];
  if (next !== undefined && last.t_s < until) {
    const beds = copyAhead(last.beds);
    const { flow_kg_s } = next;
    const inlets = inletsAt(model, beds, direction, last.t_s);
    stepAhead(model, beds, direction, flow_kg_s, inlets, until - last.t_s, works);
    moments.push({ t_s: until, flow_kg_s, beds });
  }
  const run = {
    direction,
    hours: until / 3600,
    energy_J: Math.abs(energyBetween(delivered, 0, until)),
    ends_by: until < stop || episode.stopped_s === null ? null : stopCause(episode),
    first_h: episode.first_s / 3600,
    delivered,
    end: (moments[moments.length - 1] as Moment).beds,
  };
  return { run, moments };
}

/**
 * When the first rule of a run breaks, the greatest flow included [s]; `most_s` where none does. The
 * beds stay as they are.
 */
export function firstBreak_s(
  model: AheadModel,
  from: BedsAhead,
  direction: Direction,
  power_W: number,
  most_s: number,
  { step_s, works }: MarchOptions,
): number {
  const pieces = [pieceOf(direction, power_W, most_s)];
  const { episode } = marchEpisode(model, copyAhead(from), pieces, { step_s, works, beyond_s: 0 });
  return Math.min(most_s, episode.first_s);
}

/** Beds that stand for a while [s]; those given stay as they are. */
export function standFor(
  model: AheadModel,
  from: BedsAhead,
  time_s: number,
  options: MarchOptions,
): BedsAhead {
  const beds = copyAhead(from);
  const steps = Math.ceil(time_s / STAND_STEP_S);
  const none = { hot_K: Number.NaN, cold_K: Number.NaN };
  for (let n = 0; n < steps; n++) {
    stepAhead(model, beds, 'discharge', 0, none, time_s / steps, options.works);
  }
  return beds;
}

/** The same unit without some of its stop rules. */
export function withoutRules(
  model: AheadModel,
  rules: Partial<AheadModel['unit']['limits']>,
): AheadModel {
  const { unit } = model;
  return { ...model, unit: { ...unit, limits: { ...unit.limits, ...rules } } };
}

function pieceOf(direction: Direction, power_W: number, to_s: number): Piece {
  const power = direction === 'charge' ? -power_W : power_W;
  return {
    from_s: 0,
    to_s,
    mode: direction,
    power0_W: power,
    power1_W: power,
    leg: 0,
    purpose: 'run',
  };
}

/** Gas that the machine gives the stores at a moment of a run. */
function inletsAt(
  model: AheadModel,
  beds: BedsAhead,
  direction: Direction,
  t_s: number,
): StoreTemperatures {
  const outlets = outletsOf(model, seenAt(beds, direction, t_s));
  return model.machine.operate(direction, outlets, model.ambient_K).inlets;
}

function stopCause(episode: Episode): EndCause {
  let first = Number.POSITIVE_INFINITY;
  let found: EndCause = 'flow';
  for (const { rule, cause } of STOPPING) {
    const time = episode.times_s[rule] as number;
    if (time <= (episode.stopped_s as number) + 1e-6 && time < first) {
      first = time;
      found = cause;
    }
  }
  return found;
}

/** When so much has been delivered [s]; Infinity where it never is. */
function timeOf(delivered: readonly Delivered[], energy_J: number): number {
  let sum = 0;
  for (const { from_s, to_s, power0_W, power1_W } of delivered) {
    const part = (Math.abs(power0_W + power1_W) / 2) * (to_s - from_s);
    // Within a step the power of a run is all but constant.
    if (sum + part >= energy_J) return from_s + ((energy_J - sum) / part) * (to_s - from_s);
    sum += part;
  }
  return Number.POSITIVE_INFINITY;
}
