import type { Direction } from '../definitions.js';
import { inverseNormal } from '../dispatch/normalPoints.js';
import { closer, FINEST, isChanged, isClose, type Judged, judge } from './closer.js';
import { type Evaluation, holding } from './evaluation.js';
import { NORMAL_COUNT } from './latinNormals.js';
import type { Leg } from './leg.js';
import type { Planner } from './planner.js';
import {
  type DrawnIn,
  drawIn,
  energyOf,
  isNearer,
  leastFactor,
  runsOf,
  type Sought,
  scale,
  tookOut,
} from './sought.js';
import { type Trial, type TrialBase, trial, trialBase } from './trial.js';
import { withoutUnmet } from './withoutUnmet.js';

/** The schedule nearest to one asked for that holds at a certainty. */
export interface NearestLegs {
  readonly legs: readonly Leg[];
  /** On all powers of a direction, at most 1. */
  readonly factor: Readonly<Record<Direction, number>>;
  /** Ends drawn in, as they were and as they are [s]. */
  readonly drawn_in: readonly DrawnIn[];
  /** Whether parts were taken out that the machine cannot be commanded. */
  readonly taken_out: boolean;
  /** Probability that it holds, by a full evaluation. */
  readonly probability: number;
}

/**
 * Full evaluations, the one of what was asked among them, marches between two of them, and further
 * evaluations where these find nothing that is close enough.
 */
const USUAL = { evaluations: 4, tries: 80, more: 9 };
/** The same where an evaluation takes seconds. */
const LONG = { evaluations: 3, tries: 40, more: 3 };
/** Running time of a plan beyond which that is so [s]. */
const LONG_S = 48 * 3600;
/** Margin at which no better is looked for, and beyond which it tells only its sign [sigmas]. */
const CLOSE = 0.03;
const TOLD = 3;
/** Times that charging and discharging are sought in turns. */
const TURNS = 3;

/** Why there is no nearest schedule. */
export const NEAREST_REASONS = ['not_allowed', 'nothing_holds', 'not_found'] as const;
/**
 * `not_allowed`: machine, connection and outages leave nothing of what was asked. `nothing_holds`: not
 * even a minute of it at the least power. `not_found`: none in the tries that are made.
 */
export type NearestReason = (typeof NEAREST_REASONS)[number];

/**
 * The nearest schedule that holds with a certainty. Nearest means: one common factor, the greatest
 * that holds, on all discharging powers; where no factor holds at or above the least power, with the
 * smallest factor the end of the last discharge is drawn in, to the latest whole minute that holds,
 * and that of the one before where nothing of the last is left. Where charges cannot be held, the
 * same is done with charging powers; where neither can, each direction may take half of the risk.
 * What machine, connection and outages still do not allow is then taken out.
 *
 * Found by bisection on one cheap march per try with the spread of a full evaluation (see trial), then
 * evaluated in full; where that falls short of the certainty or is much surer, sought anew from there.
 * Where marches do not tell (the greatest flow may be needed at once or never, a per mille of the
 * power apart) factors between what holds and what does not are evaluated in full (see closer).
 *
 * @param evaluation of the legs as they were asked for
 * @returns why there is none where nothing was found that holds, but for standing
 */
export function nearestLegs(
  planner: Planner,
  legs: readonly Leg[],
  evaluation: Evaluation,
  certainty: number,
): NearestLegs | NearestReason {
  const asked: Sought = { legs, factor: { charge: 1, discharge: 1 }, drawn_in: [] };
  const { episodes } = evaluation.course;
  const runs_s = episodes.reduce((sum, { from_s, held_s }) => sum + held_s - from_s, 0);
  const most = runs_s > LONG_S ? LONG : USUAL;
  let own = evaluation;
  let found = asked;
  let best: Judged | null = null;
  let failed: Judged | null = null;
  for (let n = 0; ; n++) {
    const judged = judge(found, own, legs, certainty);
    if (judged.holds && (best === null || isNearer(found, best))) best = judged;
    if (!judged.holds && (failed === null || isNearer(failed, found))) failed = judged;
    if (judged.holds && (!isChanged(found) || isClose(judged, certainty))) break;
    if (n === most.evaluations - 1) break;
    // A little above, so that cheap and full evaluation seldom disagree.
    const target = certainty + (1 - certainty) * 0.02 * 3 ** n;
    const next = seek(planner, legs, trialBase(planner, own), target, found, most.tries);
    if (next === null || (n > 0 && sameFactors(next, found))) break;
    found = next;
    own = planner.evaluate(planner.command(found.legs));
  }
  if (failed !== null && (best === null || (isChanged(best) && !isClose(best, certainty)))) {
    best = closer(planner, legs, certainty, { best, failed, more: most.more });
  }
  if (best !== null) {
    const { factor, drawn_in, probability } = best;
    const taken_out = best.legs.length > legs.length || tookOut(best, legs);
    return { legs: best.legs, factor, drawn_in, taken_out, probability };
  }
  if (energyOf(withoutUnmet(planner, legs)) === 0) return 'not_allowed';
  return energyOf(found.legs) === 0 ? 'nothing_holds' : 'not_found';
}

function sameFactors(one: Sought, other: Sought): boolean {
  return energyOf(one.legs) === energyOf(other.legs);
}

/**
 * @param before what was found before: where to look first
 * @param tries most marches
 * @returns null where these did not do
 */
function seek(
  planner: Planner,
  legs: readonly Leg[],
  base: TrialBase,
  target: number,
  before: Sought,
  tries: number,
): Sought | null {
  const { unit } = planner.outlook.model;
  const factor = { charge: 1, discharge: 1 };
  const drawn: Record<Direction, DrawnIn[]> = { charge: [], discharge: [] };
  const made = (): readonly Leg[] => {
    const ends = [...drawn.charge, ...drawn.discharge];
    return withoutUnmet(planner, drawIn(scale(legs, factor), ends));
  };
  const tried = new Map<string, Trial>();
  let spent = false;
  const risk = (direction?: Direction): number => {
    const key = JSON.stringify([factor, drawn]);
    if (!tried.has(key) && tried.size >= tries) {
      spent = true;
      return 1;
    }
    const known = tried.get(key) ?? trial(planner, base, made());
    tried.set(key, known);
    return 1 - holding(known.episodes, known.first_s, direction);
  };
  /** By how many sigmas a direction holds more surely than it must. */
  const margin = (direction: Direction, most: number): number =>
    sigmasOf(1 - risk(direction)) - sigmasOf(1 - most);
  const mend = (direction: Direction, most: number): void => {
    drawn[direction] = [];
    factor[direction] = 1;
    if (margin(direction, most) >= 0) return;
    const least = leastFactor(unit, legs, direction);
    const near = before.factor[direction];
    const held = greatest([least, 1], near, (value) => {
      factor[direction] = value;
      return margin(direction, most);
    });
    factor[direction] = held ?? least;
    if (held !== null) return;
    drawn[direction] = drawnIn(legs, direction, (ends) => {
      drawn[direction] = ends;
      return margin(direction, most);
    });
  };
  const all = 1 - target;
  if (risk() > all) {
    const asked = { charge: risk('charge'), discharge: risk('discharge') };
    // One direction may take what the other leaves, where that is most of it; else each its half.
    const left = (other: number): number => (other <= all / 2 ? all - other : all / 2);
    const most = { charge: left(asked.discharge), discharge: left(asked.charge) };
    // What discharges no longer take is in the way of later charges: in turns.
    for (let n = 0; n < TURNS; n++) {
      mend('charge', most.charge);
      mend('discharge', most.discharge);
      if (risk('charge') <= most.charge) break;
    }
  }
  if (spent) return null;
  return { legs: made(), factor, drawn_in: [...drawn.charge, ...drawn.discharge] };
}

/** Sigmas of a probability; what all or none of the points do is as sure as their number tells. */
function sigmasOf(probability: number): number {
  const edge = 0.5 / NORMAL_COUNT;
  return inverseNormal(Math.min(1 - edge, Math.max(edge, probability)));
}

/**
 * Greatest value whose margin is not below 0, of a range whose upper end's is; to its `FINEST` part,
 * or within `CLOSE` sigmas; null where there is none. By bisection, at the place that a straight line
 * tells where both margins do; a value within the range that was near before is looked at first.
 */
function greatest(
  [least, most]: readonly [number, number],
  near: number,
  margin: (value: number) => number,
): number | null {
  const range = most - least;
  if (!(range > 0)) return null;
  let low = { at: Number.NaN, margin: Number.NaN };
  let high = { at: most, margin: Number.NaN };
  const look = (at: number): void => {
    const found = margin(at);
    if (found >= 0) low = { at, margin: found };
    else high = { at, margin: found };
  };
  if (near > least && near < most) {
    look(near);
    const up = low.at === near;
    for (let step = range / 32, at = near; ; step *= 2) {
      at += up ? step : -step;
      if (!(at > least && at < most)) break;
      look(at);
      if (Number.isFinite(low.at) && high.at < most) break;
    }
  }
  if (Number.isNaN(low.at)) {
    look(least);
    if (Number.isNaN(low.at)) return null;
  }
  while (high.at - low.at > range / FINEST && !(low.margin < CLOSE)) {
    const share = low.margin / (low.margin - high.margin);
    const told = Math.max(low.margin, -high.margin) < TOLD;
    look(low.at + (high.at - low.at) * (told ? Math.min(0.95, Math.max(0.05, share)) : 0.5));
  }
  return low.at;
}

/** Draws in the last run's end, and those before where nothing is left of it. */
function drawnIn(
  legs: readonly Leg[],
  direction: Direction,
  margin: (ends: DrawnIn[]) => number,
): DrawnIn[] {
  const ends: DrawnIn[] = [];
  for (const run of runsOf(legs, direction).reverse()) {
    const with_ = (end_s: number): DrawnIn[] => [...ends, { direction, asked_s: run.to_s, end_s }];
    if (margin(with_(run.from_s)) < 0) {
      ends.push({ direction, asked_s: run.to_s, end_s: run.from_s });
      continue;
    }
    const minutes = (run.to_s - run.from_s) / 60;
    const at = (value: number): number => run.from_s + Math.floor(value) * 60;
    const most = greatest([0, minutes], 0, (value) => margin(with_(at(value))));
    ends.push({ direction, asked_s: run.to_s, end_s: at(most ?? 0) });
    return ends;
  }
  return ends;
}
