import { storeEnergy } from '../track/storeEnergy.js';
import type { StoreState } from '../track/storeTracker.js';
import { type BedsAhead, copyAhead, startAhead } from './bedsAhead.js';
import { type ChargeSigma, sigmaNow, sigmasAtMarks } from './chargeSigma.js';
import type { Command, Piece } from './command.js';
import { type Course, energyBetween } from './course.js';
import { marchEpisode } from './episode.js';
import type { Outlook } from './outlook.js';
import type { WatchedMarches } from './watchedMarches.js';

/** State of charge at one time of a plan [-], with one sigma each. */
export interface ChargeAhead {
  readonly t_s: number;
  /** Of the unit: see `chargesAhead`. */
  readonly unit: number;
  readonly unit_sigma: number;
  /** In the order of the unit's stores; not clamped. */
  readonly stores: readonly { readonly soc: number; readonly sigma: number }[];
}

/** Where the states of charge of stores were taken down. */
export interface ChargePoints {
  /** Ascending, above 0 [s]. */
  readonly times_s: readonly number[];
  /** By time and store. */
  readonly charges: readonly (readonly number[])[];
}

/** Steps end within this of the times they are meant to [s]. */
const SAME_S = 1e-3;

/**
 * State of charge now and at every point of a plan.
 *
 * A store's is that of the best march; its sigma follows from the gradient (see sigmasAtMarks), taken
 * at the marks and drawn straight between.
 *
 * The unit's is dispatchable over rated energy at rated power, as in an estimate: rolled out now and
 * at the marks (there on the estimate's own cells, in the proportion of both rollouts of now);
 * between them it moves as between an estimate's rollouts (see stateOfCharge: by what a discharge
 * delivers with the auxiliaries, else with the store that holds less), and what the rollout of the
 * next mark says otherwise comes in evenly until then. Approximate: at the marks by what proportion
 * and coarse cells leave, a few thousandths; between them less than a hundredth more.
 *
 * @param course of the best march of `command`
 * @param points of the best march: the edges of the plan, and what other times are told
 * @param marks_s as given to `watchedMarches`; every mark is one of the points
 */
export function chargesAhead(
  outlook: Outlook,
  command: Command,
  course: Course,
  watched: WatchedMarches,
  points: ChargePoints,
  marks_s: readonly number[],
): ChargeAhead[] {
  const { model, state } = outlook;
  const perCharge = model.fullHours() / model.unit.rated_hours;
  const knots_s = [0, ...marks_s];
  const units = rolledOut(outlook, watched.beds());
  const sigmas: ChargeSigma[] = [
    sigmaNow(outlook, perCharge, units[0] as number),
    ...sigmasAtMarks(outlook, watched, perCharge, units.slice(1)),
  ];
  const times_s = [0, ...points.times_s];
  const charges = [
    model.stores.map((store, s) => storeEnergy(store, state.stores[s] as StoreState).soc),
    ...points.charges,
  ];
  let carried = units[0] as number;
  const raw = times_s.map((t_s, i) => {
    if (i === 0) return carried;
    const span = { from_s: times_s[i - 1] as number, to_s: t_s };
    const change =
      least(charges[i] as readonly number[]) - least(charges[i - 1] as readonly number[]);
    carried += given(outlook, command, course, span) ?? perCharge * change;
    return carried;
  });
  const missing = knots_s.map((knot_s, m) => {
    const at = times_s.findIndex((t_s) => Math.abs(t_s - knot_s) <= SAME_S);
    return (units[m] as number) - (raw[at] as number);
  });
  return times_s.map((t_s, i) => {
    const along = (of: (m: number) => number): number => between(knots_s, t_s, of);
    return {
      t_s,
      unit: Math.max(0, (raw[i] as number) + along((m) => missing[m] as number)),
      unit_sigma: along((m) => (sigmas[m] as ChargeSigma).unit),
      stores: (charges[i] as number[]).map((soc, s) => ({
        soc,
        sigma: along((m) => sigmas[m]?.stores[s] as number),
      })),
    };
  });
}

const least = (socs: readonly number[]): number => Math.min(...socs);

/** By a straight line between the knots either side of a time; beyond the last, that of the last. */
function between(knots_s: readonly number[], t_s: number, of: (m: number) => number): number {
  const after = knots_s.findIndex((knot_s) => t_s <= knot_s + SAME_S);
  if (after === 0 || after < 0) return of(after < 0 ? knots_s.length - 1 : 0);
  const begins_s = knots_s[after - 1] as number;
  const share = (t_s - begins_s) / ((knots_s[after] as number) - begins_s);
  return of(after - 1) + (of(after) - of(after - 1)) * Math.min(1, share);
}

/** What a discharge takes from the unit's state of charge; null while nothing is delivered. */
function given(
  { model }: Outlook,
  command: Command,
  course: Course,
  { from_s, to_s }: { readonly from_s: number; readonly to_s: number },
): number | null {
  const { unit, machine } = model;
  const middle = (from_s + to_s) / 2;
  const piece = command.pieces.find((one) => one.from_s <= middle && middle < one.to_s);
  const given_J = energyBetween(course.delivered, from_s, to_s);
  if (piece?.mode !== 'discharge' || !(given_J > 0)) return null;
  const rated_W = unit.rated_power_W + machine.auxiliary_running_W;
  const drawn_J = given_J + machine.auxiliary_running_W * (to_s - from_s);
  return -drawn_J / rated_W / 3600 / unit.rated_hours;
}

/** The unit's state of charge now and at the marks, rolled out at rated power. */
function rolledOut(outlook: Outlook, beds: readonly BedsAhead[]): number[] {
  const { unit } = outlook.model;
  const power_W = unit.rated_power_W;
  const most_s = 4 * unit.rated_hours * 3600;
  const run = (on: ReturnType<Outlook['beds']>, from: BedsAhead): number => {
    const held = { power0_W: power_W, power1_W: power_W, leg: 0 };
    const piece: Piece = { from_s: 0, to_s: most_s, mode: 'discharge', purpose: 'run', ...held };
    const { episode } = marchEpisode(on.ahead, from, [piece], on.options);
    return Math.min(episode.first_s, most_s) / 3600 / unit.rated_hours;
  };
  const best = outlook.beds();
  const bare = outlook.bare();
  const now = run(best, startAhead(best.ahead));
  const coarse = run(bare, startAhead(bare.ahead));
  const proportion = coarse > 0 ? now / coarse : 1;
  return [now, ...beds.map((at) => proportion * run(bare, copyAhead(at)))];
}
