import { enthalpyAt, temperatureAt } from '../bed/tables.js';
import type { Quantiles } from '../estimate.js';
import { referenceEnthalpies, storeEnergy } from '../track/storeEnergy.js';
import type { StoreState } from '../track/storeTracker.js';
import { type FirstLack, firstMinutes, leastMargin, lidSigma } from './firstMinutes.js';
import type { HoursInput } from './hours.js';
import { memberAt, type Slopes } from './members.js';
import { BUMP_K, BUMPS, bumpWeights, type Perturbation, type Roller } from './roller.js';
import { type RolloutResult, RULES, SWEEP_MOST_S } from './rollout.js';

const FLOW = RULES.indexOf('flow');
/** Index of the least margin while the lids are swept among those of `marginsOf`, after the rules. */
const LEAST = RULES.length;
/** 10 % of a normal lie beyond so many sigmas. */
const SIGMAS_10 = 1.2815515655446004;
const PROBE_LOG = 0.01;

/**
 * Quantiles where the discharge of the estimate does not begin, or would hardly: its sigma says
 * nothing there, since a plant a little better may run for hours and none runs for less than none.
 * The plants that lie 1.28 sigmas away along the margin that is missing are rolled out themselves.
 *
 * Where an outlet is beyond its limit as soon as its rule holds, a plant may refuse to start, or run
 * at least until its plenum is swept and at most as long as the rules wait; the middle is p50.
 */
export function quantilesAtStart(
  input: HoursInput,
  roller: Roller,
  best: RolloutResult,
): Quantiles {
  const slopes = startSlopes(input, roller, best);
  const swept_s = Math.min(best.trips_s, SWEEP_MOST_S);
  const waits = best.end_s === 0 && best.trips_s > 0 && best.ends_by !== 'flow';
  const p50 = waits ? (swept_s + SWEEP_MOST_S) / 2 : best.end_s;
  const latest = waits ? SWEEP_MOST_S : p50;
  if (slopes === null) return inHours(waits ? 0 : p50, p50, latest, roller.most_s);
  const { at } = memberAt(input, slopes);
  const p10 = Math.max(latest, roller.member(at(SIGMAS_10)).end_s);
  const p90 = best.end_s > 0 ? Math.min(p50, roller.member(at(-SIGMAS_10)).end_s) : 0;
  return inHours(p90, p50, p10, roller.most_s);
}

/**
 * Within this share of the power it is looked at whether the discharge would begin, or lack something
 * at first: beyond, no machine and meter are so unsure (a sigma of a fifth).
 */
const FLOW_NEAR = 0.25;

/**
 * Whether the flow forbids one plant of ten, or more, to begin where the estimate does: nothing is
 * firm then, though the hours of those that begin are many. They are no continuation of none, as they
 * are where an outlet decides.
 */
export function mayNotBegin(
  input: HoursInput,
  roller: Roller,
  best: RolloutResult,
  power_W: number,
): boolean {
  const margin = best.first_margins[FLOW] as number;
  if (!(margin < FLOW_NEAR * power_W)) return false;
  const slopes = startSlopes(input, roller, best, FLOW);
  return slopes !== null && margin < SIGMAS_10 * memberAt(input, slopes).sigma;
}

/**
 * What is missing of the power at first, while the lids are swept and the greatest flow does not give
 * it; null where that is surely nothing that counts. The least margin is taken as Gaussian, and a plant
 * in which it is less has less by as much all along.
 */
export function lackAtFirst(
  input: HoursInput,
  roller: Roller,
  best: RolloutResult,
  power_W: number,
): FirstLack | null {
  const margin = leastMargin(best.start);
  if (!(margin < FLOW_NEAR * power_W)) return null;
  const slopes = startSlopes(input, roller, best, LEAST);
  const known = slopes === null ? 0 : memberAt(input, slopes).sigma;
  const sigma = Math.hypot(known, lidSigma(best.start));
  return firstMinutes(best.start, power_W, sigma);
}

/** What each rule has left at its first test, and the least margin while the lids are swept. */
function marginsOf({ first_margins, start }: RolloutResult): number[] {
  return [...first_margins, leastMargin(start)];
}

/**
 * Slopes of what a rule has left at its first test: of the one that lacks most, in its sigmas, or
 * that is named; null where no such margin follows anything that is uncertain.
 */
function startSlopes(
  input: HoursInput,
  roller: Roller,
  best: RolloutResult,
  only?: number,
): Slopes | null {
  const base = roller.start();
  const from = base.end_s === 0 ? base : best;
  const before = marginsOf(base);
  const along = (change: Perturbation, delta: number): number[] =>
    marginsOf(roller.start(change)).map((margin, r) => {
      const slope = (margin - (before[r] as number)) / delta;
      return Number.isFinite(slope) ? slope : 0;
    });
  const bumps = input.models.map((_, s) =>
    Array.from({ length: BUMPS }, (_, bump) => along({ store: s, bump }, BUMP_K)),
  );
  const flow = input.models.map((_, s) => along({ store: s, flow: PROBE_LOG }, PROBE_LOG));
  const work = along({ work: PROBE_LOG }, PROBE_LOG);
  let most = Number.NEGATIVE_INFINITY;
  let found: Slopes | null = null;
  marginsOf(from).forEach((margin, r) => {
    if (!Number.isFinite(margin) || r !== (only ?? Math.min(r, LEAST - 1))) return;
    const slopes: Slopes = {
      cells: input.models.map((model, s) => {
        const weights = Array.from({ length: BUMPS }, (_, b) => bumpWeights(model, b));
        return model.tubes.map((tube) => {
          const g = new Float64Array(tube.layout.cells);
          weights.forEach((w, b) => {
            const total = w.reduce((sum, v) => sum + v, 0);
            const slope = (tube.string.area_share * (bumps[s]?.[b]?.[r] as number)) / total;
            for (let i = 0; i < g.length; i++) g[i] = (g[i] as number) + slope * (w[i] as number);
          });
          return g;
        });
      }),
      flow: flow.map((by) => by[r] as number),
      work: work[r] as number,
    };
    const { sigma } = memberAt(input, slopes);
    if (sigma > 0 && -margin / sigma > most) {
      most = -margin / sigma;
      found = slopes;
    }
  });
  return found;
}

/**
 * Quantiles where the discharge of the estimate lasts well beyond what is answered: a plant may
 * end before. How long a store lasts is taken to go as soc kappa/f; for either store the
 * plants 1.28 sigmas away in that are rolled out, and the sooner one counts.
 */
export function quantilesAtEnd(input: HoursInput, roller: Roller, best: RolloutResult): Quantiles {
  const { most_s } = roller;
  const p50 = Math.min(best.end_s, most_s);
  let p90 = p50;
  let p10 = most_s;
  input.models.forEach((_, s) => {
    const { at } = memberAt(input, lastingSlopes(input, s));
    p90 = Math.min(p90, roller.member(at(-SIGMAS_10)).end_s);
    if (p50 < most_s) p10 = Math.min(p10, roller.member(at(SIGMAS_10)).end_s);
  });
  return inHours(p90, p50, Math.max(p50, p10), most_s);
}

/** Slopes of ln(soc kappa/f) of a store. */
function lastingSlopes(input: HoursInput, store: number): Slopes {
  return {
    cells: input.models.map((model, s) => {
      const state = input.states[s] as StoreState;
      const { charged, discharged } = referenceEnthalpies(model);
      const { soc } = storeEnergy(model, state);
      return model.tubes.map((tube, k) => {
        const g = new Float64Array(tube.layout.cells);
        if (s !== store || !(soc > 0)) return g;
        const by = tube.string.area_share / (g.length * (charged - discharged) * soc);
        const enthalpy = state.tubes[k]?.enthalpy as Float64Array;
        return g.map((_, i) => {
          const h = enthalpy[i] as number;
          return by * (enthalpyAt(model.tables, temperatureAt(model.tables, h) + 1) - h);
        });
      });
    }),
    flow: input.models.map((_, s) => (s === store ? -1 : 0)),
    work: 1,
  };
}

/** Within [0, most_s], in hours. */
function inHours(p90_s: number, p50_s: number, p10_s: number, most_s: number): Quantiles {
  const hours = (t: number): number => Math.min(most_s, Math.max(0, t)) / 3600;
  return { p90: hours(p90_s), p50: hours(p50_s), p10: hours(p10_s) };
}
