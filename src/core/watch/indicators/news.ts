import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { TubeState } from '../../track/tube.js';
import type { IndicatorInput } from '../indicator.js';
import { newInformation } from '../sequential.js';

/** A figure of the filter and its sigma. */
export interface Known {
  readonly value: number;
  readonly sigma: number;
}

/** What the filter knew at the last value taken, and its own walk since. Plain. */
export interface NewsState {
  before: Known | null;
  walkVariance: number;
  /** Time with flow since [s]. */
  flow_s: number;
}

/** Time with flow from one value to the next [s]. */
export const NEWS_EVERY_S = 3600;

export function startNews(): NewsState {
  return { before: null, walkVariance: 0, flow_s: 0 };
}

/** What one scan means for the news of a figure. */
export interface NewsScan {
  /** Variance that the filter itself has added to the figure in this scan. */
  readonly walk: number;
  /**
   * What the filter has left of the figure in this scan, as it comes back to its prior by itself; 1
   * where it does not. Coming back is not news.
   */
  readonly decay?: number;
  readonly dt_s: number;
  /** Whether this scan moved a front through the bed. */
  readonly flowing: boolean;
  /** False where the filter was lost or its flow is a guess: what it learns then is not of the plant. */
  readonly sound: boolean;
}

/** A filter that knows this much less than its own walk explains has been started anew. */
const FORGOTTEN = 1.5;

/**
 * What is new in a figure of the filter: one independent value about once an hour of flow, made of
 * what the filter has learned since the last one (see newInformation). Where it has learned next to
 * nothing, as without a front in the bed, the value waits and its walk adds up. After a scan that is not
 * sound, and where the filter has forgotten, it begins anew.
 *
 * @param state changed in place
 * @param now asked only where it is needed
 */
export function newsOf(state: NewsState, now: () => Known, scan: NewsScan): Known | null {
  const { before } = state;
  if (before === null || !scan.sound) {
    Object.assign(state, startNews(), { before: scan.sound ? now() : null });
    return null;
  }
  const { decay = 1 } = scan;
  const kept = { value: decay * before.value, sigma: decay * before.sigma };
  state.before = kept;
  state.walkVariance = decay * decay * state.walkVariance + scan.walk;
  if (!scan.flowing) return null;
  state.flow_s += scan.dt_s;
  if (state.flow_s < NEWS_EVERY_S) return null;
  const after = now();
  const forgotten = after.sigma ** 2 > FORGOTTEN * (kept.sigma ** 2 + state.walkVariance);
  const news = forgotten ? null : newInformation(kept, after, state.walkVariance);
  if (forgotten || news !== null) Object.assign(state, startNews(), { before: after });
  return news;
}

/** What a scan was for the tubes of a store. */
export function scanOf(input: IndicatorInput, s: number): { flowing: boolean; sound: boolean } {
  const { conditions, stores } = input.taken;
  const { id } = (input.model.stores[s] as StoreModel).store;
  const moving = conditions.flow_kg_s !== 0;
  const step = stores[s]?.step;
  return {
    flowing: moving && (input.estimate.stores[id]?.fronts.length ?? 0) > 0,
    sound:
      (step === 'updated' || step === 'predicted') &&
      conditions.flowKnown &&
      !conditions.flowStandIn,
  };
}

/** Further state of a tube by its index in the layout, and an element of its covariance. */
export function tubeFigures(model: StoreModel, state: StoreState, k: number) {
  const { layout } = model.tubes[k] as StoreModel['tubes'][number];
  const { further, covariance } = state.tubes[k] as TubeState;
  return {
    layout,
    at: (index: number): number => further[index - layout.cells] as number,
    covariance: (a: number, b: number): number => covariance[a * layout.size + b] as number,
  };
}
