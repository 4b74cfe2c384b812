import type { Mode } from '../definitions.js';
import { storeEnergy } from '../track/storeEnergy.js';
import { storeFronts, tubeFronts } from '../track/storeEstimate.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import type { TubeModel, TubeState } from '../track/tube.js';
import { type Sigmas, startTally, type Tally, tally } from './spread.js';
import type { WeighedTube } from './weighedTube.js';

/** A store in which some tubes have other thermocouples than the store as it is. */
export interface StoreVariant {
  /** By index of the tube. */
  readonly tubes: ReadonlyMap<number, WeighedTube>;
  readonly store: Tally;
  /** Of the first of its tubes, as if it were a store of its own. */
  readonly string: Tally;
}

/** A variant with nothing counted yet; `tubes` by index in the store, none = the store as it is. */
export function variantOf(tubes: ReadonlyMap<number, WeighedTube>): StoreVariant {
  return { tubes, store: startTally(), string: startTally() };
}

/** Sigmas of a store with a variant's tubes in place of its own: as they would be published. */
export function storeSigmas(
  model: StoreModel,
  state: StoreState,
  tubes: ReadonlyMap<number, WeighedTube>,
): Sigmas {
  const changed: StoreModel = {
    ...model,
    tubes: model.tubes.map((tube, k) => tubes.get(k)?.model ?? tube),
  };
  const now: StoreState = {
    ...state,
    tubes: state.tubes.map((tube, k) => tubes.get(k)?.state ?? tube),
  };
  const energy = storeEnergy(changed, now);
  return { soc: energy.soc_sigma, fronts: storeFronts(changed, now, energy).fronts };
}

/** Sigmas of one tube alone, without what flow beside its string adds (see unseenFlow). */
export function tubeSigmas(
  model: StoreModel,
  state: StoreState,
  tube: TubeModel,
  own: TubeState,
): Sigmas {
  const alone: TubeModel = { ...tube, string: { ...tube.string, area_share: 1 } };
  const { soc_sigma, unseen } = storeEnergy(
    { ...model, tubes: [alone], wall: null },
    { ...state, tubes: [own], wall: null },
  );
  return {
    soc: Math.sqrt(Math.max(0, soc_sigma * soc_sigma - unseen * unseen)),
    fronts: tubeFronts(model, tube, own),
  };
}

/** Counts a step of a variant. */
export function tallyVariant(
  variant: StoreVariant,
  model: StoreModel,
  state: StoreState,
  step: { readonly dt_s: number; readonly mode: Mode; readonly compared: number },
): void {
  const { dt_s, mode, compared } = step;
  tally(variant.store, storeSigmas(model, state, variant.tubes), dt_s, mode, compared);
  for (const [, { model: tube, state: own }] of variant.tubes) {
    tally(variant.string, tubeSigmas(model, state, tube, own), dt_s, mode, 0);
    break;
  }
}
