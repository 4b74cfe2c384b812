import type { BedDefinition } from '../core/definitions.js';
import { CELLS, type PlantBed } from './bedState.js';

/** Work array shared by all steps: nothing in it outlives a march. */
const slope = new Float64Array(CELLS);

/** Limited slope of the rock over half a cell, in the direction of growing x: the smaller of the two neighbours' if they agree. */
function slopesOf(rock_K: Float64Array, from: number): void {
  slope[0] = 0;
  slope[CELLS - 1] = 0;
  for (let i = 1; i < CELLS - 1; i++) {
    const j = from + i;
    const back = (rock_K[j] as number) - (rock_K[j - 1] as number);
    const ahead = (rock_K[j + 1] as number) - (rock_K[j] as number);
    if (back * ahead <= 0) slope[i] = 0;
    else slope[i] = 0.5 * (Math.abs(back) < Math.abs(ahead) ? back : ahead);
  }
}

/** Rates of change of one store, and what leaves it. */
export interface Rates {
  readonly heat: Float64Array;
  /** Heating of the end steel, and loss to ambient [W]. */
  readonly ends: Float64Array;
  lost: number;
  /** Enthalpy of the mixed gas at the outlet [J/kg]. */
  outletEnthalpy: number;
}

/**
 * E = exp(-n) and M = (1 - E)/n of every cell at the rock's temperature, n = hv dx/(G cf). They hold
 * for the whole step: within one the properties change by parts in ten thousand.
 */
export function relaxation(plant: PlantBed, flux: number, E: Float64Array, M: Float64Array): void {
  const { bed, properties, rock_K, areaShares, flowShares } = plant;
  const dx = bed.length_m / CELLS;
  for (let s = 0; s < areaShares.length; s++) {
    const own = (Math.abs(flux) * (flowShares[s] as number)) / (areaShares[s] as number);
    const flux06 = own ** 0.6;
    for (let j = s * CELLS; j < (s + 1) * CELLS; j++) {
      const T = rock_K[j] as number;
      const hv = plant.transferFactor * properties.transfer(T, flux06);
      const n = (hv * dx) / (own * properties.gasCapacity(T));
      const lost = -Math.expm1(-n);
      E[j] = 1 - lost;
      M[j] = lost / n;
    }
  }
}

/**
 * d(heat)/dt of all cells. The gas follows dTf/dx = -(hv/(G cf)) (Tf - Ts) exactly over a cell in which
 * Ts is a straight line: Tout = Ts1 - 2 s M + (Tin - Ts0) E, with Ts0, Ts1 the rock at the cell's edges
 * and s half their difference; the rock gets what the gas gives.
 */
export function rates(
  plant: PlantBed,
  flux: number,
  inlet_K: number,
  ambient_K: number,
  E: Float64Array,
  M: Float64Array,
  out: Rates,
): void {
  const { bed, properties, rock_K, gas_K, areaShares, flowShares } = plant;
  const dx = bed.length_m / CELLS;
  out.heat.fill(0);
  out.ends.fill(0);
  out.lost = 0;
  out.outletEnthalpy = 0;
  const G = Math.abs(flux);
  const inletEnthalpy = properties.gasEnthalpy(inlet_K);
  for (let s = 0; s < areaShares.length && G > 0; s++) {
    const from = s * CELLS;
    const own = (G * (flowShares[s] as number)) / (areaShares[s] as number);
    slopesOf(rock_K, from);
    let Tin = inlet_K;
    let hin = inletEnthalpy;
    for (let step = 0; step < CELLS; step++) {
      const i = flux > 0 ? step : CELLS - 1 - step;
      const j = from + i;
      const Ts = rock_K[j] as number;
      const half = flux > 0 ? (slope[i] as number) : -(slope[i] as number);
      const Tout = Ts + half - 2 * half * (M[j] as number) + (Tin - Ts + half) * (E[j] as number);
      const hout = properties.gasEnthalpy(Tout);
      out.heat[j] = (own * (hin - hout)) / dx;
      gas_K[j] = 0.5 * (Tin + Tout);
      Tin = Tout;
      hin = hout;
    }
    out.outletEnthalpy += (flowShares[s] as number) * hin;
  }
  addConduction(plant, G, out.heat);
  addSurroundings(plant, ambient_K, out);
}

/** First rock and end steel, radiation and contact [W/m2K]. */
const END_EXCHANGE = 8;

/** Conduction along the tubes and between them. */
function addConduction(plant: PlantBed, G: number, heat: Float64Array): void {
  const { bed, properties, rock_K, areaShares } = plant;
  const dx = bed.length_m / CELLS;
  const tubes = areaShares.length;
  // Stirring by the flow: 0.5 Re Pr kf along and 0.1 Re Pr kf across, Re Pr kf = G d cf.
  const stirred = G * bed.particle_diameter_m * properties.gasCapacity(rock_K[0] as number);
  for (let s = 0; s < tubes; s++) {
    for (let i = 0; i < CELLS - 1; i++) {
      const j = s * CELLS + i;
      const a = rock_K[j] as number;
      const b = rock_K[j + 1] as number;
      const q = ((properties.conductivity((a + b) / 2) + 0.5 * stirred) * (b - a)) / (dx * dx);
      heat[j] = (heat[j] as number) + q;
      heat[j + 1] = (heat[j + 1] as number) - q;
    }
  }
  const radius = bed.diameter_m / 2;
  let inside = 0;
  for (let s = 0; s < tubes - 1; s++) {
    const own = areaShares[s] as number;
    const next = areaShares[s + 1] as number;
    const middle = radius * Math.sqrt(inside + own / 2);
    const nextMiddle = radius * Math.sqrt(inside + own + next / 2);
    inside += own;
    const edge = radius * Math.sqrt(inside);
    const across = (2 * Math.PI * edge) / (nextMiddle - middle) / bed.area_m2;
    for (let i = 0; i < CELLS; i++) {
      const j = s * CELLS + i;
      const a = rock_K[j] as number;
      const b = rock_K[j + CELLS] as number;
      const q = across * (properties.conductivity((a + b) / 2) + 0.1 * stirred) * (b - a);
      heat[j] = (heat[j] as number) + q / own;
      heat[j + CELLS] = (heat[j + CELLS] as number) - q / next;
    }
  }
}

/** Losses through the mantle and the ends; an end without steel passes heat straight to ambient. */
function addSurroundings(plant: PlantBed, ambient_K: number, out: Rates): void {
  const { bed, rock_K, areaShares, ends_K } = plant;
  const dx = bed.length_m / CELLS;
  const outer = areaShares.length - 1;
  const perLength = bed.wall_loss_W_m2K * bed.loss_factor * Math.PI * bed.diameter_m;
  const perVolume = perLength / (bed.area_m2 * (areaShares[outer] as number));
  for (let j = outer * CELLS; j < (outer + 1) * CELLS; j++) {
    const warmer = (rock_K[j] as number) - ambient_K;
    out.heat[j] = (out.heat[j] as number) - perVolume * warmer;
    out.lost += perLength * dx * warmer;
  }
  for (let e = 0; e < 2; e++) {
    const loss = bed.end_loss_W_m2K[e === 0 ? 'charge_inlet' : 'discharge_inlet'] * bed.loss_factor;
    const steel = endCapacity(bed, e) > 0;
    const other = steel ? (ends_K[e] as number) : ambient_K;
    const exchange = steel ? END_EXCHANGE : (END_EXCHANGE * loss) / (END_EXCHANGE + loss);
    let given = 0;
    areaShares.forEach((share, s) => {
      const j = s * CELLS + (e === 0 ? 0 : CELLS - 1);
      const q = exchange * (other - (rock_K[j] as number));
      out.heat[j] = (out.heat[j] as number) + q / dx;
      given += bed.area_m2 * share * q;
    });
    const lost = steel ? bed.area_m2 * loss * (other - ambient_K) : -given;
    out.lost += lost;
    out.ends[e] = steel ? -given - lost : 0;
  }
}

export function createRates(cells: number): Rates {
  return { heat: new Float64Array(cells), ends: new Float64Array(2), lost: 0, outletEnthalpy: 0 };
}

export function endCapacity(bed: BedDefinition, end: number): number {
  return bed.end_capacity_J_K[end === 0 ? 'charge_inlet' : 'discharge_inlet'];
}
