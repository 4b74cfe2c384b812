import type { BedWork } from '../bed/kernel.js';
import type { Direction } from '../definitions.js';
import { type StartMargin, startMargin } from '../dispatch/firstMinutes.js';
import { excessLag, isSwept } from '../dispatch/plenum.js';
import { RULES, SWEEP_MOST_S } from '../dispatch/rollout.js';
import { endOfBed, flowWithin } from '../dispatch/stepStore.js';
import type { EndCause } from '../estimate.js';
import {
  type AheadModel,
  type BedsAhead,
  copyAhead,
  flowFor,
  OUTLET,
  outletsOf,
  powerOf,
  stepAhead,
  worstDrop,
} from './bedsAhead.js';
import type { Piece } from './command.js';

/** A stretch of net power as delivered, linear in time [W], + = given. */
export interface Delivered {
  readonly from_s: number;
  readonly to_s: number;
  readonly power0_W: number;
  readonly power1_W: number;
}

/** One run in one direction, over all the pieces that follow each other. */
export interface Episode {
  readonly direction: Direction;
  readonly from_s: number;
  /** Commanded end, a ramp down to standing included. */
  readonly to_s: number;
  /** End of its last power, where the ramp down begins. */
  readonly held_s: number;
  /**
   * When each rule of `RULES` breaks; beyond `held_s` as if the last power went on. Infinity where
   * that is not within the time looked ahead.
   */
  readonly times_s: Float64Array;
  readonly first_s: number;
  readonly ends_by: EndCause;
  /**
   * Least margin of the rule `flow` from when rules hold until the run ends, and when: power at the
   * greatest flow less the power commanded [W], below 0 where that flow is not enough; Infinity =
   * rules never held.
   */
  readonly closest: Closest;
  /**
   * Until the lids are swept, and at the first moment after: power that flow and pressure drop let
   * through less that commanded, by the time since `from_s`. Where that is below 0 it gives less.
   */
  readonly start: readonly StartMargin[];
  /** When the unit stopped before its commanded end; null = it did not. */
  readonly stopped_s: number | null;
  /** From when on it gave or took less than commanded, at its greatest flow; null = never. */
  readonly derated_s: number | null;
  /**
   * What the greatest flow gives of the commanded power from `times_s[2]` on, step by step, past a
   * stop and past the commanded end too; empty where that flow is never needed.
   */
  readonly shares: readonly DeratedShare[];
}

export interface Closest {
  readonly margin_W: number;
  readonly t_s: number;
}

export interface DeratedShare {
  readonly t_s: number;
  /** [-], 0 to 1. */
  readonly share: number;
}

/** How a march is made. */
export interface MarchOptions {
  readonly step_s: number;
  /** How far past the end of its last power a run is followed for the rules' times [s]; or of each. */
  readonly beyond_s: number | ((from_s: number, held_s: number) => number);
  readonly works: readonly (readonly BedWork[])[];
  /** Where another march ended, to go on from; absent = the present. See `CourseEnd`. */
  readonly from?: CourseEnd;
  /** Nothing is asked of what follows a stop of the last run: it is not marched. */
  readonly open?: boolean;
  /** Called after each step: time, the beds then, and the metered flow of the step, at least 0 [kg/s]. */
  readonly each?: (t_s: number, ahead: BedsAhead, flow_kg_s: number) => void;
}

const FLOW = RULES.indexOf('flow');
/** Until the lids are swept a step is taken in so many parts. */
const SWEEP_PARTS = 5;
/** After a run has ended the other rules are followed for this share of it longer. */
const FOLLOW = 0.15;
/** A derated unit stops below this share of the commanded power where no least power is set. */
const LEAST_SHARE = 0.02;

/** Where a march ended: the beds, and the run that its end cut through. */
export interface CourseEnd {
  readonly end: BedsAhead;
  readonly running: Running | null;
}

/** A run that may go on: what it remembers, and whether a rule has stopped it. */
export interface Running {
  readonly run: Run;
  readonly stopped: boolean;
}

/** What a run remembers from step to step. */
export interface Run {
  readonly direction: Direction;
  readonly from_s: number;
  t: number;
  swept: boolean;
  sweptMass: number[];
  lags: number[];
  workBefore: number;
  flow: number;
  first: number;
  derated: number | null;
  closest: Closest;
  readonly start: StartMargin[];
  readonly shares: DeratedShare[];
  readonly times: Float64Array;
  readonly before: Float64Array;
  readonly beforeAt: Float64Array;
}

/**
 * Marches the beds through one run, in place, and says when each stop rule breaks.
 *
 * Each step takes the metered flow that its mean commanded power needs at the present mixed outlets.
 * Where that is above the greatest flow, the unit goes on with the greatest and gives less; below its
 * least power, or where another rule breaks, it stops. Rules wait until the outlet's plenum is swept,
 * 10 minutes at most (see rollOut, whose timing within a step this follows); what flow and pressure drop
 * let through does not, so that a run may give less at first (`start`). Past a stop, and past
 * the end of the last power, copies of the beds go on so that every rule has a time; what breaks
 * within the ramp down to standing stops the unit there but is no rule's time.
 *
 * @param pieces ramps and runs of one direction, one after the other
 * @param going a run of this direction that was cut where `pieces` begin, to go on with as if it had
 *   not been; it is left as it is
 * @returns the run, what was delivered, and what the run remembers at its end
 */
export function marchEpisode(
  model: AheadModel,
  ahead: BedsAhead,
  pieces: readonly Piece[],
  options: MarchOptions,
  going: Run | null = null,
): { episode: Episode; delivered: Delivered[]; running: Running } {
  const first = pieces[0] as Piece;
  const last = pieces[pieces.length - 1] as Piece;
  const direction = first.mode as Direction;
  const run = going === null ? startRun(model, ahead, direction, first.from_s) : copyRun(going);
  const delivered: Delivered[] = [];
  const down = pieces[rampDown(pieces)];
  let stopped: number | null = null;
  /** Before a ramp down to standing: what a unit that held its power would go on with. */
  let held: { run: Run; ahead: BedsAhead; power_W: number } | null = null;
  for (const piece of pieces) {
    if (stopped !== null) break;
    if (piece === down) {
      held = { run: copyRun(run), ahead: copyAhead(ahead), power_W: Math.abs(piece.power0_W) };
    }
    while (stopped === null && run.t < piece.to_s - 1e-6) {
      const dt = Math.min(stepOf(run, options.step_s), piece.to_s - run.t);
      const from = run.t;
      const power0 = powerAt(piece, from);
      const power1 = powerAt(piece, from + dt);
      const made = stepRun(model, ahead, run, Math.abs(power0 + power1) / 2, dt, options.works);
      stopped = made.stopped_s;
      if (stopped !== null) break;
      const share = made.share;
      delivered.push({
        from_s: from,
        to_s: run.t,
        power0_W: power0 * share,
        power1_W: power1 * share,
      });
      options.each?.(run.t, ahead, run.flow);
    }
  }
  const at = stopped ?? run.t;
  const running = { run: copyRun(run), stopped: stopped !== null };
  const held_s = down?.from_s ?? last.to_s;
  const on = held ?? {
    run,
    ahead: copyAhead(ahead),
    power_W: Math.abs(stopped === null ? last.power1_W : powerAt(pieceAt(pieces, at), at)),
  };
  const whole = stopped === null || held !== null;
  const { beyond_s } = options;
  const more_s = typeof beyond_s === 'number' ? beyond_s : beyond_s(first.from_s, held_s);
  const until = whole ? on.run.t + more_s : Number.POSITIVE_INFINITY;
  if (more_s > 0 || !whole) {
    followOn(
      model,
      on.ahead,
      on.run,
      on.power_W,
      { until_s: until, ended_s: whole ? null : stopped },
      options,
    );
  }
  let best = Number.POSITIVE_INFINITY;
  let cause: EndCause = 'empty';
  on.run.times.forEach((time, r) => {
    if (time < best) {
      best = time;
      cause = RULES[r] as EndCause;
    }
  });
  return {
    episode: {
      direction,
      from_s: first.from_s,
      to_s: last.to_s,
      held_s,
      times_s: on.run.times,
      first_s: best,
      ends_by: cause,
      stopped_s: stopped,
      closest: (held ?? running).run.closest,
      start: on.run.start,
      derated_s: running.run.derated,
      shares: on.run.shares,
    },
    running,
    delivered: stopped === null ? delivered : cutAt(delivered, stopped),
  };
}

/** Index of the first piece of a ramp down to standing that ends a run; their number where none does. */
function rampDown(pieces: readonly Piece[]): number {
  let from = pieces.length;
  let next_W = 0;
  for (; from > 1; from--) {
    const { purpose, power0_W, power1_W } = pieces[from - 1] as Piece;
    const falls = purpose === 'ramp' && Math.abs(power0_W) > Math.abs(power1_W);
    if (!falls || power1_W !== next_W) break;
    next_W = power0_W;
  }
  return from;
}

function startRun(model: AheadModel, ahead: BedsAhead, direction: Direction, from_s: number): Run {
  model.stores.forEach((store, i) => {
    ahead.left_K[i] = endOfBed(store, ahead.beds[i] as Float64Array[], OUTLET[direction]);
  });
  return {
    direction,
    from_s,
    t: from_s,
    swept: false,
    sweptMass: model.stores.map(() => 0),
    lags: model.stores.map(() => 0),
    workBefore: Number.NaN,
    flow: 0,
    first: Number.POSITIVE_INFINITY,
    derated: null,
    closest: { margin_W: Number.POSITIVE_INFINITY, t_s: from_s },
    start: [],
    shares: [],
    times: new Float64Array(RULES.length).fill(Number.POSITIVE_INFINITY),
    before: new Float64Array(RULES.length).fill(Number.NaN),
    beforeAt: new Float64Array(RULES.length),
  };
}

function copyRun(run: Run): Run {
  return {
    ...run,
    sweptMass: [...run.sweptMass],
    lags: [...run.lags],
    start: [...run.start],
    shares: [...run.shares],
    times: run.times.slice(),
    before: run.before.slice(),
    beforeAt: run.beforeAt.slice(),
  };
}

/** Longest next step of a run [s]. */
function stepOf(run: Run, step_s: number): number {
  return run.swept ? step_s : step_s / SWEEP_PARTS;
}

/**
 * One step: holds the rules against the present, then moves the beds by `dt`. Where a rule that
 * stops the unit is found broken, nothing moves and the time of the stop is told.
 */
function stepRun(
  model: AheadModel,
  ahead: BedsAhead,
  run: Run,
  power_W: number,
  dt: number,
  works: MarchOptions['works'],
  goOn = false,
): { stopped_s: number | null; share: number } {
  const { direction, t } = run;
  const end = OUTLET[direction];
  const plena = ahead.ends_K.map((ends) => ends[end]);
  const outlets = outletsOf(model, plena);
  const point = model.machine.operate(direction, outlets, model.ambient_K);
  const work = point.specificWork_J_kg;
  const needed = flowFor(model, direction, power_W, work, run.flow);
  const limits = model.unit.limits;
  const whole = limits[direction].flow_max_kg_s;
  const most = run.swept
    ? whole
    : flowWithin(model.stores, ahead.beds, limits.pressure_drop_max_Pa, whole);
  const drop = worstDrop(model, ahead, Math.min(needed, most));
  const margins = marginsOf(model, direction, outlets, power_W, drop, work);
  const elapsed = t - run.from_s;
  if (!run.swept) {
    run.start.push(startMargin(elapsed, powerOf(model, direction, most, work), power_W));
  }
  if (
    !run.swept &&
    (elapsed >= SWEEP_MOST_S || isSwept(model.stores, plena, run.sweptMass, elapsed, end))
  ) {
    run.swept = true;
  }
  if (run.swept) noteBreaks(model, run, margins);
  const margin_W = margins[FLOW] as number;
  if (run.swept && margin_W < run.closest.margin_W) run.closest = { margin_W, t_s: t };
  const greatest = needed > most ? Math.max(0, powerOf(model, direction, most, work)) : power_W;
  const least = limits[direction].power_min_W || LEAST_SHARE * power_W;
  const tooLittle = needed > most && (!(work > 0) || greatest < Math.min(least, power_W));
  const stops = [0, 1, 3, 4].map((r) => run.times[r] as number);
  const stop = Math.min(...stops, tooLittle && run.swept ? t : Number.POSITIVE_INFINITY);
  if (!goOn && stop <= t) return { stopped_s: Math.max(run.from_s, stop), share: 0 };
  if (run.swept && needed > most && power_W > 0) {
    run.shares.push({ t_s: t, share: Math.min(1, greatest / power_W) });
  }
  if (run.swept && needed > most) run.derated ??= Math.max(run.from_s, run.times[2] as number);
  // The flow of a step is that of its middle, by a straight line through the last two.
  const mean = run.lags.reduce((sum, lag) => sum + lag, 0) / run.lags.length;
  const trend = Number.isFinite(run.workBefore) ? work - run.workBefore : 0;
  const middle = work + trend * (0.5 + mean / dt);
  const wanted = flowFor(model, direction, power_W, middle > 0 ? middle : work, run.flow);
  const flow = Math.min(wanted, most);
  run.workBefore = run.swept ? work : Number.NaN;
  run.flow = flow;
  model.stores.forEach((store, i) => {
    const plenum = plena[i] as number;
    run.lags[i] = flow > 0 ? excessLag(store, plenum, ahead.left_K[i] as number, flow, dt, end) : 0;
    run.sweptMass[i] = (run.sweptMass[i] as number) + flow * dt;
  });
  stepAhead(model, ahead, direction, flow, point.inlets, dt, works);
  run.t = t + dt;
  const share = power_W > 0 && wanted > most ? Math.min(1, greatest / power_W) : 1;
  return { stopped_s: null, share };
}

/** Margins of the rules, in their order; each is positive while its rule holds, NaN = not a rule here. */
function marginsOf(
  model: AheadModel,
  direction: Direction,
  outlets: { hot_K: number; cold_K: number | null },
  power_W: number,
  drop_Pa: number,
  work_J_kg: number,
): number[] {
  const { limits } = model.unit;
  const { hot_K } = outlets;
  const cold_K = outlets.cold_K ?? Number.NaN;
  const charging = direction === 'charge';
  const hot = charging
    ? (limits.charge_hot_outlet_max_K ?? Number.NaN) - hot_K
    : hot_K - (limits.hot_outlet_min_K ?? Number.NaN);
  const cold = charging
    ? cold_K - (limits.charge_cold_outlet_min_K ?? Number.NaN)
    : (limits.cold_outlet_max_K ?? Number.NaN) - cold_K;
  const most = limits[direction].flow_max_kg_s;
  return [
    hot,
    cold,
    // By power, which is linear in the work: the flow runs away where the work goes to nothing.
    powerOf(model, direction, most, work_J_kg) - power_W,
    limits.pressure_drop_max_Pa === null ? Number.NaN : limits.pressure_drop_max_Pa - drop_Pa,
    work_J_kg,
  ];
}

/** Notes the time at which each rule was first found broken, by a straight line within its step. */
function noteBreaks(model: AheadModel, run: Run, margins: readonly number[]): void {
  const mean = run.lags.reduce((sum, lag) => sum + lag, 0) / run.lags.length;
  margins.forEach((margin, r) => {
    if (run.times[r] !== Number.POSITIVE_INFINITY || Number.isNaN(margin)) return;
    const kind = r === 0 ? 'hot' : r === 1 ? 'cold' : null;
    const store = kind === null ? -1 : model.stores.findIndex((s) => s.store.kind === kind);
    const at = run.t - (run.lags[store] ?? mean);
    if (margin > 0) {
      run.before[r] = margin;
      run.beforeAt[r] = at;
      return;
    }
    const last = run.before[r] as number;
    // Broken at its very first test: there never was a run.
    run.times[r] = Number.isNaN(last)
      ? run.from_s
      : at - ((at - (run.beforeAt[r] as number)) * margin) / (margin - last);
    run.first = Math.min(run.first, run.times[r] as number);
  });
}

/**
 * Goes on at a constant power so that the rules not yet broken have a time: until some time past the
 * end of the run, or past its first broken rule where it did not end by one.
 */
function followOn(
  model: AheadModel,
  ahead: BedsAhead,
  run: Run,
  power_W: number,
  { until_s, ended_s }: { readonly until_s: number; readonly ended_s: number | null },
  options: MarchOptions,
): void {
  if (!(power_W > 0)) return;
  for (;;) {
    // A derated run ends long after its first broken rule, that of the greatest flow.
    const end_s = ended_s ?? run.first;
    const follow = end_s + FOLLOW * Math.max(end_s - run.from_s, options.step_s);
    if (run.t >= Math.min(until_s, follow) || end_s <= run.from_s) return;
    stepRun(model, ahead, run, power_W, stepOf(run, options.step_s), options.works, true);
    if (!Number.isFinite(run.flow)) return;
  }
}

function powerAt(piece: Piece, t_s: number): number {
  const { from_s, to_s, power0_W, power1_W } = piece;
  return power0_W === power1_W
    ? power0_W
    : power0_W + ((power1_W - power0_W) * (t_s - from_s)) / (to_s - from_s);
}

function pieceAt(pieces: readonly Piece[], t_s: number): Piece {
  return pieces.find((piece) => t_s < piece.to_s) ?? (pieces[pieces.length - 1] as Piece);
}

function cutAt(delivered: readonly Delivered[], t_s: number): Delivered[] {
  return delivered.flatMap((part) => {
    if (part.from_s >= t_s) return [];
    if (part.to_s <= t_s) return [part];
    const share = (t_s - part.from_s) / (part.to_s - part.from_s);
    const power1_W = part.power0_W + (part.power1_W - part.power0_W) * share;
    return [{ ...part, to_s: t_s, power1_W }];
  });
}
