import type { Quantiles } from '../estimate.js';
import { energyBetween } from './course.js';
import type { Delivered } from './episode.js';

/** A discharge that is offered, and when it may end. Times are seconds from the state. */
export interface OfferedRun {
  /** Start asked for, from which blocks are counted. */
  readonly start_s: number;
  /** When the first power comes; later than `start_s` where a start-up is not done in time. */
  readonly begins_s: number;
  /** Commanded end of the power, and of the ramp down after it. */
  readonly ends_s: number;
  readonly closes_s: number;
  /** Net power at the connection point as commanded [W], + = given. */
  readonly pieces: readonly Delivered[];
  /** When it ends, at equally likely points; Infinity = not within the time looked ahead. */
  readonly stops_s: Float64Array;
  /** What is missing in its first minutes; null = nothing that may count. */
  readonly missing: MissingAtFirst | null;
  /** Whether the plan until the start held at that point. */
  readonly held: Uint8Array;
  /** Certainty worth bidding; null = no prices. */
  readonly bid: number | null;
}

/** What the greatest flow leaves missing while the lids are swept. */
export interface MissingAtFirst {
  /** In the mean, from the first power until so long after it [J]. */
  mean_J(after_s: number): number;
  /** How long after the first power something may be missing [s]. */
  readonly until_s: number;
  /** Whether it counts, at each point. */
  readonly counts: Uint8Array;
}

/** Net energy that is reached with a certainty, and what lies below it. */
export interface EnergyAt {
  readonly certainty: number;
  readonly energy_MWh_el: number;
  /** Expected value of what is missing below that energy. */
  readonly expected_shortfall_MWh_el: number;
  /** Mean of what is given where it is less; null = it never is. */
  readonly mean_below_MWh_el: number | null;
}

export interface OfferAt extends EnergyAt {
  readonly hours: number;
  /** Blocks run through from beginning to end at least: each for itself, and with all before it. */
  readonly whole_blocks: { readonly alone: number; readonly jointly: number };
}

export interface OfferBlock {
  readonly from_s: number;
  readonly to_s: number;
  /** Net energy if nothing stops it: ramps and what the connection leaves included. */
  readonly most_MWh_el: number;
  /**
   * Drawn before the first power: ramp down of a planned charge, change-over, start-up, standing. Energy
   * given less this is the integral of net power, but for `ramp_down_MWh_el`.
   */
  readonly drawn_MWh_el: number;
  /** Given before the first power by a planned discharge that comes down after its end. */
  readonly ramp_down_MWh_el: number;
  readonly mean_MWh_el: number;
  /** Probability that it is run through: whatever became of the plan, or with all that comes before. */
  readonly whole: { readonly alone: number; readonly jointly: number };
  readonly at: readonly EnergyAt[];
  readonly bid_MWh_el: number | null;
}

export interface OfferFigures {
  /** From the first power on. */
  readonly hours: Quantiles;
  readonly mean_hours: number;
  readonly energy_MWh_el: Quantiles;
  readonly mean_MWh_el: number;
  readonly at: readonly OfferAt[];
  readonly blocks: readonly OfferBlock[];
  readonly bid: { readonly certainty: number; readonly energy_MWh_el: number } | null;
}

const J_PER_MWH = 3.6e9;

/**
 * What a discharge gives at each certainty from its first power on, as a whole and block by block.
 * What comes between the start and the first power is as commanded and told apart. The end alone is uncertain:
 * until it the unit gives what it is commanded, less the mean of what is missing in its first minutes, so that every energy is that of a time, grows with it,
 * and the energies of blocks at one certainty add up to that of the whole.
 */
export function offerFigures(
  run: OfferedRun,
  block_s: number,
  certainties: readonly number[],
): OfferFigures {
  const { start_s, begins_s, ends_s, closes_s, pieces } = run;
  // By the time of the end: everything that is given grows with it, so nothing need be sorted again.
  const order = Array.from(run.stops_s.keys()).sort(
    (a, b) => (run.stops_s[a] as number) - (run.stops_s[b] as number),
  );
  const held = order.map((k) => run.held[k] as number);
  const stops = Float64Array.from(order, (k) => {
    const stop = run.stops_s[k] as number;
    return stop >= ends_s ? closes_s : Math.max(begins_s, stop);
  });
  const { missing } = run;
  const counts = order.map((k) => missing?.counts[k] ?? 0);
  const until_s = begins_s + (missing?.until_s ?? 0);
  const energyAt = (to_s: number): number => {
    const lacks_J = missing === null || to_s <= begins_s ? 0 : missing.mean_J(to_s - begins_s);
    return Math.max(0, energyBetween(pieces, begins_s, to_s) - lacks_J) / J_PER_MWH;
  };
  const ahead = pieces.filter((piece) => piece.to_s <= begins_s + 1e-6);
  const takes = ahead.filter((piece) => piece.power0_W + piece.power1_W < 0);
  const gives = ahead.filter((piece) => piece.power0_W + piece.power1_W > 0);
  const given = stops.map(energyAt);
  const hours = stops.map((stop) => (Math.min(stop, ends_s) - begins_s) / 3600);
  const latest = stops[stops.length - 1] ?? begins_s;
  const count = Math.ceil((latest - start_s) / block_s - 1e-9);
  const wanted = run.bid === null ? certainties : [...certainties, run.bid];
  const blocks = Array.from({ length: Math.max(0, count) }, (_, b): OfferBlock => {
    const from_s = start_s + b * block_s;
    const to_s = from_s + block_s;
    const until = energyAt(to_s);
    const before = energyAt(from_s);
    const own = given.map((energy, k) => {
      const stop = stops[k] as number;
      return (stop < to_s ? energy : until) - (stop < from_s ? energy : before);
    });
    const runs = begins_s <= from_s && ends_s >= to_s;
    let alone = 0;
    let jointly = 0;
    stops.forEach((stop, k) => {
      if (!runs || stop < to_s) return;
      if (counts[k] === 0 || from_s >= until_s) alone += 1 / stops.length;
      if (held[k] === 1 && counts[k] === 0) jointly += 1 / stops.length;
    });
    const at = wanted.map((c) => energyWith(own, c));
    return {
      from_s,
      to_s,
      drawn_MWh_el: Math.max(0, -energyBetween(takes, from_s, to_s) / J_PER_MWH),
      ramp_down_MWh_el: energyBetween(gives, from_s, to_s) / J_PER_MWH,
      most_MWh_el: energyAt(Math.min(to_s, closes_s)) - energyAt(Math.min(from_s, closes_s)),
      mean_MWh_el: meanOf(own),
      whole: { alone: Math.min(1, alone), jointly: Math.min(1, jointly) },
      at: at.slice(0, certainties.length),
      bid_MWh_el: run.bid === null ? null : (at[certainties.length]?.energy_MWh_el as number),
    };
  });
  const wholes = (c: number, of: 'alone' | 'jointly'): number =>
    blocks.filter((block) => block.whole[of] > 0 && block.whole[of] >= c - 1e-9).length;
  return {
    hours: quantilesOf(hours),
    mean_hours: meanOf(hours),
    energy_MWh_el: quantilesOf(given),
    mean_MWh_el: meanOf(given),
    at: certainties.map((certainty) => ({
      hours: quantile(hours, certainty),
      ...energyWith(given, certainty),
      whole_blocks: { alone: wholes(certainty, 'alone'), jointly: wholes(certainty, 'jointly') },
    })),
    blocks,
    bid: run.bid === null ? null : { certainty: run.bid, energy_MWh_el: quantile(given, run.bid) },
  };
}

/** Value that is exceeded with a probability. */
function quantile(ascending: Float64Array, certainty: number): number {
  const at = Math.floor((1 - certainty) * ascending.length + 1e-9);
  return ascending[Math.min(ascending.length - 1, at)] as number;
}

function quantilesOf(ascending: Float64Array): Quantiles {
  const at = (certainty: number): number => quantile(ascending, certainty);
  return { p90: at(0.9), p50: at(0.5), p10: at(0.1) };
}

function energyWith(ascending: Float64Array, certainty: number): EnergyAt {
  const energy_MWh_el = quantile(ascending, certainty);
  let missing = 0;
  let below = 0;
  let count = 0;
  for (const value of ascending) {
    if (!(value < energy_MWh_el)) break;
    missing += energy_MWh_el - value;
    below += value;
    count++;
  }
  return {
    certainty,
    energy_MWh_el,
    expected_shortfall_MWh_el: missing / ascending.length,
    mean_below_MWh_el: count > 0 ? below / count : null,
  };
}

function meanOf(values: Float64Array): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}
