import { energyPosition } from './energyPosition.js';
import { displacedSigma } from './judgeDisplaced.js';
import { referenceEnthalpies } from './storeEnergy.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { streamsOf } from './streams.js';
import type { TubeState } from './tube.js';

/**
 * A string samples one ring of the part of the bed for which it stands; gas flows a little
 * differently in the rings that it does not see. Their lead or lag over the string grows with the
 * way that the front has gone since it was even, and turns with the flow:
 *
 *   sigma_k = UNSEEN_FLOW |x_E - x_0| / L,     sigma_store^2 = sum_k w_k^2 sigma_k^2
 *
 * in state of charge. No reading can show it. About half a per cent between a ring and its
 * neighbourhood in a bed of hundreds of pieces across: common practice, no source.
 */
const UNSEEN_FLOW = 0.006;
/** A front this close to an end of the bed is swept out: what follows starts even. */
const SWEPT = 0.08;

/** Follows where the fronts were last even; called once per scan. */
export function followOrigin(model: StoreModel, state: StoreState, restarted: boolean): void {
  const x = storeEnergyPosition(model, state);
  const share = x / model.store.bed.length_m;
  if (share < SWEPT || share > 1 - SWEPT) state.origin_m = x;
  // Drawn anew in mid-bed it is not known since when the fronts have run apart: from the inlet on.
  else if (restarted) state.origin_m = 0;
}

/**
 * Contact, conductivity and steel at the wall are known to about a fifth: so are the differences of
 * the rock there from the rock at the outermost string.
 */
const WALL_SIGMA = 0.2;
/**
 * At a start the rock at the wall is taken to be as the rock at the string, though it may lag by what
 * the steel has taken from it, for half a cycle: of the steel's share of the store's heat about a
 * seventh, as the rock at the strings of the finer plant differs from its mean over a day (rms).
 */
const UNKNOWN_WALL = 0.15;
const WALL_MEMORY_S = 6 * 3600;

/** One sigma of the state of charge from rock that no string sees: its flow, and the wall [-]. */
export function unseenSigma(model: StoreModel, state: StoreState): number {
  const length = model.store.bed.length_m;
  const way = Math.abs(storeEnergyPosition(model, state) - state.origin_m) / length;
  const squares = model.tubes.reduce((sum, tube) => sum + tube.string.area_share ** 2, 0);
  return Math.hypot(
    UNSEEN_FLOW * way * Math.sqrt(squares),
    wallSigma(model, state, way),
    displacedSigma(model, state),
    state.astray ?? 0,
  );
}

function wallSigma(model: StoreModel, state: StoreState, way: number): number {
  const { wall } = model;
  if (wall === null || state.wall === null) return 0;
  const { charged, discharged } = referenceEnthalpies(model);
  const beside = (state.tubes[wall.tube] as TubeState).enthalpy;
  let apart = 0;
  wall.layers.forEach(({ share }, l) => {
    const own = state.wall?.enthalpy[l] as Float64Array;
    let sum = 0;
    for (let i = 0; i < own.length; i++) {
      sum += Math.abs((own[i] as number) - (beside[i] as number));
    }
    apart += (share * sum) / own.length;
  });
  const last = wall.layers[wall.layers.length - 1]?.share ?? 0;
  const { heatCapacity, segments } = model.tables;
  const steel = (wall.steel_J_m3K * last) / (heatCapacity[segments >> 1] as number);
  return Math.hypot(
    (WALL_SIGMA * apart) / Math.abs(charged - discharged),
    last * wall.flowSigma * way,
    UNKNOWN_WALL * steel * Math.exp(-state.known_s / WALL_MEMORY_S),
  );
}

/** Energy-equivalent position of the store: the area-weighted mean of its streams' [m]. */
export function storeEnergyPosition(model: StoreModel, state: StoreState): number {
  const { charged, discharged } = referenceEnthalpies(model);
  return streamsOf(model, state).reduce((sum, { share, enthalpy }) => {
    const dx = model.store.bed.length_m / enthalpy.length;
    return sum + share * energyPosition(enthalpy, dx, charged, discharged);
  }, 0);
}
