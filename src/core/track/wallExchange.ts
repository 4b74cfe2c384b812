import type { BedStep } from '../bed/kernel.js';
import { type BedTables, temperatureAt } from '../bed/tables.js';
import type { WallLayer, WallModel } from './wallZone.js';

/** Radial mixing over G cf d (Wakao & Kaguei 1982, radial dispersion 0.1 Re Pr k_f). */
const RADIAL_MIXING = 0.1;
/** Share of a layer's heat that one explicit step may move. */
const MOST_MOVED = 0.25;

/**
 * Heat between layers, steel and the outermost tube over a step, all changed in place. Steel relaxes
 * exactly towards its layer and ambient; the rest is explicit, in parts short enough for that.
 *
 * @param layers enthalpy of each layer's cells, as in the model [J/m3]
 * @param steel_K temperature of the steel beside each cell [K]
 * @param tube enthalpy of the outermost tube's cells [J/m3]
 * @param scratch as many numbers as there are cells
 */
export function exchangeAtWall(
  model: WallModel,
  tables: BedTables,
  layers: readonly Float64Array[],
  steel_K: Float64Array,
  tube: Float64Array,
  step: Pick<BedStep, 'massFlux_kg_m2s' | 'ambient_K' | 'dt_s'>,
  scratch: Float64Array = new Float64Array(tube.length),
): void {
  const { exchange_W_m3K: x, loss_W_m3K: u, steel_J_m3K: c } = model;
  const middle = tables.segments >> 1;
  const mixing =
    RADIAL_MIXING *
    Math.abs(step.massFlux_kg_m2s) *
    tables.bed.particle_diameter_m *
    (tables.fluidHeatCapacity[middle] as number);
  const { stagnant, segments } = tables;
  const last = layers.length - 1;
  const outermost = layers[last] as Float64Array;
  // Radiation between the pieces makes the hottest rock conduct best.
  const most = Math.max(stagnant[0] as number, stagnant[segments - 1] as number) + mixing;
  const fastest = Math.max(x, 2 * most * (model.layers[last]?.radial_1_m2 ?? 0));
  const least = tables.heatCapacity[0] as number;
  const parts = Math.max(1, Math.ceil((step.dt_s * fastest) / least / MOST_MOVED));
  const dt = step.dt_s / parts;
  const fade = Math.exp((-(x + u) * dt) / c);
  const { ambient_K } = step;
  for (let n = 0; n < parts; n++) {
    for (let i = 0; i < tube.length; i++) {
      scratch[i] = temperatureAt(tables, outermost[i] as number);
    }
    for (let l = last; l >= 0; l--) {
      const layer = model.layers[l] as WallLayer;
      const inwards = layer.towards >= 0 ? (layers[layer.towards] as Float64Array) : tube;
      exchangeAcross(tables, layer, layers[l] as Float64Array, inwards, mixing, dt);
    }
    for (let i = 0; i < tube.length; i++) {
      const steel = steel_K[i] as number;
      const settled = (x * (scratch[i] as number) + u * ambient_K) / (x + u);
      const next = settled + (steel - settled) * fade;
      // What the steel took, and what it lost meanwhile at its mean temperature.
      const lost = u * dt * (0.5 * (steel + next) - ambient_K);
      steel_K[i] = next;
      outermost[i] = (outermost[i] as number) - c * (next - steel) - lost;
    }
  }
}

/** Heat from the cells of a layer to those on the string's side over `dt`, both changed in place. */
function exchangeAcross(
  tables: BedTables,
  { radial_1_m2, volumeRatio }: WallLayer,
  own: Float64Array,
  inwards: Float64Array,
  mixing: number,
  dt: number,
): void {
  const { stagnant, segments, inverse_dH, temperature_K: nodes } = tables;
  const end = segments - 1;
  for (let i = 0; i < own.length; i++) {
    // As `temperatureAt`, whose segment the conductivity is read from as well.
    const scaled = (own[i] as number) * inverse_dH;
    let s = Math.floor(scaled);
    if (s < 0) s = 0;
    else if (s > end) s = end;
    const node = nodes[s] as number;
    const outer = node + (scaled - s) * ((nodes[s + 1] as number) - node);
    const inner = temperatureAt(tables, inwards[i] as number);
    const k = (stagnant[s] as number) + mixing;
    const across = radial_1_m2 * k * dt * (outer - inner);
    own[i] = (own[i] as number) - across;
    inwards[i] = (inwards[i] as number) + across * volumeRatio;
  }
}
