import type { EndCause, Quantiles } from '../estimate.js';
import { commandOf } from './command.js';
import type { PlanContext } from './context.js';
import { energyBetween } from './course.js';
import type { CommandCause } from './leg.js';
import { limitedBy } from './limitedBy.js';
import { createOutlook } from './outlook.js';
import { firstBreaks, spreadOf } from './spread.js';

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
  /** What ends it; null where nothing does within the time looked ahead, or the unit cannot run. */
  readonly ends_by: EndCause | null;
  /** Why the unit would not be run at this power; null = it would. */
  readonly refused: string | null;
  /** What keeps it from that power at some time within the p10 of the hours; null = nothing does. */
  readonly limited_by: CommandCause | null;
}

/** Longest charge that is looked at, over the rated hours at rated power. */
const MOST_RATED = 4;
const J_PER_MWH = 3.6e9;
const NOTHING: Quantiles = { p90: 0, p50: 0, p10: 0 };

/**
 * Hours and energy that the unit can still take at given powers until a store breaks through or the
 * flow is at its greatest. These are the stores': where the connection or an outage is in the way, the
 * answer says so.
 *
 * @throws RangeError for a power that is not above 0
 */
export function headroomOf(context: PlanContext, ask: HeadroomAsk): Headroom[] {
  const { model, state, before } = context;
  const { unit } = model;
  return ask.powers_W.map((power_W) => {
    if (!(power_W > 0 && Number.isFinite(power_W))) {
      throw new RangeError(`power_W = ${power_W}: expected a finite number above 0`);
    }
    const power_MW_el = power_W / 1e6;
    const nothing = { power_MW_el, hours: NOTHING, energy_MWh_el: NOTHING, ends_by: null };
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
    const outlook = createOutlook(model, state, power_W / unit.rated_power_W);
    const spread = spreadOf(outlook, command);
    // A unit that still discharges ramps down first: that run is another one.
    const run = spread.course.episodes.findIndex(({ direction }) => direction === 'charge');
    const episode = spread.course.episodes[run];
    const breaks = firstBreaks(spread)[run]?.sort();
    if (episode === undefined || breaks === undefined) {
      return { ...nothing, refused: null, limited_by: null };
    }
    const from_s = episode.from_s;
    const given = command.pieces.filter(({ mode, to_s }) => mode === 'discharge' && to_s <= from_s);
    const taken_s = given[given.length - 1]?.to_s ?? 0;
    const at = (share: number): number =>
      Math.min(most_s, breaks[Math.floor(share * breaks.length)] as number);
    const hours = (share: number): number => (at(share) - from_s) / 3600;
    // Before the beds are asked, so that the energy of a quantile is that of its time.
    const energy = (share: number): number =>
      -energyBetween(command.pieces, taken_s, at(share)) / J_PER_MWH;
    return {
      power_MW_el,
      hours: { p90: hours(0.1), p50: hours(0.5), p10: hours(0.9) },
      energy_MWh_el: { p90: energy(0.1), p50: energy(0.5), p10: energy(0.9) },
      ends_by: Number.isFinite(episode.first_s) ? episode.ends_by : null,
      refused: null,
      limited_by: limitedBy(unit, 'charge', power_W, context.now_ms, hours(0.9) * 3600),
    };
  });
}
