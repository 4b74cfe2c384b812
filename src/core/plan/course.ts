import { type AheadModel, type BedsAhead, startAhead, stepAhead } from './bedsAhead.js';
import type { Command, Piece } from './command.js';
import { type Delivered, type Episode, type MarchOptions, marchEpisode } from './episode.js';

/** What becomes of a command: runs, net power as delivered, and the beds at the end. */
export interface Course {
  readonly episodes: readonly Episode[];
  /** Net power over the whole command, without gaps. */
  readonly delivered: readonly Delivered[];
  readonly end: BedsAhead;
}

/** Steps while the beds stand: only conduction and losses go on. */
const STAND_STEP_S = 900;

/**
 * Carries out a command on copies of the beds, through charges, discharges and stands, the stop rules
 * obeyed. A unit that had to stop stands until its run would have ended.
 */
export function marchCourse(model: AheadModel, command: Command, options: MarchOptions): Course {
  const ahead = startAhead(model);
  const episodes: Episode[] = [];
  const delivered: Delivered[] = [];
  const stand_W = -model.machine.auxiliary_standing_W;
  for (const group of runsOf(command.pieces)) {
    const first = group[0] as Piece;
    const last = group[group.length - 1] as Piece;
    if (first.mode === 'stand') {
      for (const piece of group) {
        stand(model, ahead, piece.from_s, piece.to_s, options);
        delivered.push(piece);
      }
      continue;
    }
    const run = marchEpisode(model, ahead, group, options);
    episodes.push(run.episode);
    delivered.push(...run.delivered);
    const stopped = run.episode.stopped_s;
    if (stopped === null) continue;
    // What was marched past the stop within its step belongs to the stand.
    stand(model, ahead, stopped, last.to_s, options);
    const rest = { from_s: stopped, to_s: last.to_s, power0_W: stand_W, power1_W: stand_W };
    if (last.to_s > stopped) delivered.push(rest);
  }
  return { episodes, delivered, end: ahead };
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
function runsOf(pieces: readonly Piece[]): Piece[][] {
  const runs: Piece[][] = [];
  for (const piece of pieces) {
    const last = runs[runs.length - 1];
    if (last?.[0]?.mode === piece.mode) last.push(piece);
    else runs.push([piece]);
  }
  return runs;
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
