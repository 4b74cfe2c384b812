import { lackBetween, leastMargin } from '../dispatch/firstMinutes.js';
import type { Piece } from './command.js';
import type { DeratedShare, Episode } from './episode.js';
import type { Evaluation } from './evaluation.js';

/** What one run gives or takes between two times at one point of the joint distribution. */
export interface RunEnergy {
  /** As commanded [J], at least 0. */
  commanded(from_s: number, to_s: number): number;
  /** At point k of the joint distribution [J]: until it stops, less while it needs too great a flow. */
  delivered(k: number, from_s: number, to_s: number): number;
}

/**
 * Energy of a run of an evaluated command.
 *
 * Where the greatest flow comes first the power falls off as in the march (`Episode.shares`), counted
 * from the moment at which that flow is first needed, and the unit stops below its least power. What is
 * missing in the first minutes (`Episode.start`) is taken off besides.
 *
 * @param least_W least power of this direction
 */
export function runEnergy(evaluation: Evaluation, e: number, least_W: number): RunEnergy {
  const episode = evaluation.course.episodes[e] as Episode;
  const pieces = evaluation.command.pieces.filter(
    (piece) =>
      piece.mode === episode.direction &&
      piece.from_s >= episode.from_s &&
      piece.to_s <= episode.to_s,
  );
  const cumulative = cumulativeOf(pieces);
  const shares = sharesOf(episode);
  const most_W = Math.max(
    0,
    ...pieces.map((p) => Math.max(Math.abs(p.power0_W), Math.abs(p.power1_W))),
  );
  const lasts_s = shares.until(least_W / most_W);
  const stop = evaluation.stop_s[e] as Float64Array;
  const derate = evaluation.derate_s[e] as Float64Array;
  const commanded = (from_s: number, to_s: number): number =>
    to_s > from_s ? cumulative(to_s) - cumulative(from_s) : 0;
  const start_W = evaluation.start_W[e] ?? null;
  const { start, from_s: begins_s } = episode;
  const least_margin_W = leastMargin(start);
  const swept_s = begins_s + (start[start.length - 1]?.t_s ?? 0);
  /** Missing at first, until the lids are swept or the run has ended. */
  const lacking = (k: number, from_s: number, to_s: number): number => {
    if (start_W === null || from_s >= swept_s) return 0;
    const shift_W = (start_W[k] as number) - least_margin_W;
    return lackBetween(start, shift_W, from_s - begins_s, to_s - begins_s);
  };
  const delivered = (k: number, from_s: number, to_s: number): number => {
    const end_s = Math.min(to_s, stop[k] as number);
    return Math.max(0, held(k, from_s, to_s) - lacking(k, from_s, end_s));
  };
  const held = (k: number, from_s: number, to_s: number): number => {
    const less_s = derate[k] as number;
    const end = Math.min(to_s, stop[k] as number, less_s + lasts_s);
    if (!(end > from_s)) return 0;
    if (end <= less_s) return commanded(from_s, end);
    const begin = Math.max(from_s, less_s);
    const share = shares.mean(begin - less_s, end - less_s);
    return commanded(from_s, begin) + commanded(begin, end) * share;
  };
  return { commanded, delivered };
}

/** Integral of |power| from the first piece on [J]. */
function cumulativeOf(pieces: readonly Piece[]): (t_s: number) => number {
  const sums = [0];
  for (const piece of pieces) {
    const mean = Math.abs(piece.power0_W + piece.power1_W) / 2;
    sums.push((sums[sums.length - 1] as number) + mean * (piece.to_s - piece.from_s));
  }
  return (t_s) => {
    const after = pieces.findIndex((piece) => t_s < piece.to_s);
    if (after < 0) return sums[sums.length - 1] as number;
    const { from_s, to_s, power0_W, power1_W } = pieces[after] as Piece;
    const dt = Math.max(0, t_s - from_s);
    const slope = (Math.abs(power1_W) - Math.abs(power0_W)) / (to_s - from_s);
    return (sums[after] as number) + (Math.abs(power0_W) + (slope * dt) / 2) * dt;
  };
}

/** Share of the commanded power against time since the greatest flow was first needed. */
function sharesOf(episode: Episode): {
  /** Mean over a span of that time. */
  mean(from_s: number, to_s: number): number;
  /** When the share falls below this [s]; Infinity where it does not within the march. */
  until(share: number): number;
} {
  const from_s = episode.times_s[2] as number;
  const table: DeratedShare[] = [
    { t_s: 0, share: 1 },
    ...episode.shares
      .filter(({ t_s }) => t_s > from_s)
      .map(({ t_s, share }) => ({ t_s: t_s - from_s, share })),
  ];
  const sums = table.map(() => 0);
  table.slice(1).forEach((point, i) => {
    const last = table[i] as DeratedShare;
    const mean = (point.share + last.share) / 2;
    sums[i + 1] = (sums[i] as number) + mean * (point.t_s - last.t_s);
  });
  const integral = (t_s: number): number => {
    const after = table.findIndex((point) => t_s < point.t_s);
    const i = after < 0 ? table.length - 1 : after - 1;
    const { t_s: from, share } = table[i] as DeratedShare;
    const next = table[i + 1];
    const slope = next === undefined ? 0 : (next.share - share) / (next.t_s - from);
    const dt = t_s - from;
    return (sums[i] as number) + (share + (slope * dt) / 2) * dt;
  };
  return {
    mean: (a, b) => (b > a ? (integral(b) - integral(a)) / (b - a) : 1),
    until: (share) => table.find((point) => point.share < share)?.t_s ?? Number.POSITIVE_INFINITY,
  };
}
