import { type AheadModel, type BedsAhead, copyAhead, startAhead, stepAhead } from './bedsAhead.js';
import type { Command, Piece } from './command.js';
import {
  type CourseEnd,
  type Delivered,
  type Episode,
  type MarchOptions,
  marchEpisode,
  type Running,
} from './episode.js';

/** What becomes of a command: runs, net power as delivered, and the beds at the end. */
export interface Course extends CourseEnd {
  readonly episodes: readonly Episode[];
  /** Net power over the whole command, without gaps. */
  readonly delivered: readonly Delivered[];
}

/** Steps while the beds stand: only conduction and losses go on. */
const STAND_STEP_S = 900;

/**
 * Carries out a command on copies of the beds, through charges, discharges and stands, the stop rules
 * obeyed. A unit that had to stop stands until its run would have ended.
 *
 * With `options.from`, the end of a course, the march goes on from there, on the same clock: a
 * command cut in two (see `cutCommand`) at an edge of its pieces and marched in two parts takes the
 * very steps of the whole, since every step ends at such an edge at the latest, and ends the same to
 * the bit. Where a rule breaks within the last step before the cut, the first part has not seen it yet: it is found
 * at the first step of the second, as it is in the whole.
 */
export function marchCourse(model: AheadModel, command: Command, options: MarchOptions): Course {
  const { from } = options;
  const ahead = from === undefined ? startAhead(model) : copyAhead(from.end);
  const episodes: Episode[] = [];
  const delivered: Delivered[] = [];
  const stand_W = -model.machine.auxiliary_standing_W;
  /** Stands from a stop on, piece by piece. */
  const standOn = (group: readonly Piece[], stopped_s: number): void => {
    let at = stopped_s;
    for (const edge of group.flatMap((piece) => [piece.from_s, piece.to_s])) {
      if (!(edge > at)) continue;
      stand(model, ahead, at, edge, options);
      delivered.push({ from_s: at, to_s: edge, power0_W: stand_W, power1_W: stand_W });
      at = edge;
    }
  };
  let running: Running | null = from?.running ?? null;
  const groups = runsOf(command.pieces);
  for (const group of groups) {
    const first = group[0] as Piece;
    const going: Running | null = running?.run.direction === first.mode ? running : null;
    running = null;
    if (first.mode === 'stand') {
      for (const piece of group) {
        stand(model, ahead, piece.from_s, piece.to_s, options);
        delivered.push(piece);
      }
      continue;
    }
    if (going?.stopped) {
      standOn(group, first.from_s);
      running = going;
      continue;
    }
    const run = marchEpisode(model, ahead, group, options, going?.run);
    running = run.running;
    episodes.push(run.episode);
    delivered.push(...run.delivered);
    // What was marched past the stop within its step belongs to the stand.
    const open = options.open && group === groups[groups.length - 1];
    if (run.episode.stopped_s !== null && !open) standOn(group, run.episode.stopped_s);
  }
  return { episodes, delivered, end: ahead, running };
}

function stand(
  model: AheadModel,
  ahead: BedsAhead,
  from_s: number,
  to_s: number,
  options: MarchOptions,
): void {
  const parts = Math.max(1, Math.ceil((to_s - from_s) / STAND_STEP_S));
  const none = { hot_K: Number.NaN, cold_K: Number.NaN };
  const dt = (to_s - from_s) / parts;
  if (!(dt > 0)) return;
  for (let n = 1; n <= parts; n++) {
    stepAhead(model, ahead, 'discharge', 0, none, dt, options.works);
    options.each?.(from_s + n * dt, ahead, 0);
  }
}

/** Pieces of one mode that follow each other. */
export function runsOf(pieces: readonly Piece[]): Piece[][] {
  const runs: Piece[][] = [];
  for (const piece of pieces) {
    const last = runs[runs.length - 1];
    if (last?.[0]?.mode === piece.mode) last.push(piece);
    else runs.push([piece]);
  }
  return runs;
}

/** A command whose pieces end at these times [s] too, so that steps of a march do. */
export function cutAtEdges(command: Command, edges_s: readonly number[]): Command {
  const edges = [...new Set(edges_s)].sort((a, b) => a - b);
  const pieces = command.pieces.flatMap((piece) => {
    const { from_s, to_s, power0_W, power1_W } = piece;
    const cuts = [from_s, ...edges.filter((edge) => edge > from_s && edge < to_s), to_s];
    const powerAt = (t_s: number): number =>
      t_s === to_s
        ? power1_W
        : power0_W + ((power1_W - power0_W) * (t_s - from_s)) / (to_s - from_s);
    return cuts.slice(1).map((end_s, i): Piece => {
      const begin_s = cuts[i] as number;
      const powers = { power0_W: powerAt(begin_s), power1_W: powerAt(end_s) };
      return { ...piece, from_s: begin_s, to_s: end_s, ...powers };
    });
  });
  return { ...command, pieces };
}

/** The parts of a command before and from a time on [s]; see marchCourse. */
export function cutCommand(command: Command, at_s: number): readonly [Command, Command] {
  const { pieces, unmet } = cutAtEdges(command, [at_s]);
  return [
    {
      pieces: pieces.filter((piece) => piece.to_s <= at_s),
      unmet: unmet.filter((part) => part.from_s < at_s),
    },
    {
      pieces: pieces.filter((piece) => piece.from_s >= at_s),
      unmet: unmet.filter((part) => part.to_s > at_s),
    },
  ];
}

/** Net energy between two times [J], + = given. */
export function energyBetween(
  delivered: readonly Delivered[],
  from_s: number,
  to_s: number,
): number {
  let sum = 0;
  for (const part of delivered) {
    const from = Math.max(from_s, part.from_s);
    const to = Math.min(to_s, part.to_s);
    if (!(to > from)) continue;
    const slope = (part.power1_W - part.power0_W) / (part.to_s - part.from_s);
    const middle = part.power0_W + slope * ((from + to) / 2 - part.from_s);
    sum += middle * (to - from);
  }
  return sum;
}
