import type { FirstMinutes } from '../estimate.js';
import { normalDistribution } from '../track/frontViewNormal.js';

/**
 * What the greatest flow gives beyond the power asked [W], below 0 where it is not enough, at a time
 * since the first power [s].
 */
export interface StartMargin {
  readonly t_s: number;
  readonly margin_W: number;
}

/** What is missing of the power asked while gas that stood under the lids is pushed out. */
export interface Lack {
  /** At its most [W]. */
  readonly most_W: number;
  /** From the first power until nothing is missing [s]. */
  readonly until_s: number;
  readonly energy_J: number;
}

export const NO_LACK: Lack = { most_W: 0, until_s: 0, energy_J: 0 };

/**
 * What is missing at first counts from this share of the energy of the first quarter of an hour on: the
 * span over which energy is settled, and the class of a billing meter (0.5). It is that of 4.5 s, less
 * than a ramp takes.
 */
export const LACK_TOLD = 0.005;
export const SETTLED_S = 900;

/**
 * Of what cooled lids take from the margin this share is unsure besides: their steel is not measured
 * while the unit stands (rms against the finer plant after 12 h of rest).
 */
const LID_SHARE = 0.25;

/** What is unsure of the least margin by the lids [W]. */
export function lidSigma(margins: readonly StartMargin[]): number {
  const last = margins[margins.length - 1];
  return last === undefined ? 0 : LID_SHARE * Math.max(0, last.margin_W - leastMargin(margins));
}

/** Energy that may be missing at first without being told [J]. */
export function untoldLack(power_W: number): number {
  return LACK_TOLD * power_W * SETTLED_S;
}

/**
 * Energy missing between two times since the first power, int max(0, -(m(t) + shift)) dt [J]: the
 * margin m goes by straight lines between its points, nothing is missing after the last.
 *
 * @param margins ascending in time
 * @param shift_W added to all of them, for a plant in which they are greater by so much
 */
export function lackBetween(
  margins: readonly StartMargin[],
  shift_W: number,
  from_s: number,
  to_s: number,
): number {
  let sum = 0;
  for (let i = 1; i < margins.length; i++) {
    const a = margins[i - 1] as StartMargin;
    const b = margins[i] as StartMargin;
    const begin = Math.max(a.t_s, from_s);
    const end = Math.min(b.t_s, to_s);
    if (!(end > begin)) continue;
    const slope = (b.margin_W - a.margin_W) / (b.t_s - a.t_s);
    const at = (t_s: number): number => a.margin_W + shift_W + slope * (t_s - a.t_s);
    sum += below(at(begin), at(end)) * (end - begin);
  }
  return sum;
}

/** Mean of max(0, -m) where m goes from `a` to `b` by a straight line. */
function below(a: number, b: number): number {
  if (a >= 0 && b >= 0) return 0;
  if (a <= 0 && b <= 0) return -(a + b) / 2;
  const least = Math.min(a, b);
  return (least * least) / (2 * Math.abs(b - a));
}

/** What is missing at first in a plant whose margins are greater by `shift_W`. */
export function lackOf(margins: readonly StartMargin[], shift_W = 0): Lack {
  const most_W = -(leastMargin(margins) + shift_W);
  if (!(most_W > 0)) return NO_LACK;
  let until_s = 0;
  margins.forEach(({ t_s, margin_W }, i) => {
    const now = margin_W + shift_W;
    if (now >= 0) return;
    const next = margins[i + 1];
    until_s = t_s;
    if (next === undefined) return;
    const then = next.margin_W + shift_W;
    until_s += (next.t_s - t_s) * (then > 0 ? now / (now - then) : 1);
  });
  return { most_W, until_s, energy_J: lackBetween(margins, shift_W, 0, Number.POSITIVE_INFINITY) };
}

/** The least of the margins [W]; Infinity where there are none. */
export function leastMargin(margins: readonly StartMargin[]): number {
  return margins.reduce((least, one) => Math.min(least, one.margin_W), Number.POSITIVE_INFINITY);
}

/**
 * The least margin [W] at which what is missing at first is not told yet, by bisection: what is missing
 * grows steadily as margins shrink.
 *
 * @param margins at least one
 */
export function toldBelow(margins: readonly StartMargin[], power_W: number): number {
  const least = leastMargin(margins);
  const may_J = untoldLack(power_W);
  let high = 0;
  let low = -power_W;
  for (let i = 0; i < 30; i++) {
    const middle = (low + high) / 2;
    const missing = lackBetween(margins, middle - least, 0, Number.POSITIVE_INFINITY);
    if (missing > may_J) low = middle;
    else high = middle;
  }
  return high;
}

/**
 * By how much a run begins [W], below 0 where it does not: the power must be there once the lids are
 * swept. What is missing before that fades within 10 minutes and is told (`firstMinutes`); it does not
 * make a store of hours an empty one, whether the unit stands or has just begun to push cold gas out.
 *
 * @param margins while the lids are swept, the last of them the first after; none: Infinity
 */
export function beginMargin(margins: readonly StartMargin[]): number {
  return margins[margins.length - 1]?.margin_W ?? Number.POSITIVE_INFINITY;
}

/** A unit whose gas is too cold for any power gives none meanwhile; it does not draw instead. */
export function startMargin(t_s: number, greatest_W: number, power_W: number): StartMargin {
  return { t_s, margin_W: Math.max(greatest_W, 0) - power_W };
}

/** What is told of the first minutes, and what is then missing at the p90, p50 and p10 of the energy [J]. */
export interface FirstLack {
  readonly told: FirstMinutes;
  readonly missing_J: { readonly p90: number; readonly p50: number; readonly p10: number };
}

/** Told where at least so probable; and one plant of ten lies so many sigmas away. */
const TOLD_FROM = 0.1;
const SIGMAS_10 = 1.2815515655446004;

/**
 * What is missing at first, by the margins of the likeliest plant and the sigma of the least of them;
 * null where that it counts is less probable than 10 %.
 */
export function firstMinutes(
  margins: readonly StartMargin[],
  power_W: number,
  sigma_W: number,
): FirstLack | null {
  const last = margins[margins.length - 1];
  // Where the power is not had once the lids are swept either, it is not the first minutes that lack.
  if (last === undefined || last.margin_W < 0) return null;
  const beyond_W = toldBelow(margins, power_W) - leastMargin(margins);
  const probability = sigma_W > 0 ? normalDistribution(beyond_W / sigma_W) : beyond_W > 0 ? 1 : 0;
  if (probability < TOLD_FROM) return null;
  const likely = lackOf(margins);
  const worst = lackOf(margins, -SIGMAS_10 * sigma_W);
  const best = lackOf(margins, SIGMAS_10 * sigma_W);
  return {
    told: {
      probability,
      lacking_MW: Math.min(likely.most_W, power_W) / 1e6,
      lacking_at_worst_MW: Math.min(worst.most_W, power_W) / 1e6,
      minutes: likely.until_s / 60,
      lacking_MWh_el: likely.energy_J / 3.6e9,
    },
    missing_J: { p90: worst.energy_J, p50: likely.energy_J, p10: best.energy_J },
  };
}
