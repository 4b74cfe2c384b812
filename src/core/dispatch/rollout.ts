import type { BedWork } from '../bed/kernel.js';
import type { BedTables } from '../bed/tables.js';
import type { StoreDefinition, UnitDefinition } from '../definitions.js';
import type { EndCause } from '../estimate.js';
import type { Machine } from '../machine/machine.js';
import type { WallModel } from '../track/wallZone.js';
import { beginMargin, type StartMargin, startMargin } from './firstMinutes.js';
import { excessLag, isSwept, throughPlenum } from './plenum.js';
import { endOfBed, flowWithin, greatestDrop, stepStore } from './stepStore.js';

/** One tube as the rollout needs it. */
export interface RolloutTube {
  readonly area_share: number;
  readonly enthalpy: Float64Array;
  readonly flowFactor: number;
  readonly heatTransferFactor: number;
  readonly wallLoss_W_m3K: number;
  /** Of the last of the layers at the wall: their model and the steel [K]; see Stream. */
  readonly wall?: { readonly model: WallModel; readonly steel_K: Float64Array };
}

/** One store as the rollout needs it; shares of its tubes, layers at the wall included, add up to 1. */
export interface RolloutStore {
  readonly store: StoreDefinition;
  readonly tables: BedTables;
  readonly tubes: readonly RolloutTube[];
  /** Gas and steel at the end where the gas leaves when discharging [K]; NaN = as the bed's end. */
  readonly plenum_K: number;
}

/** A discharge to be rolled out: unit, machine, the stores as they are now, and the power asked for. */
export interface RolloutInput {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  readonly stores: readonly RolloutStore[];
  /** Net power delivered at the connection point [W]. */
  readonly power_W: number;
  /** Learned factor on the machine's work per metered kilogram, at rated flow. */
  readonly workFactor: number;
  /** The same work at a flow [kg/s] over that at rated flow; absent = 1 at any. */
  readonly partLoad?: (flow_kg_s: number) => number;
  readonly ambient_K: number;
  /** Step once the lids are swept [s]. */
  readonly step_s: number;
  readonly most_s: number;
  /** Only the end and its cause are wanted: the times of other rules, all later, are left open. */
  readonly endOnly?: boolean;
}

/** The rules that may end a discharge, in the order of `RolloutResult.times_s`. */
export const RULES: readonly EndCause[] = [
  'hot_outlet',
  'cold_outlet',
  'flow',
  'pressure_drop',
  'empty',
];

const FLOW = RULES.indexOf('flow');
const DROP = RULES.indexOf('pressure_drop');

/** When a rolled-out discharge ends and by which rule; times from its start [s]. */
export interface RolloutResult {
  /** When each rule is first broken [s], Infinity where it is not within the time rolled. */
  readonly times_s: Float64Array;
  /**
   * Where an outlet was beyond its limit as soon as its rule held: when that was [s], else 0. The
   * plant would stop then, or not start at all.
   */
  readonly trips_s: number;
  /**
   * What each rule had left at its first test, negative where broken; NaN where there is no such rule.
   * Of `flow` [W] as `beginMargin` has it.
   */
  readonly first_margins: Float64Array;
  /** Power that flow and pressure drop let through less that asked, until the lids are swept. */
  readonly start: readonly StartMargin[];
  /** Earliest of them, and which. Infinity with `empty` where none was broken. */
  readonly end_s: number;
  readonly ends_by: EndCause;
}

/** Gas that stood under a lid may take this long to be pushed out [s]. */
export const SWEEP_MOST_S = 600;
/** Meanwhile a step is taken in so many parts: a lid changes within minutes, and the flow with it. */
const SWEEP_PARTS = 5;
/** After the first rule is broken the others are followed for this share of the time longer. */
const FOLLOW = 0.15;

/**
 * Discharges a copy of the beds at constant net power until a stop rule, all tubes of both stores
 * together: each step takes the metered flow m that P needs at the present mixed outlets,
 * m = (P + aux)/(w(T_hot, T_cold) kappa), and gives each tube m f_k/A.
 *
 * The outlets' rules wait until the plenum is swept, 10 minutes at most: gas that stood under a lid must
 * not end a discharge. Flow and pressure drop do not wait. Where the power would need more than they
 * let through, the unit gives what it can (`start`); it has not begun, 0 h, where a rule is still
 * broken then. Each rule's time is interpolated
 * within its step, so the result is smooth in the state. What leaves a bed is known as the mean of a step, so
 * it counts for that step's middle, later by the lag of the plenum (see `excessLag`); the flow of a
 * step is that of its own middle, by a straight line through the last two.
 */
export function rollOut(
  input: RolloutInput,
  works: readonly (readonly BedWork[])[],
): RolloutResult {
  const { machine } = input;
  const { limits } = input.unit;
  const beds = input.stores.map((s) => s.tubes.map((t) => Float64Array.from(t.enthalpy)));
  const steels = input.stores.map((s) =>
    s.tubes.map((t) => (t.wall === undefined ? null : Float64Array.from(t.wall.steel_K))),
  );
  const times = new Float64Array(RULES.length).fill(Number.POSITIVE_INFINITY);
  const before = new Float64Array(RULES.length).fill(Number.NaN);
  const beforeAt = new Float64Array(RULES.length);
  const atFirst = new Float64Array(RULES.length).fill(Number.NaN);
  const plenum = input.stores.map((s, i) =>
    Number.isFinite(s.plenum_K)
      ? s.plenum_K
      : endOfBed(s, beds[i] as Float64Array[], 'charge_inlet'),
  );
  const start: StartMargin[] = [];
  let scarce = FLOW;
  const hotIndex = input.stores.findIndex((s) => s.store.kind === 'hot');
  const coldIndex = input.stores.findIndex((s) => s.store.kind === 'cold');
  let swept = false;
  let first = Number.POSITIVE_INFINITY;
  let trips = 0;
  const sweptMass = input.stores.map(() => 0);
  const lags = input.stores.map(() => 0);
  let flowBefore = Number.NaN;
  let step_s = input.step_s / SWEEP_PARTS;
  for (let t = 0; t <= input.most_s; t += step_s) {
    const outlets = {
      hot_K: plenum[hotIndex] ?? Number.NaN,
      cold_K: coldIndex >= 0 ? (plenum[coldIndex] as number) : null,
    };
    const point = machine.operate('discharge', outlets, input.ambient_K);
    const work = point.specificWork_J_kg * input.workFactor;
    const flow = flowFor(input, work, Number.isFinite(flowBefore) ? flowBefore : 0);
    const drop = limits.pressure_drop_max_Pa === null ? 0 : greatestDrop(input.stores, beds, flow);
    // Each margin is positive while its rule holds.
    const margins = [
      limits.hot_outlet_min_K === null || hotIndex < 0
        ? Number.NaN
        : outlets.hot_K - limits.hot_outlet_min_K,
      limits.cold_outlet_max_K === null || outlets.cold_K === null
        ? Number.NaN
        : limits.cold_outlet_max_K - outlets.cold_K,
      Number.isFinite(flow) ? limits.discharge.flow_max_kg_s - flow : -1,
      limits.pressure_drop_max_Pa === null ? Number.NaN : limits.pressure_drop_max_Pa - drop,
      point.specificWork_J_kg,
    ];
    let most = limits.discharge.flow_max_kg_s;
    if (!swept) {
      most = flowWithin(input.stores, beds, limits.pressure_drop_max_Pa, most);
      scarce = most < limits.discharge.flow_max_kg_s ? DROP : FLOW;
      start.push(startMargin(t, powerAt(input, most, work), input.power_W));
    }
    if (!swept && (t >= SWEEP_MOST_S || isSwept(input.stores, plenum, sweptMass, t))) {
      swept = true;
      atFirst.set(margins);
      const begins_W = beginMargin(start);
      atFirst[FLOW] = begins_W;
      if (!(begins_W > 0)) times[scarce] = first = 0;
    }
    if (swept) step_s = input.step_s;
    const mean = lags.reduce((sum, lag) => sum + lag, 0) / lags.length;
    margins.forEach((margin, r) => {
      if (times[r] !== Number.POSITIVE_INFINITY || Number.isNaN(margin)) return;
      if (!swept) return;
      const at = t - (lags[r === 0 ? hotIndex : r === 1 ? coldIndex : -1] ?? mean);
      if (margin > 0) {
        before[r] = margin;
        beforeAt[r] = at;
        return;
      }
      const last = before[r] as number;
      // Broken at its very first test: there never was a discharge.
      if (Number.isNaN(last) && (r === 0 || r === 1)) trips = t;
      times[r] = Number.isNaN(last)
        ? 0
        : at - ((at - (beforeAt[r] as number)) * margin) / (margin - last);
      first = Math.min(first, times[r] as number);
    });
    const enough = first * (1 + FOLLOW);
    // What holds now counts as broken half a step before it at the earliest (see `excessLag`).
    const until = input.endOnly ? Math.min(enough, first + step_s) : enough;
    if (swept && (!Number.isFinite(flow) || t > until || first === 0)) break;
    // Past its first broken rule the flow may run away; the rest only serves the other rules' times.
    const ahead = flow + (flow - flowBefore) * (0.5 + mean / step_s);
    const middle = ahead > 0 ? ahead : flow;
    const used = Math.min(middle, swept ? 2 * limits.discharge.flow_max_kg_s : most);
    // While the lids are swept the flow says nothing of what follows.
    if (swept) flowBefore = flow;
    input.stores.forEach((store, i) => {
      const inlet =
        store.store.kind === 'hot' ? point.inlets.hot_K : (point.inlets.cold_K as number);
      const out = stepStore(
        store,
        beds[i] as Float64Array[],
        steels[i] ?? [],
        {
          flux: -used / store.store.bed.area_m2,
          inlet_K: inlet,
          ambient_K: input.ambient_K,
          dt_s: step_s,
        },
        works[i] ?? [],
      );
      lags[i] = excessLag(store, plenum[i] as number, out, used, step_s);
      plenum[i] = throughPlenum(store, plenum[i] as number, out, used, step_s);
      sweptMass[i] = (sweptMass[i] as number) + used * step_s;
    });
  }
  let end = Number.POSITIVE_INFINITY;
  let cause: EndCause = 'empty';
  times.forEach((time, r) => {
    if (time < end) {
      end = time;
      cause = RULES[r] as EndCause;
    }
  });
  return {
    times_s: times,
    trips_s: trips,
    first_margins: atFirst,
    start,
    end_s: end,
    ends_by: cause,
  };
}

/** Net power [W] of a flow at a work per kilogram at rated flow. */
function powerAt(input: RolloutInput, flow_kg_s: number, work_J_kg: number): number {
  const work = work_J_kg * (input.partLoad?.(flow_kg_s) ?? 1);
  return flow_kg_s * work - input.machine.auxiliary_running_W;
}

/**
 * Metered flow that gives the power at a work per kilogram at rated flow; Infinity where none does.
 * Part load changes the work by a few per cent, so that each turn of the loop gains two digits.
 */
function flowFor(input: RolloutInput, work_J_kg: number, guess_kg_s: number): number {
  if (!(work_J_kg > 0)) return Number.POSITIVE_INFINITY;
  const plain = (input.power_W + input.machine.auxiliary_running_W) / work_J_kg;
  if (input.partLoad === undefined) return plain;
  let flow = guess_kg_s > 0 ? guess_kg_s : plain;
  for (let i = 0; i < 4; i++) flow = plain / input.partLoad(flow);
  return flow;
}
