import type { Direction } from '../definitions.js';
import type { HeatCapacity } from '../dispatch/heatCapacity.js';
import { excessLag } from '../dispatch/plenum.js';
import { type AheadModel, type BedsAhead, OUTLET } from './bedsAhead.js';
import { contentOf } from './content.js';
import { energyBetween } from './course.js';
import type { MarchOptions } from './episode.js';
import { type GreatestPower, greatestPower, nominalCeiling } from './greatest.js';
import { firstBreak_s, type LimitRun, type Moment, watchToLimit } from './limitToLimit.js';
import { type CurvePoint, valueAt } from './piecewise.js';

/** One moment of a march from limit to limit. */
export interface PathSample extends GreatestPower {
  /** State of charge as the unit publishes it: dispatchable over rated energy at rated power. */
  readonly soc: number;
  /** Given from here to empty, or taken from here to full, at the power marched with [J]. */
  readonly energy_J: number;
  /** Above the discharged reference, per store [MWh_th]. */
  readonly content_MWh_th: readonly number[];
}

export interface Path {
  readonly run: LimitRun;
  /** State of charge ascending. */
  readonly samples: readonly PathSample[];
}

/** What paths are marched with. */
export interface PathMarch {
  readonly model: AheadModel;
  readonly options: MarchOptions;
  readonly capacity: readonly HeatCapacity[];
}

/** Longest run that is looked at, over the rated hours at rated power. */
const MOST_RATED = 4;
/** Discharges rolled out along a charge for its state of charge, which is all but straight between. */
const NODES = 12;
/** States of charge that differ by less are one. */
const LEAST_STEP = 1e-9;

/** Longest time that a run is followed [s]. */
export function longest_s(model: AheadModel, power_W: number): number {
  const { rated_hours, rated_power_W } = model.unit;
  return MOST_RATED * rated_hours * 3600 * Math.max(1, rated_power_W / power_W);
}

/** State of charge of beds, as the unit publishes it, by a discharge at rated power. */
export function chargeOf({ model, options }: PathMarch, beds: BedsAhead): number {
  const { rated_hours, rated_power_W } = model.unit;
  const most_s = longest_s(model, rated_power_W);
  const time_s = firstBreak_s(model, beds, 'discharge', rated_power_W, most_s, options);
  return time_s / 3600 / rated_hours;
}

/** A run from limit to limit with the greatest power of its direction at each moment. */
export function pathOf(
  march: PathMarch,
  from: BedsAhead,
  direction: Direction,
  power_W: number,
): Path {
  const { model, options, capacity } = march;
  const most = { time_s: longest_s(model, power_W) };
  const { moments, ...run } = watchToLimit(model, from, direction, power_W, most, options);
  const zero_h = direction === 'discharge' ? Math.min(run.first_h, run.hours) : run.hours;
  const charge = direction === 'discharge' ? downwards(march, run) : upwards(march, moments);
  const greatest = greatestAlong(model, moments, direction);
  const samples = moments.map(
    ({ t_s, beds }, n): PathSample => ({
      soc: charge(t_s),
      energy_J: Math.abs(energyBetween(run.delivered, t_s, zero_h * 3600)),
      content_MWh_th: contentOf(model, beds, capacity),
      ...(greatest[n] as GreatestPower),
    }),
  );
  return { run, samples: ascending(samples, direction) };
}

/**
 * Greatest power at each moment of a run. What leaves a bed is known as the mean of a step, and so
 * counts for its middle, later by the lag of the plenum (see `excessLag`): what is seen at a moment is
 * of that much earlier, and what is at the moment lies on a straight line through what is seen.
 */
function greatestAlong(
  model: AheadModel,
  moments: readonly Moment[],
  direction: Direction,
): GreatestPower[] {
  const seen = moments.map(({ t_s, beds }) => greatestPower(model, beds, direction, t_s));
  const line = seen.map(({ power_W }, n) => {
    const { t_s } = moments[n] as Moment;
    return { x: n === 0 ? t_s : t_s - lagOf(model, moments, n, direction), y: power_W };
  });
  const ceiling = nominalCeiling(model, direction);
  return moments.map(({ t_s }, n): GreatestPower => {
    const power_W = Math.max(0, onward(line, t_s));
    return power_W >= ceiling.power_W ? ceiling : { ...(seen[n] as GreatestPower), power_W };
  });
}

/** Mean over the stores [s]; see `excessLag`. */
function lagOf(
  model: AheadModel,
  moments: readonly Moment[],
  n: number,
  direction: Direction,
): number {
  const { t_s, flow_kg_s, beds } = moments[n] as Moment;
  const before = moments[n - 1] as Moment;
  const end = OUTLET[direction];
  if (!(flow_kg_s > 0)) return 0;
  const lags = model.stores.map((store, s) =>
    excessLag(
      store,
      before.beds.ends_K[s]?.[end] as number,
      beds.left_K[s] as number,
      flow_kg_s,
      t_s - before.t_s,
      end,
    ),
  );
  return lags.reduce((sum, lag) => sum + lag, 0) / lags.length;
}

/** Value on straight lines, and past the last point on the line through the last two. */
function onward(line: readonly CurvePoint[], x: number): number {
  const [a, b] = line.slice(-2);
  if (a === undefined || b === undefined || x <= b.x || b.x <= a.x) return valueAt(line, x);
  return b.y + ((b.y - a.y) * (x - b.x)) / (b.x - a.x);
}

/** By a discharge at rated power the state of charge falls as time goes, to 0 at the first rule. */
function downwards({ model }: PathMarch, run: LimitRun): (t_s: number) => number {
  const end_h = Math.min(run.first_h, run.hours);
  return (t_s) => (end_h - t_s / 3600) / model.unit.rated_hours;
}

/** By discharges rolled out from some of the moments, straight between them. */
function upwards(march: PathMarch, moments: readonly Moment[]): (t_s: number) => number {
  const last = moments.length - 1;
  const picked = new Set(
    Array.from({ length: NODES + 1 }, (_, k) => Math.round((k / NODES) * last)),
  );
  const nodes = [...picked].map((i) => {
    const { t_s, beds } = moments[i] as Moment;
    return { x: t_s, y: chargeOf(march, beds) };
  });
  return (t_s) => valueAt(nodes, t_s);
}

/**
 * In order of the state of charge; what does not move it on is left out. A discharge that goes on
 * with less than rated power below 0 is cut there, by a straight line through the steps about it.
 */
function ascending(samples: readonly PathSample[], direction: Direction): PathSample[] {
  const ordered = direction === 'discharge' ? [...samples].reverse() : samples;
  const kept: PathSample[] = [];
  let below: PathSample | null = null;
  for (const sample of ordered) {
    if (sample.soc < -LEAST_STEP) {
      below = sample;
      continue;
    }
    const last = kept[kept.length - 1];
    if (last === undefined && below !== null && sample.soc > LEAST_STEP) {
      kept.push(atZero(below, sample));
    }
    if (last === undefined || sample.soc > last.soc + LEAST_STEP) {
      kept.push(sample.soc < LEAST_STEP ? { ...sample, soc: 0 } : sample);
    }
  }
  return kept;
}

function atZero(below: PathSample, above: PathSample): PathSample {
  const share = -below.soc / (above.soc - below.soc);
  const between = (a: number, b: number): number => a + (b - a) * share;
  return {
    soc: 0,
    power_W: between(below.power_W, above.power_W),
    limited_by: below.limited_by,
    energy_J: 0,
    content_MWh_th: below.content_MWh_th.map((own, s) =>
      between(own, above.content_MWh_th[s] as number),
    ),
  };
}
