import { RULES } from '../dispatch/rollout.js';
import type { EndCause, FirstMinutes, Quantiles } from '../estimate.js';
import { type Command, commandOf } from './command.js';
import type { PlanContext } from './context.js';
import { energyBetween } from './course.js';
import type { Episode } from './episode.js';
import { evaluate, exceeded } from './evaluation.js';
import type { CommandCause } from './leg.js';
import { limitedBy } from './limitedBy.js';
import { BEYOND_S, createOutlook, type Outlook } from './outlook.js';
import { runEnergy } from './runEnergy.js';
import { firstMinutesOf } from './runFirstMinutes.js';
import type { Marches } from './spread.js';

export interface HeadroomAsk {
  /** Charging powers at the connection point [W]. */
  readonly powers_W: readonly number[];
}

/** What the unit can still take at one charging power. */
export interface Headroom {
  readonly power_MW_el: number;
  /** From the first power on; p90 is exceeded with 90 % probability. */
  readonly hours: Quantiles;
  /** Taken from the grid at the connection point meanwhile, start-up included. */
  readonly energy_MWh_el: Quantiles;
  /**
   * What ends it: a rule of the outlets or the pressure drop; `flow` only where its greatest flow takes
   * less than the least power. null where nothing does within the time looked ahead, or the unit
   * cannot run.
   */
  readonly ends_by: EndCause | null;
  /** When it needs more than its greatest flow and takes less from then on, p50; null = never. */
  readonly derated_after_hours: number | null;
  /** Least power that it then takes before it ends; null = it takes the power asked all along. */
  readonly derated_to_MW_el: number | null;
  /** Why the unit would not be run at this power; null = it would. */
  readonly refused: string | null;
  /** What keeps it from that power at some time within the p10 of the hours; null = nothing does. */
  readonly limited_by: CommandCause | null;
  /** Absent = nothing that counts is missing at first, with 90 % probability. */
  readonly first_minutes?: FirstMinutes;
}

/** Longest charge that is looked at, over the rated hours at rated power. */
const MOST_RATED = 4;
const FLOW = RULES.indexOf('flow');
const J_PER_MWH = 3.6e9;
const NOTHING: Quantiles = { p90: 0, p50: 0, p10: 0 };

/**
 * Hours and energy that the unit can still take at given powers until a store breaks through. Where
 * that power needs more than the greatest flow, the unit goes on with that flow and takes less, and
 * the energy is what it takes. These are the stores': where the connection or an outage is in the
 * way, the answer says so.
 *
 * @throws RangeError for a power that is not above 0
 */
export function headroomOf(context: PlanContext, ask: HeadroomAsk): Headroom[] {
  const { model, before } = context;
  const { unit } = model;
  return ask.powers_W.map((power_W) => {
    if (!(power_W > 0 && Number.isFinite(power_W))) {
      throw new RangeError(`power_W = ${power_W}: expected a finite number above 0`);
    }
    const power_MW_el = power_W / 1e6;
    const nothing = {
      ...{ power_MW_el, hours: NOTHING, energy_MWh_el: NOTHING, ends_by: null },
      ...{ derated_after_hours: null, derated_to_MW_el: null },
    };
    const most_s = MOST_RATED * unit.rated_hours * 3600 * Math.max(1, unit.rated_power_W / power_W);
    const leg = { mode: 'charge', power_W, from_s: 0, to_s: Number.POSITIVE_INFINITY } as const;
    const command = commandOf(unit, [leg], [], before, most_s);
    const refusal = command.unmet.find(
      (part) => part.cause !== 'start_up' && part.cause !== 'change_over',
    );
    if (refusal !== undefined) {
      const { power_min_W, power_max_W } = unit.limits.charge;
      const least = (power_min_W / 1e6).toFixed(3);
      const refused = `${refusal.cause}: the unit charges at ${least} to ${(power_max_W / 1e6).toFixed(3)} MW_el`;
      return { ...nothing, refused, limited_by: refusal.cause };
    }
    const outlook = outlookAt(context, command, power_W, most_s);
    const marches: Marches = {
      best: () => outlook.best(command),
      march: (change) => outlook.march(command, change),
      marchFine: (change) => outlook.marchFine(command, change),
    };
    const evaluation = evaluate(outlook, command, marches, BEYOND_S);
    // A unit that still discharges ramps down first: that run is another one.
    const { episodes } = evaluation.course;
    const run = episodes.findIndex(({ direction }) => direction === 'charge');
    const episode = episodes[run];
    if (episode === undefined) return { ...nothing, refused: null, limited_by: null };
    const { from_s } = episode;
    const { ends_by, fades_s } = endOf(episode);
    const derate_s = evaluation.derate_s[run] as Float64Array;
    // As long at its greatest flow as the best march has it, where no outlet's rule comes first.
    const ends_s = (evaluation.stop_s[run] as Float64Array).map((stop_s, k) =>
      Math.min(most_s, stop_s, (derate_s[k] as number) + fades_s),
    );
    const given = command.pieces.filter(({ mode, to_s }) => mode === 'discharge' && to_s <= from_s);
    const taken_s = given[given.length - 1]?.to_s ?? 0;
    // Before the beds are asked: the start-up.
    const before_J = -energyBetween(command.pieces, taken_s, from_s);
    const { delivered } = runEnergy(evaluation, run, 0);
    const hours = quantilesOf(ends_s.map((end_s) => (end_s - from_s) / 3600));
    const energy_MWh_el = quantilesOf(
      ends_s.map((end_s, k) => (before_J + delivered(k, from_s, end_s)) / J_PER_MWH),
    );
    return {
      power_MW_el,
      hours,
      energy_MWh_el,
      ends_by,
      ...deratingOf(episode, power_MW_el, derate_s, ends_s),
      refused: null,
      limited_by: limitedBy(unit, 'charge', power_W, context.now_ms, hours.p10 * 3600),
      ...firstMinutesOf(evaluation, run),
    };
  });
}

/** Calibrated at the power that is really taken: a derated unit takes less than it is asked for. */
function outlookAt(
  { model, state }: PlanContext,
  command: Command,
  power_W: number,
  most_s: number,
): Outlook {
  const load = power_W / model.unit.rated_power_W;
  const outlook = createOutlook(model, state, load);
  const { episodes, delivered } = outlook.best(command);
  const episode = episodes.find(({ direction }) => direction === 'charge');
  if (episode === undefined || episode.derated_s === null) return outlook;
  const { from_s, stopped_s } = episode;
  const to_s = stopped_s ?? most_s;
  const asked_J = energyBetween(command.pieces, from_s, to_s);
  if (!(asked_J < 0)) return outlook;
  return createOutlook(model, state, (load * energyBetween(delivered, from_s, to_s)) / asked_J);
}

/** What ends a run by its best march, and how long it lasts at its greatest flow if nothing else does [s]. */
function endOf(episode: Episode): { ends_by: EndCause | null; fades_s: number } {
  const { times_s, stopped_s } = episode;
  let end_s = Number.POSITIVE_INFINITY;
  let ends_by: EndCause | null = null;
  times_s.forEach((time_s, rule) => {
    if (rule === FLOW || !(time_s < end_s)) return;
    end_s = time_s;
    ends_by = RULES[rule] as EndCause;
  });
  // Stopped though no outlet says so: the greatest flow takes less than the least power.
  if (stopped_s !== null && stopped_s < end_s) {
    return { ends_by: 'flow', fades_s: stopped_s - (times_s[FLOW] as number) };
  }
  return { ends_by, fades_s: Number.POSITIVE_INFINITY };
}

/** From when on, and down to what, the greatest flow takes less than commanded; null = it never does. */
function deratingOf(
  episode: Episode,
  power_MW_el: number,
  derate_s: Float64Array,
  ends_s: Float64Array,
): Pick<Headroom, 'derated_after_hours' | 'derated_to_MW_el'> {
  const from_s = derate_s.map((time_s, k) =>
    time_s < (ends_s[k] as number) ? time_s : Number.POSITIVE_INFINITY,
  );
  const after_s = exceeded(from_s, 0.5);
  if (!Number.isFinite(after_s)) return { derated_after_hours: null, derated_to_MW_el: null };
  const lasts_s = exceeded(ends_s, 0.5) - after_s;
  const first_s = episode.times_s[FLOW] as number;
  const shares = episode.shares.filter(({ t_s }) => t_s - first_s <= lasts_s);
  const least = Math.min(1, ...shares.map(({ share }) => share));
  return {
    derated_after_hours: (after_s - episode.from_s) / 3600,
    derated_to_MW_el: power_MW_el * least,
  };
}

function quantilesOf(values: Float64Array): Quantiles {
  const at = (certainty: number): number => exceeded(values, certainty);
  return { p90: at(0.9), p50: at(0.5), p10: at(0.1) };
}
