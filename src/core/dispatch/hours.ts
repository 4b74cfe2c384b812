import { type BedWork, createBedWork } from '../bed/kernel.js';
import { enthalpyAt, temperatureAt } from '../bed/tables.js';
import type { UnitDefinition } from '../definitions.js';
import type { DispatchAnswer, EndCause, Quantiles } from '../estimate.js';
import type { Machine } from '../machine/machine.js';
import { storeEnergy } from '../track/storeEnergy.js';
import { cellCentres } from '../track/storeEstimate.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import { streamsOf } from '../track/streams.js';
import type { TubeModel, TubeState } from '../track/tube.js';
import { unseenSigma } from '../track/unseenFlow.js';
import { earliestQuantiles } from './earliestQuantiles.js';
import { type RolloutInput, type RolloutStore, RULES, rollOut } from './rollout.js';

/** What hours are computed from. */
export interface HoursInput {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  readonly models: readonly StoreModel[];
  readonly states: readonly StoreState[];
  /** Gas temperature at each store's discharge outlet, NaN = as the bed's end [K]. */
  readonly plenum_K: readonly number[];
  readonly workFactor: { readonly factor: number; readonly sigma: number };
  readonly ambient_K: number;
}

const STEP_S = 300;
const MOST_RATED = 4;
/** Smooth bumps per store along which the sensitivity to the profile is taken. */
const BUMPS = 8;
const BUMP_K = 2;
const PROBE_LOG = 0.01;
/** What the rollout itself does not know (part load, losses ahead), relative. */
const MODEL_SIGMA = 0.005;
const J_PER_MWH = 3.6e9;

/**
 * Hours that a unit can deliver a net power from now, with what ends it.
 *
 * The beds are rolled forward to the time tau_r at which each stop rule breaks. The gradient of
 * every tau_r with respect to the profiles (along overlapping bumps), the flow and transfer factors
 * and the machine factor comes from rollouts with common numbers; with the filter's covariance P it
 * gives the covariance of the tau_r, g'P g. The hours are the minimum over the rules: its quantiles
 * are taken over fixed quasi-random points of that joint Gaussian, so they carry no sampling noise
 * from call to call. p90 is exceeded with 90 % probability.
 */
export function computeHours(input: HoursInput, power_W: number): DispatchAnswer {
  if (!(power_W > 0)) throw new RangeError(`power_W = ${power_W}: expected above 0`);
  const roller = createRoller(input, power_W);
  const base = roller.roll();
  if (!(base.end_s > 0) || !Number.isFinite(base.end_s)) {
    const hours = Number.isFinite(base.end_s) ? 0 : roller.most_s / 3600;
    return answer(power_W, { p90: hours, p50: hours, p10: hours }, base.ends_by);
  }
  // Rules that were not reached while rolling cannot bind; they are left out of the minimum.
  const live = RULES.map((_, r) => r).filter((r) => Number.isFinite(base.times_s[r] as number));
  const covariance = live.map(() => new Float64Array(live.length));
  const add = (gradient: readonly number[], variance: number): void => {
    for (let a = 0; a < live.length; a++) {
      for (let b = 0; b < live.length; b++) {
        (covariance[a] as Float64Array)[b]! +=
          (gradient[a] as number) * (gradient[b] as number) * variance;
      }
    }
  };
  const slope = (times: Float64Array, delta: number): number[] =>
    live.map((r) => {
      const t = times[r] as number;
      return Number.isFinite(t) ? (t - (base.times_s[r] as number)) / delta : 0;
    });
  input.models.forEach((model, s) => {
    const bumps = Array.from({ length: BUMPS }, (_, b) =>
      slope(roller.roll({ store: s, bump: b }).times_s, BUMP_K),
    );
    const flow = slope(roller.roll({ store: s, flow: PROBE_LOG }).times_s, PROBE_LOG);
    const transfer = slope(roller.roll({ store: s, transfer: PROBE_LOG }).times_s, PROBE_LOG);
    addUnseen(input, s, live, power_W, covariance);
    addStore(
      model,
      input.states[s] as StoreState,
      live.length,
      { bumps, flow, transfer },
      covariance,
    );
  });
  const machine = slope(roller.roll({ work: PROBE_LOG }).times_s, PROBE_LOG);
  add(machine, input.workFactor.sigma ** 2);
  add(
    live.map((r) => base.times_s[r] as number),
    MODEL_SIGMA ** 2,
  );
  const mean = live.map((r) => base.times_s[r] as number);
  return answer(power_W, earliestQuantiles(mean, covariance), base.ends_by);
}

/**
 * What flow that no string sees may do to a store's own rule: its sigma in state of charge, times
 * the time that a full store lasts at this power.
 */
function addUnseen(
  input: HoursInput,
  s: number,
  live: readonly number[],
  power_W: number,
  covariance: readonly Float64Array[],
): void {
  const model = input.models[s] as StoreModel;
  const own = model.store.kind === 'hot' ? 'hot_outlet' : 'cold_outlet';
  const lasts_s = (input.unit.rated_hours * 3600 * input.unit.rated_power_W) / power_W;
  const variance = (unseenSigma(model, input.states[s] as StoreState) * lasts_s) ** 2;
  const touched = live.map((r) => RULES[r] === own || RULES[r] === 'flow');
  for (let a = 0; a < live.length; a++) {
    for (let b = 0; b < live.length; b++) {
      if (touched[a] && touched[b]) (covariance[a] as Float64Array)[b]! += variance;
    }
  }
}

/** Only the central figure [s of discharge], for a state of charge between full answers. */
export function centralHours(
  input: HoursInput,
  power_W: number,
): { hours: number; ends_by: EndCause } {
  const roller = createRoller(input, power_W);
  const result = roller.roll();
  return {
    hours: Math.min(result.end_s, roller.most_s) / 3600,
    ends_by: result.ends_by,
  };
}

interface Perturbation {
  readonly store?: number;
  readonly bump?: number;
  readonly flow?: number;
  readonly transfer?: number;
  readonly work?: number;
}

function createRoller(
  input: HoursInput,
  power_W: number,
): { roll(change?: Perturbation): ReturnType<typeof rollOut>; most_s: number } {
  const works: BedWork[][] = input.models.map((model) =>
    // One more for the zone at the wall.
    [...model.tubes, ...model.tubes.slice(0, 1)].map((tube) => createBedWork(tube.layout.cells)),
  );
  const most_s =
    MOST_RATED * input.unit.rated_hours * 3600 * Math.max(1, input.unit.rated_power_W / power_W);
  const stores = input.models.map((model, s) =>
    rolloutStore(model, input.states[s] as StoreState, input.plenum_K[s] as number),
  );
  const common: Omit<RolloutInput, 'stores' | 'workFactor'> = {
    unit: input.unit,
    machine: input.machine,
    power_W,
    ambient_K: input.ambient_K,
    step_s: STEP_S,
    most_s,
  };
  return {
    most_s,
    roll(change = {}) {
      const changed = stores.map((store, s) =>
        s === change.store ? perturb(input.models[s] as StoreModel, store, change) : store,
      );
      const workFactor = input.workFactor.factor * Math.exp(change.work ?? 0);
      return rollOut({ ...common, stores: changed, workFactor }, works);
    },
  };
}

function rolloutStore(model: StoreModel, state: StoreState, plenum_K: number): RolloutStore {
  return {
    store: model.store,
    tables: model.tables,
    plenum_K,
    tubes: streamsOf(model, state).map(({ share, ...stream }) => ({
      ...stream,
      area_share: share,
    })),
  };
}

function perturb(model: StoreModel, store: RolloutStore, change: Perturbation): RolloutStore {
  const weights = change.bump === undefined ? null : bumpWeights(model, change.bump);
  return {
    ...store,
    tubes: store.tubes.map((tube) => ({
      ...tube,
      flowFactor: tube.flowFactor * Math.exp(change.flow ?? 0),
      heatTransferFactor: tube.heatTransferFactor * Math.exp(change.transfer ?? 0),
      enthalpy:
        weights === null
          ? tube.enthalpy
          : tube.enthalpy.map((h, i) =>
              enthalpyAt(
                model.tables,
                temperatureAt(model.tables, h) + BUMP_K * (weights[i] as number),
              ),
            ),
    })),
  };
}

/** Overlapping triangular bumps that add up to one along the bed. */
function bumpWeights(model: StoreModel, bump: number): Float64Array {
  const x = cellCentres(model);
  const pitch = model.store.bed.length_m / (BUMPS - 1);
  return x.map((at) => Math.max(0, 1 - Math.abs(at - bump * pitch) / pitch));
}

/**
 * Adds g'P g of one store. The bumps move all tubes at once; tube k's own share of the response is
 * its share of the area. What tubes share in their errors is counted through the correlation of
 * the store's energy (see storeEnergy).
 */
function addStore(
  model: StoreModel,
  state: StoreState,
  rules: number,
  response: { bumps: number[][]; flow: number[]; transfer: number[] },
  covariance: readonly Float64Array[],
): void {
  const cells = (model.tubes[0] as TubeModel).layout.cells;
  const weights = response.bumps.map((_, b) => bumpWeights(model, b));
  const totals = weights.map((w) => w.reduce((a, v) => a + v, 0));
  const inflate = sharedFactor(model, state);
  for (const [k, tube] of model.tubes.entries()) {
    const tubeState = state.tubes[k] as TubeState;
    const { size } = tube.layout;
    const p = tubeState.covariance;
    const share = tube.string.area_share;
    const gradients = Array.from({ length: rules }, (_, r) => {
      const g = new Float64Array(size);
      for (let i = 0; i < cells; i++) {
        let sum = 0;
        weights.forEach((w, b) => {
          sum += ((w[i] as number) * (response.bumps[b]?.[r] as number)) / (totals[b] as number);
        });
        g[i] = share * sum;
      }
      g[tube.layout.flow] = share * (response.flow[r] as number);
      g[tube.layout.transfer] = share * (response.transfer[r] as number);
      return g;
    });
    const projected = gradients.map((g) => multiply(p, g, size));
    for (let a = 0; a < rules; a++) {
      for (let b = 0; b < rules; b++) {
        let sum = 0;
        for (let i = 0; i < size; i++) {
          sum += (gradients[a]?.[i] as number) * (projected[b]?.[i] as number);
        }
        (covariance[a] as Float64Array)[b]! += sum * inflate;
      }
    }
  }
}

/** Variance of the store's energy over that with independent tubes, >= 1. */
function sharedFactor(model: StoreModel, state: StoreState): number {
  if (model.tubes.length === 1) return 1;
  return storeEnergy(model, state).shared_over_independent;
}

function multiply(p: Float64Array, g: Float64Array, size: number): Float64Array {
  const out = new Float64Array(size);
  for (let i = 0; i < size; i++) {
    const a = g[i] as number;
    if (a === 0) continue;
    for (let j = 0; j < size; j++) out[j] = (out[j] as number) + a * (p[i * size + j] as number);
  }
  return out;
}

function answer(power_W: number, hours: Quantiles, ends_by: EndCause): DispatchAnswer {
  const power_MW = power_W / 1e6;
  return {
    power_MW,
    hours,
    energy_MWh_el: {
      p90: (hours.p90 * 3600 * power_W) / J_PER_MWH,
      p50: (hours.p50 * 3600 * power_W) / J_PER_MWH,
      p10: (hours.p10 * 3600 * power_W) / J_PER_MWH,
    },
    ends_by,
  };
}
