import { type BedStep, bedSubstep, planSubsteps } from '../bed/kernel.js';
import { type BedTables, enthalpyNear, temperatureAt } from '../bed/tables.js';
import type { BedDefinition } from '../definitions.js';
import {
  type TubeDrive,
  type TubeModel,
  type TubeScratch,
  type TubeState,
  tubeStep,
} from './tube.js';
import { exchangeAtWall } from './wallExchange.js';

/**
 * The rock at the wall that no thermocouple sees: it gives heat to the vessel's steel and through it
 * to ambient, so its front lags behind that of the outermost string, while the looser packing there
 * lets it run ahead. Its thickness is the depth that heat penetrates within half a cycle,
 * 2 sqrt(alpha t), in layers that grow inwards from the wall up to the outermost string. That string
 * may itself stand where the wall is felt: what lies inwards of it is one more layer, whose heat goes
 * to the rock at the string.
 *
 *   steel:  C_w dTw/dt = h_w (T_1 - Tw) - U (Tw - Tamb)                       per mantle area
 *   layer:  the bed's step, and heat to its neighbours (layer, rock at the string, steel)
 *
 * It has no filter of its own: factors are those of the outermost tube, and each correction of that
 * tube's temperatures moves the layers alike.
 */
export interface WallModel {
  /** Index of the outermost tube, whose factors the layers have. */
  readonly tube: number;
  /** All tubes of that ring, itself included: strings at (nearly) one radius. */
  readonly ring: readonly number[];
  /** Share of the bed's cross-section for which those strings stand. */
  readonly ringShare: number;
  /** Share of the bed's cross-section, all layers together. */
  readonly share: number;
  /** What lies inwards of the string first, if anything; then from the string to the wall. */
  readonly layers: readonly WallLayer[];
  /** Per volume of the last layer: steel's heat capacity [J/m3K], exchange with steel, loss [W/m3K]. */
  readonly steel_J_m3K: number;
  readonly exchange_W_m3K: number;
  readonly loss_W_m3K: number;
  /** One sigma of the last layer's flow factor. */
  readonly flowSigma: number;
}

export interface WallLayer {
  /** Share of the bed's cross-section. */
  readonly share: number;
  /** Flow per area over that of the tube. */
  readonly flowFactor: number;
  /** Index of the layer on the string's side; -1 = the tube. */
  readonly towards: number;
  /** Radial exchange with it per conductivity and volume [1/m2]. */
  readonly radial_1_m2: number;
  /** Volume over that of it. */
  readonly volumeRatio: number;
}

export interface WallState {
  /** Enthalpy of each layer's cells [J/m3 of bed]. */
  readonly enthalpy: Float64Array[];
  readonly steel_K: Float64Array;
  /** Gas that left each layer in the last step [K]. */
  readonly outlet_K: Float64Array;
}

/** Half a cycle, for the depth that heat penetrates [s]. */
const HALF_CYCLE_S = 6 * 3600;
/** Layers as shares of that depth, from the tube outwards: three resolve it within some per cent. */
const LAYERS = [1, 0.5, 0.25] as const;
/** A layer inwards of the string below this share of the bed is left to the tube. */
const LEAST_SHARE = 0.01;
/** Contact and radiation between rock and wall [W/m2K]: common practice for a packed wall, no source. */
const CONTACT_W_M2K = 10;
/**
 * Flow that the looser packing lets through at the wall over that of the bed far from it, as the
 * thickness of bed [particle diameters] that would pass it. The equations of Ergun and Brinkman for
 * a plane wall with eps = eps_0 (1 + 1.36 exp(-5 y/d)) and mu_eff = 2 mu exp(0.0035 Re), Giese,
 * Rottschaefer & Vortmeyer 1998 (constants from memory), give 0.5 to 0.65 for spheres at Re of 50 to
 * 500; with less than half their rise in void fraction, as crushed rock fills the wall better, 0.2.
 */
const WALL_FLOW_DIAMETERS = 0.35;
const WALL_FLOW_SIGMA_DIAMETERS = 0.15;
/** Strings whose radii differ by less than this share of the bed's stand in one ring. */
const ONE_RING = 0.03;
/** Of the rock between the outermost string and the wall, at most this share is layers. */
const MOST_OF_WAY = 0.8;

/** null for a bed without wall steel in its definition. */
export function wallModel(tables: BedTables, tubes: readonly TubeModel[]): WallModel | null {
  const bed: BedDefinition = tables.bed;
  const steel = bed.wall_capacity_J_m2K ?? 0;
  if (steel <= 0) return null;
  let tube = 0;
  tubes.forEach((t, k) => {
    if (t.string.radius_m > (tubes[tube] as TubeModel).string.radius_m) tube = k;
  });
  const middle = tables.segments >> 1;
  const k = tables.stagnant[middle] as number;
  const alpha = k / (tables.heatCapacity[middle] as number);
  const radius = bed.diameter_m / 2;
  const { radius_m } = (tubes[tube] as TubeModel).string;
  const ring = tubes.flatMap((t, i) =>
    t.string.radius_m > radius_m - ONE_RING * radius ? [i] : [],
  );
  const ringShare = ring.reduce((sum, i) => sum + (tubes[i] as TubeModel).string.area_share, 0);
  const total = LAYERS.reduce((sum, layer) => sum + layer, 0);
  const way = Math.max(0.1 * radius, radius - radius_m);
  const inside = radius * Math.sqrt(Math.max(0, 1 - ringShare));
  const depth = Math.min(
    (MOST_OF_WAY * Math.min(way, radius - inside)) / total,
    2 * Math.sqrt(alpha * HALF_CYCLE_S),
  );
  // The tube itself is the rock about the string, as far inwards as outwards.
  const outwards = radius - total * depth;
  const shareOf = (from: number, to: number): number => (to * to - from * from) / (radius * radius);
  const evenly = Math.max(inside, 2 * (radius - way) - outwards);
  const inwards = shareOf(inside, evenly) > LEAST_SHARE ? evenly : inside;
  const own = shareOf(inwards, outwards);
  const thickness = (LAYERS[LAYERS.length - 1] as number) * depth;
  const diameters = bed.particle_diameter_m / thickness;
  // Area of the cylinder between per volume, over the distance of the middles.
  const radial = (edge: number, share: number, apart: number): number =>
    (2 * Math.PI * edge) / (share * bed.area_m2) / apart;
  const layers: WallLayer[] = [];
  const innermost = shareOf(inside, inwards);
  if (innermost > 0) {
    layers.push({
      share: innermost,
      flowFactor: 1,
      towards: -1,
      radial_1_m2: radial(inwards, innermost, (outwards - inside) / 2),
      volumeRatio: innermost / own,
    });
  }
  let edge = outwards;
  LAYERS.forEach((layer, i) => {
    const to = edge + layer * depth;
    const share = shareOf(edge, to);
    const before = i === 0 ? inwards : edge - (LAYERS[i - 1] as number) * depth;
    layers.push({
      share,
      flowFactor: i === LAYERS.length - 1 ? 1 + WALL_FLOW_DIAMETERS * diameters : 1,
      towards: i === 0 ? -1 : layers.length - 1,
      radial_1_m2: radial(edge, share, (to - before) / 2),
      volumeRatio: share / (i === 0 ? own : (layers[layers.length - 1] as WallLayer).share),
    });
    edge = to;
  });
  const last = layers.length - 1;
  // Mantle area per volume of the last layer.
  const perVolume = (Math.PI * bed.diameter_m) / ((layers[last] as WallLayer).share * bed.area_m2);
  return {
    tube,
    ring,
    ringShare,
    share: layers.reduce((sum, layer) => sum + layer.share, 0),
    layers,
    steel_J_m3K: steel * perVolume,
    exchange_W_m3K: perVolume / (1 / CONTACT_W_M2K + thickness / 2 / k),
    loss_W_m3K: bed.wall_loss_W_m2K * bed.loss_factor * perVolume,
    flowSigma: WALL_FLOW_SIGMA_DIAMETERS * diameters,
  };
}

export function startWall(model: WallModel, cells: number): WallState {
  return {
    enthalpy: model.layers.map(() => new Float64Array(cells)),
    steel_K: new Float64Array(cells),
    outlet_K: new Float64Array(model.layers.length).fill(Number.NaN),
  };
}

/** Sets layers and steel to the outermost tube's temperatures: what is known at a start. */
export function resetWall(tables: BedTables, wall: WallState, tube: TubeState): void {
  for (const layer of wall.enthalpy) layer.set(tube.enthalpy);
  for (let i = 0; i < wall.steel_K.length; i++) {
    wall.steel_K[i] = temperatureAt(tables, tube.enthalpy[i] as number);
  }
}

/** One scan of layers and steel; the heat passed to the outermost tube is taken from it. */
export function stepWall(
  model: WallModel,
  tubeModel: TubeModel,
  tube: TubeState,
  wall: WallState,
  drive: TubeDrive,
  scratch: TubeScratch,
): void {
  const { tables, layout } = tubeModel;
  const whole: BedStep = { ...tubeStep(tubeModel, tube, drive), wallLoss_W_m3K: 0 };
  model.layers.forEach(({ flowFactor }, i) => {
    const layer = wall.enthalpy[i] as Float64Array;
    const own = { ...whole, massFlux_kg_m2s: whole.massFlux_kg_m2s * flowFactor };
    const substeps = planSubsteps(tables, layout.cells, own);
    const part = { ...own, dt_s: own.dt_s / substeps };
    let out = 0;
    for (let n = 0; n < substeps; n++) {
      bedSubstep(tables, layer, part, scratch.probe);
      out += scratch.probe.outlet_K;
    }
    wall.outlet_K[i] = drive.massFlux_kg_m2s === 0 ? Number.NaN : out / substeps;
  });
  const { slopeFlow } = scratch.probe;
  exchangeAtWall(model, tables, wall.enthalpy, wall.steel_K, tube.enthalpy, whole, slopeFlow);
}

/** What the exchange at the wall has done to one tube of the ring, done to the others as well. */
export function shareAround(
  model: WallModel,
  tubes: readonly { readonly enthalpy: Float64Array }[],
  before: Float64Array,
): void {
  const leader = (tubes[model.tube] as { enthalpy: Float64Array }).enthalpy;
  for (const k of model.ring) {
    if (k === model.tube) continue;
    const own = (tubes[k] as { enthalpy: Float64Array }).enthalpy;
    for (let i = 0; i < own.length; i++) {
      own[i] = (own[i] as number) + (leader[i] as number) - (before[i] as number);
    }
  }
}

/** Moves the layers by the correction that their tube has just had. */
export function followCorrection(
  tables: BedTables,
  wall: WallState,
  before_K: Float64Array,
  after_K: Float64Array,
): void {
  for (let i = 0; i < before_K.length; i++) {
    const shift = (after_K[i] as number) - (before_K[i] as number);
    for (const layer of wall.enthalpy) {
      const h = layer[i] as number;
      layer[i] = enthalpyNear(tables, temperatureAt(tables, h) + shift, h);
    }
  }
}
