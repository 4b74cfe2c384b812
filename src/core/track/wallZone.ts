import { type BedStep, bedSubstep, planSubsteps } from '../bed/kernel.js';
import { type BedTables, enthalpyAt, temperatureAt } from '../bed/tables.js';
import type { BedDefinition } from '../definitions.js';
import type { TubeDrive, TubeModel, TubeScratch, TubeState } from './tube.js';

/**
 * The zone at the wall that no thermocouple sees: it gives heat to the vessel's steel and through it
 * to ambient, so its front lags behind that of the outermost string while the fronts advance. Its
 * thickness is the depth that heat penetrates within half a cycle, 2 sqrt(alpha t).
 *
 *   steel:  C_w dTw/dt = h_w (T - Tw) - U (Tw - Tamb)          per mantle area
 *   zone:   the bed's step, - h_w (T - Tw) - h_r (T - T_tube)  per mantle area
 *
 * It has no filter of its own: factors are those of the outermost tube, and each correction of that
 * tube's temperatures moves the zone's alike.
 */
export interface WallModel {
  /** Index of the outermost tube. */
  readonly tube: number;
  /** Share of the bed's cross-section. */
  readonly share: number;
  /** Per volume of the zone: steel's heat capacity [J/m3K], exchange with steel and tube, loss [W/m3K]. */
  readonly steel_J_m3K: number;
  readonly exchange_W_m3K: number;
  /** Radial exchange with the tube per conductivity [1/m2]. */
  readonly radial_1_m2: number;
  readonly loss_W_m3K: number;
  /** Volume of the zone over that of the rest of the outermost tube. */
  readonly volumeRatio: number;
}

export interface WallState {
  readonly enthalpy: Float64Array;
  readonly steel_K: Float64Array;
  outlet_K: number;
}

/** Half a cycle, for the depth that heat penetrates [s]. */
const HALF_CYCLE_S = 6 * 3600;
/** Contact and radiation between rock and wall [W/m2K]: common practice for a packed wall, no source. */
const CONTACT_W_M2K = 10;
/** Radial mixing over G cf d (Wakao & Kaguei 1982, radial dispersion 0.1 Re Pr k_f). */
const RADIAL_MIXING = 0.1;
/** At most this share of the outermost tube is zone. */
const MOST_OF_TUBE = 0.7;

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
  const depth = Math.min(radius / 2, 2 * Math.sqrt(alpha * HALF_CYCLE_S));
  const outer = (tubes[tube] as TubeModel).string.area_share;
  const ring = 1 - ((radius - depth) / radius) ** 2;
  const share = Math.min(ring, MOST_OF_TUBE * outer);
  // Mantle area per volume of the zone.
  const perVolume = (Math.PI * bed.diameter_m) / (share * bed.area_m2);
  return {
    tube,
    share,
    steel_J_m3K: steel * perVolume,
    exchange_W_m3K: perVolume / (1 / CONTACT_W_M2K + depth / 2 / k),
    radial_1_m2: perVolume / (1.5 * depth),
    loss_W_m3K: bed.wall_loss_W_m2K * bed.loss_factor * perVolume,
    volumeRatio: share / (outer - share),
  };
}

export function startWall(cells: number): WallState {
  return {
    enthalpy: new Float64Array(cells),
    steel_K: new Float64Array(cells),
    outlet_K: Number.NaN,
  };
}

/** Sets zone and steel to the outermost tube's temperatures: what is known at a start. */
export function resetWall(tables: BedTables, wall: WallState, tube: TubeState): void {
  wall.enthalpy.set(tube.enthalpy);
  for (let i = 0; i < wall.enthalpy.length; i++) {
    wall.steel_K[i] = temperatureAt(tables, wall.enthalpy[i] as number);
  }
}

/** One scan of zone and steel; the heat passed to the outermost tube is taken from it. */
export function stepWall(
  model: WallModel,
  tubeModel: TubeModel,
  tube: TubeState,
  wall: WallState,
  drive: TubeDrive,
  scratch: TubeScratch,
): void {
  const { tables, layout } = tubeModel;
  const further = (index: number): number => tube.further[index - layout.cells] as number;
  const end = drive.massFlux_kg_m2s >= 0 ? 'charge_inlet' : 'discharge_inlet';
  const whole: BedStep = {
    massFlux_kg_m2s: drive.massFlux_kg_m2s * Math.exp(further(layout.flow)),
    inlet_K: drive.inlet_K + further(layout.inlet[end]),
    ambient_K: drive.ambient_K,
    dt_s: drive.dt_s,
    heatTransferFactor: Math.exp(further(layout.transfer)),
    wallLoss_W_m3K: 0,
  };
  const substeps = planSubsteps(tables, layout.cells, whole);
  const dt = drive.dt_s / substeps;
  let out = 0;
  for (let n = 0; n < substeps; n++) {
    bedSubstep(tables, wall.enthalpy, { ...whole, dt_s: dt }, scratch.probe);
    out += scratch.probe.outlet_K;
    exchangeAtWall(model, tables, wall.enthalpy, wall.steel_K, tube.enthalpy, {
      massFlux_kg_m2s: whole.massFlux_kg_m2s,
      ambient_K: drive.ambient_K,
      dt_s: dt,
    });
  }
  wall.outlet_K = out / substeps;
}

/**
 * Heat between zone, steel and the outermost tube over a step, all three changed in place. Steel
 * relaxes exactly towards zone and ambient; the rest is explicit (hours against the step).
 *
 * @param zone enthalpy of the zone's cells [J/m3]
 * @param steel_K temperature of the steel beside each cell [K]
 * @param tube enthalpy of the outermost tube's cells [J/m3]
 */
export function exchangeAtWall(
  model: WallModel,
  tables: BedTables,
  zone: Float64Array,
  steel_K: Float64Array,
  tube: Float64Array,
  step: Pick<BedStep, 'massFlux_kg_m2s' | 'ambient_K' | 'dt_s'>,
): void {
  const { exchange_W_m3K: x, loss_W_m3K: u, steel_J_m3K: c } = model;
  const dt = step.dt_s;
  const fade = Math.exp((-(x + u) * dt) / c);
  const middle = tables.segments >> 1;
  const mixing =
    RADIAL_MIXING *
    Math.abs(step.massFlux_kg_m2s) *
    tables.bed.particle_diameter_m *
    (tables.fluidHeatCapacity[middle] as number);
  const radial = model.radial_1_m2 * ((tables.stagnant[middle] as number) + mixing) * dt;
  for (let i = 0; i < zone.length; i++) {
    const t = temperatureAt(tables, zone[i] as number);
    const steel = steel_K[i] as number;
    const settled = (x * t + u * step.ambient_K) / (x + u);
    const next = settled + (steel - settled) * fade;
    // What the steel took, and what it lost meanwhile at its mean temperature.
    const lost = u * dt * (0.5 * (steel + next) - step.ambient_K);
    const across = radial * (t - temperatureAt(tables, tube[i] as number));
    steel_K[i] = next;
    zone[i] = (zone[i] as number) - c * (next - steel) - lost - across;
    tube[i] = (tube[i] as number) + across * model.volumeRatio;
  }
}

/** Moves the zone by the correction that its tube has just had. */
export function followCorrection(
  tables: BedTables,
  wall: WallState,
  before_K: Float64Array,
  after_K: Float64Array,
): void {
  for (let i = 0; i < before_K.length; i++) {
    const shift = (after_K[i] as number) - (before_K[i] as number);
    const t = temperatureAt(tables, wall.enthalpy[i] as number) + shift;
    wall.enthalpy[i] = enthalpyAt(tables, t);
  }
}
