import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { TubeState } from '../../track/tube.js';
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

/**
 * What is new in a figure of the filter: one independent value about once an hour of flow, made of
 * what the filter has learned since the last one (see newInformation). Where it has learned next to
 * nothing, as without a front in the bed, the value waits and its walk adds up.
 *
 * @param state changed in place
 * @param walk variance that the filter itself has added to the figure in this scan
 * @param flowing whether this scan moved a front through the bed
 */
export function newsOf(
  state: NewsState,
  now: Known,
  walk: number,
  dt_s: number,
  flowing: boolean,
): Known | null {
  if (state.before === null) {
    state.before = { ...now };
    return null;
  }
  state.walkVariance += walk;
  if (!flowing) return null;
  state.flow_s += dt_s;
  if (state.flow_s < NEWS_EVERY_S) return null;
  const news = newInformation(state.before, now, state.walkVariance);
  if (news === null) return null;
  Object.assign(state, { before: { ...now }, walkVariance: 0, flow_s: 0 });
  return news;
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
