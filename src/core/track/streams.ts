import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeState } from './tube.js';
import type { WallModel } from './wallZone.js';

/** A part of the bed with a profile of its own: a string's tube, or a layer at the wall. */
export interface Stream {
  /** Share of the bed's cross-section; those of a store add up to 1. */
  readonly share: number;
  readonly enthalpy: Float64Array;
  readonly outlet_K: number;
  readonly flowFactor: number;
  /** On top of the configured heat-transfer factor. */
  readonly heatTransferFactor: number;
  readonly wallLoss_W_m3K: number;
  /**
   * Of the last stream where the bed has layers at the wall: their model and the steel. The layers
   * are the last streams, from the tube outwards; `model.tube` is the index of the tube beside them.
   */
  readonly wall?: { readonly model: WallModel; readonly steel_K: Float64Array };
}

/** All streams of a store: what sums over the cross-section run over. */
export function streamsOf(model: StoreModel, state: StoreState): Stream[] {
  const { wall } = model;
  const streams = model.tubes.map((tube, k): Stream => {
    const own = state.tubes[k] as TubeState;
    const { cells, flow, transfer } = tube.layout;
    return {
      share: wall?.ring.includes(k)
        ? tube.string.area_share * (1 - wall.share / wall.ringShare)
        : tube.string.area_share,
      enthalpy: own.enthalpy,
      outlet_K: own.outlet_K,
      flowFactor: Math.exp(own.further[flow - cells] as number),
      heatTransferFactor: Math.exp(own.further[transfer - cells] as number),
      wallLoss_W_m3K: tube.wallLoss_W_m3K,
    };
  });
  if (wall === null || state.wall === null) return streams;
  const beside = streams[wall.tube] as Stream;
  const { enthalpy, outlet_K, steel_K } = state.wall;
  const last = wall.layers.length - 1;
  wall.layers.forEach((layer, i) => {
    streams.push({
      share: layer.share,
      enthalpy: enthalpy[i] as Float64Array,
      outlet_K: outlet_K[i] as number,
      flowFactor: beside.flowFactor * layer.flowFactor,
      heatTransferFactor: beside.heatTransferFactor,
      // Lost through the steel: see exchangeAtWall.
      wallLoss_W_m3K: 0,
      ...(i === last ? { wall: { model: wall, steel_K } } : {}),
    });
  });
  return streams;
}
