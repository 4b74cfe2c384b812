import { type BedWork, createBedWork, stepBed, wallLossPerVolume } from '../bed/kernel.js';
import { type BedTables, enthalpyAt, fluidEnthalpyAt, temperatureAt } from '../bed/tables.js';
import type { StoreDefinition } from '../definitions.js';
import { requireNotNegative, requirePositive } from '../misuse.js';
import { type Fronts, findFronts } from '../track/fronts.js';

export { type SpreadRatio, spreadRatio } from './spreadRatio.js';

/** What never changes of a store's twin. */
export interface TwinModel {
  readonly store: StoreDefinition;
  readonly tables: BedTables;
  readonly x_m: Float64Array;
  /** Front travel per mass flux and time [m3/kg]: (e(Th) - e(Tc))/(H(Th) - H(Tc)). */
  readonly travelPerFlux_m3_kg: number;
  /** Scratch, no part of the state. */
  readonly work: BedWork;
}

/** Plain and bounded. Changed only by `stepTwin`. */
export interface TwinState {
  /** One mean profile: enthalpy of each cell [J/m3 of bed]; null before the start. */
  enthalpy: Float64Array | null;
  /** Way that its front has gone since it came to be, there and back [m]. */
  travelled_m: number;
  /** Width squared and its variance that came with the start; 0 once no such front is left. */
  startWidth_m2: number;
  startWidthVariance_m4: number;
  /** True after a stretch of unknown flow: its history is no longer the bed's. */
  lost: boolean;
  /** Time since the loss with everything known [s]. */
  sound_s: number;
  /** Counted: starts from the estimate after the first, and times its history was lost. */
  restarts: number;
  losses: number;
}

export interface TwinInput {
  /** Real mean mass flux: metered, times the filter's mean flow factor [kg/m2s], + = charge. */
  readonly massFlux_kg_m2s: number;
  readonly inlet_K: number;
  readonly ambient_K: number;
  readonly dt_s: number;
  /** One-sigma travel since the flow was last known [m]; 0 while it is known. */
  readonly unknownTravel_m: number;
  /** Estimated mean profile on the cells of the model [K]. */
  readonly mean_K: Float64Array;
  /** Its fronts as published; read at a start only, for the sigma of their width. */
  readonly fronts: readonly MeasuredFront[];
}

export interface MeasuredFront {
  readonly position_m: number | null;
  readonly width_m: number | null;
  readonly width_sigma_m: number | null;
}

/** A bed is uniform where it spans less than this, or than this share of the references' range. */
const UNIFORM_K = 5;
const UNIFORM_SHARE = 0.02;
/** Unknown travel beyond this share of the bed's length loses the history. */
const LOST_SHARE = 0.05;
/** A lost twin starts anew once flow and readings have been known again for this long [s]. */
const SOUND_S = 3600;

export function twinModel(store: StoreDefinition, tables: BedTables, cells: number): TwinModel {
  const { reference_hot_K: hot, reference_cold_K: cold } = store;
  const dx = store.bed.length_m / requirePositive('cells', cells);
  const gas = fluidEnthalpyAt(tables, hot) - fluidEnthalpyAt(tables, cold);
  return {
    store,
    tables,
    x_m: Float64Array.from({ length: cells }, (_, i) => (i + 0.5) * dx),
    travelPerFlux_m3_kg: gas / (enthalpyAt(tables, hot) - enthalpyAt(tables, cold)),
    work: createBedWork(cells),
  };
}

export function startTwin(): TwinState {
  return {
    enthalpy: null,
    travelled_m: 0,
    startWidth_m2: 0,
    startWidthVariance_m4: 0,
    lost: false,
    sound_s: 0,
    restarts: 0,
    losses: 0,
  };
}

/**
 * Moves the healthy twin over one scan: the bed as configured and tuned (all heat-transfer, flow and
 * loss factors those of the configuration, one mean profile) under the real flow, inlet and ambient.
 * No bed thermocouple corrects it, so it shows the profile that a healthy bed would have.
 *
 * The flow is the metered one times the filter's mean flow factor. A wrong meter shifts a front and
 * hardly widens it (width grows as the root of the way: 7 % of way is 3.5 % of width), but over full
 * cycles it would let the twin keep a front that the bed has swept out, and the two would no longer
 * share a history. The factor is one slow number and says nothing of shape, so no widening of the
 * real front can reach the twin through it; unlike flows of the strings average out in it and do
 * widen the bed's mean front against the twin's, as they should.
 *
 * Start: from the estimate at the first call; its width then is the twin's, with its sigma (half the
 * width where the estimate gives none), for as long as that front is in the bed. Later only where
 * the estimate is uniform (spans less than 5 K or 2 % of the references' range), when a new start
 * can hide nothing, and the twin is lost or further than twice that from it: counted. After unknown
 * flow worth more than 5 % of the length the twin is lost (counted) until such a start, or until flow and
 * readings have been known for an hour: it then starts from the estimate, which hides a spread that
 * was there before, but a bed that never becomes uniform would otherwise be watched no more. A front
 * that leaves the bed leaves the twin as well, which needs no start.
 *
 * @param state changed in place
 * @throws RangeError for a profile of another length, or a dt that is not positive
 */
export function stepTwin(model: TwinModel, state: TwinState, input: TwinInput): void {
  const { tables, store } = model;
  const cells = model.x_m.length;
  if (input.mean_K.length !== cells)
    throw new RangeError(`mean_K has ${input.mean_K.length} cells, the twin ${cells}`);
  requirePositive('dt_s', input.dt_s);
  requireNotNegative('unknownTravel_m', input.unknownTravel_m);
  if (state.enthalpy === null) {
    begin(model, state, input);
    return;
  }
  stepBed(
    tables,
    state.enthalpy,
    {
      massFlux_kg_m2s: input.massFlux_kg_m2s,
      inlet_K: input.inlet_K,
      ambient_K: input.ambient_K,
      dt_s: input.dt_s,
      heatTransferFactor: 1,
      wallLoss_W_m3K: wallLossPerVolume(tables),
    },
    model.work,
  );
  state.travelled_m += Math.abs(input.massFlux_kg_m2s) * input.dt_s * model.travelPerFlux_m3_kg;
  if (input.unknownTravel_m > LOST_SHARE * store.bed.length_m && !state.lost) {
    state.lost = true;
    state.losses++;
  }
  state.sound_s = state.lost && input.unknownTravel_m === 0 ? state.sound_s + input.dt_s : 0;
  if (state.sound_s >= SOUND_S) {
    state.restarts++;
    begin(model, state, input);
    return;
  }
  if (frontGone(model, state.enthalpy)) {
    // The next front comes to be in bed and twin alike: nothing of the start is in it.
    state.travelled_m = 0;
    state.startWidth_m2 = 0;
    state.startWidthVariance_m4 = 0;
  }
  const range = store.reference_hot_K - store.reference_cold_K;
  const tolerance = Math.max(UNIFORM_K, UNIFORM_SHARE * range);
  const [low, high] = extent(input.mean_K);
  if (high - low > tolerance) return;
  const [twinLow, twinHigh] = extent(twinTemperatures(model, state.enthalpy));
  const furthest = Math.max(high - twinLow, twinHigh - low);
  if (state.lost || furthest > 2 * tolerance) {
    state.restarts++;
    begin(model, state, input);
  }
}

/** Temperatures of the twin's cells [K], for pages and tests. */
export function twinTemperatures(model: TwinModel, enthalpy: Float64Array): Float64Array {
  return enthalpy.map((h) => temperatureAt(model.tables, h));
}

/** Fronts of a profile on the twin's cells. */
export function profileFronts(model: TwinModel, temperature_K: Float64Array): Fronts {
  const { reference_hot_K, reference_cold_K } = model.store;
  return findFronts(model.x_m, temperature_K, reference_hot_K, reference_cold_K);
}

function begin(model: TwinModel, state: TwinState, input: TwinInput): void {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  state.enthalpy = Float64Array.from(input.mean_K, (T) => enthalpyAt(model.tables, T));
  state.travelled_m = 0;
  state.startWidth_m2 = 0;
  state.startWidthVariance_m4 = 0;
  state.lost = false;
  state.sound_s = 0;
  const front = profileFronts(model, input.mean_K).fronts[0];
  if (front === undefined) return;
  // Without both crossings in the bed: an erf front has the slope (Th - Tc)/(w sqrt(2 pi)).
  const width =
    front.width_m ?? (hot - cold) / (Math.abs(front.slope_K_m) * Math.sqrt(2 * Math.PI));
  const published = input.fronts.find((f) => f.position_m !== null && f.width_m !== null);
  const sigma = published?.width_sigma_m ?? 0.5 * width;
  state.startWidth_m2 = width * width;
  state.startWidthVariance_m4 = (2 * width * sigma) ** 2;
}

function extent(values: Float64Array): [number, number] {
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (const value of values) {
    if (value < low) low = value;
    if (value > high) high = value;
  }
  return [low, high];
}

/** True where no cell is past one half: the front has left the twin. */
function frontGone(model: TwinModel, enthalpy: Float64Array): boolean {
  const { reference_hot_K, reference_cold_K } = model.store;
  const middle = enthalpyAt(model.tables, 0.5 * (reference_hot_K + reference_cold_K));
  const above = enthalpy[0]! > middle;
  return enthalpy.every((h) => h > middle === above);
}
