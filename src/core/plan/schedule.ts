import type { Mode } from '../definitions.js';
import type { EndCause, FirstMinutes } from '../estimate.js';
import { type BlockFigures, blockFigures, runEnergies } from './blockFigures.js';
import { chargesAhead } from './chargeAhead.js';
import { edgesOf, MOST_POINTS, marksOf, thinned, withStops } from './chargePoints.js';
import type { PlanContext } from './context.js';
import type { Course } from './course.js';
import { type Evaluation, exceeded, holding, isAsked } from './evaluation.js';
import type { CommandCause, Leg } from './leg.js';
import { writtenIn } from './localTime.js';
import { type NearestLegs, type NearestReason, nearestLegs } from './nearest.js';
import { type NetEnergy, netEnergy } from './netEnergy.js';
import { createPlanner } from './planner.js';
import { firstMinutesOf } from './runFirstMinutes.js';
import { requireSchedule, type ScheduleAsk } from './scheduleAsk.js';
import { firstShortfall, storesShortfall } from './shortfall.js';
import { watchedMarches } from './watchedMarches.js';

/** A block as in a question. */
export interface BlockView {
  readonly mode: Mode;
  readonly power_MW_el: number;
  /** ISO 8601 with offset, in the zone asked for. */
  readonly from: string;
  readonly to: string;
}

export interface ShortfallView {
  readonly time: string;
  readonly MWh_el: number;
  readonly cause: EndCause | CommandCause;
}

export interface FirstShortfall {
  readonly p50: ShortfallView | null;
  /** At the certainty asked for. */
  readonly certain: ShortfallView | null;
}

/** One run in one direction, over all blocks that follow each other. */
export interface RunView {
  readonly mode: Mode;
  readonly from: string;
  /** End of its last power; a ramp down follows. */
  readonly to: string;
  readonly probability: number;
  /** Past its end; below 0 it falls short. null = more than `reserve_looked_hours`. */
  readonly reserve_hours: Readonly<Record<'p90' | 'p50' | 'p10', number | null>>;
  /** What would end it, or does; null = nothing within the time looked ahead. */
  readonly ends_by: EndCause | null;
  /** When it stops on the most likely course; null = it does not. */
  readonly stops: string | null;
  /** Absent = nothing that counts is missing at first, with 90 % probability. */
  readonly first_minutes?: FirstMinutes;
}

export interface ChargeView {
  readonly time: string;
  readonly state_of_charge: number;
  readonly state_of_charge_sigma: number;
  readonly stores: Readonly<Record<string, { readonly soc: number; readonly soc_sigma: number }>>;
}

export interface UnmetView {
  /** Index of the block. */
  readonly block: number;
  readonly cause: CommandCause;
  readonly from: string;
  readonly to: string;
  readonly missing_MW_el: number;
  readonly MWh_el: number;
}

export interface NearestView {
  readonly blocks: BlockView[];
  readonly factor_discharge: number;
  readonly factor_charge: number;
  readonly drawn_in: {
    readonly mode: Mode;
    readonly asked: string;
    readonly to: string;
  }[];
  /** Whether parts were taken out that machine, connection or outages do not allow. */
  readonly taken_out: boolean;
  readonly probability: number;
}

/** What becomes of a schedule. */
export interface Schedule extends NetEnergy {
  readonly certainty: number;
  /** That everything asked for is done: 0 where machine, connection or outages leave some unmet. */
  readonly probability: number;
  /** That the stores carry all runs to their end, as far as the machine can be commanded. */
  readonly stores_probability: number;
  readonly ramp_MWh_el: number;
  readonly unmet: UnmetView[];
  readonly first_shortfall: FirstShortfall;
  /** Of the stores alone, in what the machine can be commanded. */
  readonly first_stores_shortfall: FirstShortfall;
  readonly blocks: (BlockView & BlockFigures)[];
  readonly runs: RunView[];
  readonly reserve_looked_hours: number;
  /** At block edges and where runs stop on the most likely course, the present first; see chargesAhead. */
  readonly charge: ChargeView[];
  /** Edges that `charge` leaves out, where there are more than it holds. */
  readonly charge_left_out: number;
  /** null where none was found. */
  readonly nearest: NearestView | null;
  /** Why there is none; null where there is one. */
  readonly nearest_reason: NearestReason | null;
}

const J_PER_MWH = 3.6e9;

/**
 * Whether a schedule holds, with all its figures: each run has to hold its power to its end, jointly
 * over the runs; what ramps take is told apart and is no shortfall.
 *
 * @throws RangeError for a wrong question, naming field, value and what would be right
 */
export function scheduleOf(context: PlanContext, ask: ScheduleAsk): Schedule {
  const { now_ms, model } = context;
  const { unit } = model;
  const { certainty, zone } = ask;
  requireSchedule(ask, now_ms);
  const legs = ask.blocks.map(({ mode, power_W, from_ms, to_ms }): Leg => {
    return { mode, power_W, from_s: (from_ms - now_ms) / 1000, to_s: (to_ms - now_ms) / 1000 };
  });
  const end_s = (legs[legs.length - 1] as Leg).to_s;
  const planner = createPlanner(context, legs, end_s);
  const { outlook, beyond_s } = planner;
  const command = planner.command(legs);
  const edges_s = edgesOf(legs);
  const marks_s = marksOf(edges_s, command.pieces);
  const watched = watchedMarches(outlook, command, beyond_s, edges_s, marks_s);
  const evaluation = planner.evaluate(command, watched);
  const { course } = evaluation;
  const written = (t_s: number): string => writtenIn(zone, now_ms + Math.round(t_s * 1000));
  const view = (leg: Leg): BlockView => ({
    mode: leg.mode,
    power_MW_el: leg.power_W / 1e6,
    from: written(leg.from_s),
    to: written(leg.to_s),
  });
  const figures = blockFigures(unit, legs, evaluation, certainty);
  const energies = runEnergies(unit, evaluation);
  const short = (of: typeof firstShortfall): FirstShortfall => {
    const at = (level: number): ShortfallView | null => {
      const first = of(evaluation, energies, level);
      if (first === null) return null;
      return { time: written(first.t_s), MWh_el: first.energy_J / J_PER_MWH, cause: first.cause };
    };
    return { p50: at(0.5), certain: at(certainty) };
  };
  const stores_probability = holding(course.episodes, evaluation.first_s);
  const points = withStops(outlook, command, course, watched.edges, edges_s);
  const charges = chargesAhead(outlook, command, course, watched, points, marks_s);
  const nearest = nearestLegs(planner, legs, evaluation, certainty);
  return {
    certainty,
    probability: command.unmet.length > 0 ? 0 : stores_probability,
    stores_probability,
    ramp_MWh_el: figures.reduce((sum, one) => sum + one.ramp_MWh_el, 0),
    ...netEnergy(legs, evaluation, energies),
    unmet: command.unmet.map(({ leg, cause, from_s, to_s, missing_W }) => ({
      block: leg,
      cause,
      from: written(from_s),
      to: written(to_s),
      missing_MW_el: missing_W / 1e6,
      MWh_el: (missing_W * (to_s - from_s)) / J_PER_MWH,
    })),
    first_shortfall: short(firstShortfall),
    first_stores_shortfall: short(storesShortfall),
    blocks: legs.map((leg, i) => ({ ...view(leg), ...(figures[i] as BlockFigures) })),
    runs: course.episodes.flatMap((episode, e) =>
      isAsked(command, episode) ? [runView(evaluation, e, written)] : [],
    ),
    reserve_looked_hours: beyond_s / 3600,
    charge: thinned(charges).map(({ t_s, unit: soc, unit_sigma, stores }) => ({
      time: written(t_s),
      state_of_charge: soc,
      state_of_charge_sigma: unit_sigma,
      stores: Object.fromEntries(
        stores.map((store, s) => [
          unit.stores[s]?.id as string,
          { soc: store.soc, soc_sigma: store.sigma },
        ]),
      ),
    })),
    charge_left_out: Math.max(0, charges.length - MOST_POINTS),
    nearest: typeof nearest === 'string' ? null : nearestView(nearest, view, written),
    nearest_reason: typeof nearest === 'string' ? nearest : null,
  };
}

function runView(evaluation: Evaluation, e: number, written: (t_s: number) => string): RunView {
  const episode = evaluation.course.episodes[e] as Course['episodes'][number];
  const breaks_s = evaluation.breaks_s[e] as Float64Array;
  const reserve = (certainty: number): number | null => {
    const hours = (exceeded(breaks_s, certainty) - episode.held_s) / 3600;
    return hours < evaluation.beyond_s / 3600 ? hours : null;
  };
  return {
    mode: episode.direction,
    from: written(episode.from_s),
    to: written(episode.held_s),
    probability: holding([episode], [evaluation.first_s[e] as Float64Array]),
    reserve_hours: { p90: reserve(0.9), p50: reserve(0.5), p10: reserve(0.1) },
    ends_by: Number.isFinite(episode.first_s) ? episode.ends_by : null,
    stops: episode.stopped_s === null ? null : written(episode.stopped_s),
    ...firstMinutesOf(evaluation, e),
  };
}

function nearestView(
  nearest: NearestLegs,
  view: (leg: Leg) => BlockView,
  written: (t_s: number) => string,
): NearestView {
  return {
    blocks: nearest.legs.map(view),
    factor_discharge: nearest.factor.discharge,
    factor_charge: nearest.factor.charge,
    drawn_in: nearest.drawn_in.map(({ direction, asked_s, end_s }) => ({
      mode: direction,
      asked: written(asked_s),
      to: written(end_s),
    })),
    taken_out: nearest.taken_out,
    probability: nearest.probability,
  };
}
