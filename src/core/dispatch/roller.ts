import { type BedWork, createBedWork } from '../bed/kernel.js';
import { enthalpyAt, temperatureAt } from '../bed/tables.js';
import { plausibleRange } from '../track/storeStart.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import { type Stream, streamsOf } from '../track/streams.js';
import type { TubeModel } from '../track/tube.js';
import type { HoursInput } from './hours.js';
import { machineSpread, partLoadFactor } from './machineSpread.js';
import { refined } from './refine.js';
import {
  type RolloutInput,
  type RolloutResult,
  type RolloutStore,
  rollOut,
  SWEEP_MOST_S,
} from './rollout.js';

const STEP_S = 300;
/** On half cells: a little shorter, so that the bed takes most steps in two pieces, not in three. */
const FINE_STEP_S = 240;
const MOST_RATED = 4;
/** Rollouts go on for so much longer, for the slopes of one that ends by `known_to_s`. */
const BEYOND = 1.15;
const KNOWN_TO = 1.1;
/** Smooth bumps per store along which the sensitivity to the profile is taken. */
export const BUMPS = 6;
export const BUMP_K = 2;

/** What differs from the estimate: of one store, or the machine's work in ln. */
export interface Perturbation {
  readonly store?: number;
  readonly bump?: number;
  /** The whole profile moved on by a cell, away from the end where a discharge leaves. */
  readonly moved?: boolean;
  readonly flow?: number;
  readonly transfer?: number;
  readonly work?: number;
}

/** A plant that differs from the estimate in all that is uncertain at once. */
export interface Member {
  /** By store and tube, along the cells [K]. */
  readonly shifts_K: readonly (readonly Float64Array[])[];
  /** By store, on ln(flow factor). */
  readonly flow: readonly number[];
  /** On ln(work factor). */
  readonly work: number;
}

/** Rollouts of one state at one power, as it is or with one thing perturbed; see `createRoller`. */
export interface Roller {
  /** Longest time that is answered [s], and up to which an end is found with its slopes. */
  readonly most_s: number;
  readonly known_to_s: number;
  /**
   * For gradients: on the estimate's own cells and without layers at the wall, whose part the tube
   * beside them takes; two rollouts differ in nothing but what is perturbed.
   */
  roll(change?: Perturbation): RolloutResult;
  /** The same up to the first test of the rules, for its margins. */
  start(change?: Perturbation): RolloutResult;
  /** The same on half cells, where the transfer shows: a coarse cell is as wide as a steep front. */
  rollFine(change?: Perturbation): RolloutResult;
  /** The best there is, with the layers at the wall on half cells: see `refined`. */
  best(): RolloutResult;
  /** The same, no further than to its end. */
  end(): RolloutResult;
  /** The same for another plant than the estimate. */
  member(member: Member): RolloutResult;
}

/** Rollouts of one unit's present state at one net power [W]. */
export function createRoller(input: HoursInput, power_W: number): Roller {
  const worksOf = (parts: number): BedWork[][] =>
    input.models.map((model) =>
      // The layers at the wall besides.
      Array.from({ length: model.tubes.length + (model.wall?.layers.length ?? 0) }, () =>
        createBedWork(parts * (model.tubes[0] as TubeModel).layout.cells),
      ),
    );
  const works = worksOf(1);
  const most_s =
    MOST_RATED * input.unit.rated_hours * 3600 * Math.max(1, input.unit.rated_power_W / power_W);
  const storesOf = (streams: (model: StoreModel, state: StoreState) => Stream[]) =>
    input.models.map((model, s) =>
      rolloutStore(
        model,
        streams(model, input.states[s] as StoreState),
        input.plenum_K[s] as number,
        input.calibration?.mean[s] ?? null,
      ),
    );
  const bare = storesOf(tubesAlone);
  const whole = storesOf(streamsOf);
  const spread = machineSpread(input.unit);
  const log = input.calibration?.mean[input.models.length] ?? 0;
  const common: Omit<RolloutInput, 'stores' | 'workFactor' | 'step_s'> = {
    unit: input.unit,
    machine: input.machine,
    partLoad: (flow_kg_s) => partLoadFactor(spread, 'discharge', flow_kg_s),
    power_W,
    ambient_K: input.ambient_K,
    most_s: BEYOND * most_s,
  };
  const changed = (stores: readonly RolloutStore[], change: Perturbation): RolloutStore[] =>
    stores.map((store, s) =>
      s === change.store ? perturb(input.models[s] as StoreModel, store, change) : store,
    );
  const go = (
    of: readonly RolloutStore[],
    step_s: number,
    on: readonly (readonly BedWork[])[],
    change: Perturbation,
    until_s = common.most_s,
    endOnly = false,
  ): RolloutResult => {
    const workFactor = Math.exp(log + (change.work ?? 0));
    return rollOut({ ...common, step_s, stores: of, workFactor, most_s: until_s, endOnly }, on);
  };
  const fineWorks = worksOf(2);
  return {
    most_s,
    known_to_s: KNOWN_TO * most_s,
    roll: (change = {}) => go(changed(bare, change), STEP_S, works, change),
    start: (change = {}) => go(changed(bare, change), STEP_S, works, change, SWEEP_MOST_S),
    rollFine: (change = {}) =>
      go(changed(bare, change).map(refined), FINE_STEP_S, fineWorks, change),
    best: () => go(whole.map(refined), FINE_STEP_S, fineWorks, {}),
    end: () => go(whole.map(refined), FINE_STEP_S, fineWorks, {}, common.most_s, true),
    member: (member) => {
      const stores = whole.map((store, s) =>
        shifted(
          input.models[s] as StoreModel,
          store,
          member.shifts_K[s] as Float64Array[],
          member.flow[s] as number,
        ),
      );
      return go(stores.map(refined), FINE_STEP_S, fineWorks, { work: member.work });
    },
  };
}

/**
 * Another plant's store: the layers at the wall, after the tubes, move with the tube beside them. No rock
 * gets beyond what the plant can produce: where the front may be anywhere that bounds it, not its sigma.
 */
function shifted(
  model: StoreModel,
  store: RolloutStore,
  shifts_K: readonly Float64Array[],
  flow: number,
): RolloutStore {
  const [low, high] = plausibleRange(model);
  const within = (before: number, after: number): number =>
    Math.min(Math.max(before, high), Math.max(Math.min(before, low), after));
  return {
    ...store,
    tubes: store.tubes.map((tube, k) => {
      const by = shifts_K[k < model.tubes.length ? k : (model.wall?.tube ?? 0)] as Float64Array;
      return {
        ...tube,
        flowFactor: tube.flowFactor * Math.exp(flow),
        enthalpy: tube.enthalpy.map((h, i) => {
          const before = temperatureAt(model.tables, h);
          return enthalpyAt(model.tables, within(before, before + (by[i] as number)));
        }),
      };
    }),
  };
}

/** Streams of the tubes alone: the one beside the layers at the wall takes their share. */
export function tubesAlone(model: StoreModel, state: StoreState): Stream[] {
  return streamsOf(model, state)
    .slice(0, model.tubes.length)
    .map((stream, k) =>
      model.wall?.tube === k ? { ...stream, share: stream.share + model.wall.share } : stream,
    );
}

/**
 * A store as a rollout needs it.
 *
 * @param logFlow ln of the store's mean flow factor where more is known than the streams tell
 */
export function rolloutStore(
  model: StoreModel,
  streams: readonly Stream[],
  plenum_K: number,
  logFlow: number | null,
): RolloutStore {
  const mean = streams.reduce((sum, s) => sum + s.share * s.flowFactor, 0);
  const own = logFlow === null ? 1 : Math.exp(logFlow) / mean;
  return {
    store: model.store,
    tables: model.tables,
    plenum_K,
    tubes: streams.map(({ share, ...stream }) => ({
      ...stream,
      flowFactor: stream.flowFactor * own,
      area_share: share,
    })),
  };
}

/** The store with one thing perturbed; `store` and `work` of the change are the caller's. */
export function perturb(
  model: StoreModel,
  store: RolloutStore,
  change: Perturbation,
): RolloutStore {
  const weights = change.bump === undefined ? null : bumpWeights(model, change.bump);
  return {
    ...store,
    tubes: store.tubes.map((tube) => ({
      ...tube,
      flowFactor: tube.flowFactor * Math.exp(change.flow ?? 0),
      heatTransferFactor: tube.heatTransferFactor * Math.exp(change.transfer ?? 0),
      enthalpy: change.moved
        ? tube.enthalpy.map((_, i) => tube.enthalpy[Math.max(0, i - 1)] as number)
        : weights === null
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
export function bumpWeights(model: StoreModel, bump: number): Float64Array {
  const pitch = model.store.bed.length_m / (BUMPS - 1);
  return model.x_m.map((at) => Math.max(0, 1 - Math.abs(at - bump * pitch) / pitch));
}
