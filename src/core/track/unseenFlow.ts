import { energyPosition } from './energyPosition.js';
import { displacedSigma } from './judgeDisplaced.js';
import { referenceEnthalpies } from './storeEnergy.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { streamsOf } from './streams.js';
import type { TubeDrive, TubeState } from './tube.js';
import { ONE_RING, RADIAL_MIXING } from './wallZone.js';

/**
 * A string samples one ring of the part of the bed for which it stands; gas flows a little
 * differently in the rings that it does not see. Their lead or lag over the string grows with the
 * way x that the front goes and turns with the flow. As rock exchanges heat sideways it evens out:
 * over the width W for which a string stands, what leads in one half and lags in the other does so
 * as a wave of that length,
 *
 *   sigma_k = UNSEEN_FLOW |x_E - x_0| / L,     sigma_store^2 = sum_k w_k^2 sigma_k^2
 *   dx_0/dt = (x_E - x_0)/tau,     tau = (W/2 pi)^2 C/(k + 0.1 G cf d),     W = R/(rings of strings)
 *
 * in state of charge; x_0 is where the fronts would be even, k the stagnant conductivity. No reading
 * can show it. About half a per cent between a ring and its neighbourhood in a bed of hundreds of
 * pieces across: common practice, no source.
 *
 * In the finer plant, whose rings are drawn, the rock at the strings is off the store by their flow
 * times x_E - x_0 (tools/rings.ts, a day, nine seeds): correlation 0.96 (hot) and 0.98 (cold) with three
 * strings, tau 12 and 37 h, but 0.64 and 0.90 without the exchange; 0.95 and 0.99 with one string, tau
 * above 100 h.
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

/** Lets the fronts even out sideways over a step, x_0 above (changed in place). */
export function evenOut(
  model: StoreModel,
  state: StoreState,
  drive: Pick<TubeDrive, 'massFlux_kg_m2s' | 'dt_s'>,
): void {
  const x = storeEnergyPosition(model, state);
  const left = Math.exp(-drive.dt_s / eveningTime(model, drive.massFlux_kg_m2s));
  state.origin_m = x + (state.origin_m - x) * left;
}

/** Time in which fronts even out sideways over what a string stands for, tau above [s]. */
export function eveningTime(model: StoreModel, massFlux_kg_m2s: number): number {
  const { store, tables } = model;
  const { bed, strings } = store;
  const radius = bed.diameter_m / 2;
  const radii = strings.map((s) => s.radius_m).sort((a, b) => a - b);
  const rings = radii.filter((r, i) => i === 0 || r - (radii[i - 1] as number) > ONE_RING * radius);
  const middle = tables.segments >> 1;
  const mixing =
    RADIAL_MIXING *
    Math.abs(massFlux_kg_m2s) *
    (tables.fluidHeatCapacity[middle] as number) *
    bed.particle_diameter_m;
  const conductivity = (tables.stagnant[middle] as number) + mixing;
  const width = radius / rings.length;
  return ((width / (2 * Math.PI)) ** 2 * (tables.heatCapacity[middle] as number)) / conductivity;
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
