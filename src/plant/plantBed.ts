import type { BedDefinition } from '../core/definitions.js';
import type { BedProperties } from './bedProperties.js';

/** Cells of each tube along the flow. */
export const CELLS = 160;
/** Share of the way to the temperature of the end steel that passing gas goes. */
const END_CONTACT = 0.8;

/** One store of the demonstration plant: a stream tube per string, from the axis outwards. */
export interface PlantBed {
  readonly bed: BedDefinition;
  readonly properties: BedProperties;
  /** Share of the area and of the flow of each tube; both sum to 1. */
  readonly areaShares: readonly number[];
  readonly flowShares: readonly number[];
  /** Heat [J/m3], rock and gas temperature [K], cell i of tube s at s CELLS + i. */
  readonly heat: Float64Array;
  readonly rock_K: Float64Array;
  readonly gas_K: Float64Array;
  /** Steel at the charge inlet and at the discharge inlet [K]. */
  readonly ends_K: Float64Array;
  /** What dust leaves of the heat transfer [-]. */
  transferFactor: number;
}

export function copyBed(from: PlantBed): PlantBed {
  return {
    ...from,
    heat: from.heat.slice(),
    rock_K: from.rock_K.slice(),
    gas_K: from.gas_K.slice(),
    ends_K: from.ends_K.slice(),
  };
}

/** Fills all tubes with T(x), x from the charge inlet [m]. */
export function fillBed(plant: PlantBed, profile: (x_m: number) => number): void {
  const { length_m } = plant.bed;
  for (let j = 0; j < plant.heat.length; j++) {
    const T = profile((((j % CELLS) + 0.5) * length_m) / CELLS);
    plant.heat[j] = plant.properties.heatAt(T);
    plant.rock_K[j] = T;
    plant.gas_K[j] = T;
  }
  plant.ends_K[0] = profile(0);
  plant.ends_K[1] = profile(length_m);
}

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

interface Rates {
  readonly heat: Float64Array;
  /** Enthalpy of the mixed gas at the outlet [J/kg]. */
  outletEnthalpy: number;
}

/**
 * E = exp(-n) and M = (1 - E)/n of every cell at the rock's temperature, n = hv dx/(G cf). They hold
 * for the whole step: within one the properties change by parts in ten thousand.
 */
function relaxation(plant: PlantBed, flux: number, E: Float64Array, M: Float64Array): void {
  const { bed, properties, rock_K, areaShares, flowShares } = plant;
  const dx = bed.length_m / CELLS;
  for (let s = 0; s < areaShares.length; s++) {
    const own = (Math.abs(flux) * (flowShares[s] as number)) / (areaShares[s] as number);
    const flux06 = own ** 0.6;
    for (let j = s * CELLS; j < (s + 1) * CELLS; j++) {
      const T = rock_K[j] as number;
      const hv = plant.transferFactor * properties.transfer(T, flux06);
      const n = (hv * dx) / (own * bed.fluid.heatCapacity(T));
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
function rates(
  plant: PlantBed,
  flux: number,
  inlet_K: number,
  ambient_K: number,
  E: Float64Array,
  M: Float64Array,
  out: Rates,
): void {
  const { bed, rock_K, gas_K, areaShares, flowShares } = plant;
  const { fluid } = bed;
  const dx = bed.length_m / CELLS;
  out.heat.fill(0);
  out.outletEnthalpy = 0;
  const G = Math.abs(flux);
  const inletEnthalpy = fluid.enthalpy(inlet_K);
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
      const hout = fluid.enthalpy(Tout);
      out.heat[j] = (own * (hin - hout)) / dx;
      gas_K[j] = 0.5 * (Tin + Tout);
      Tin = Tout;
      hin = hout;
    }
    out.outletEnthalpy += (flowShares[s] as number) * hin;
  }
  addConduction(plant, G, ambient_K, out.heat);
}

function addConduction(plant: PlantBed, G: number, ambient_K: number, heat: Float64Array): void {
  const { bed, properties, rock_K, areaShares, ends_K } = plant;
  const dx = bed.length_m / CELLS;
  const tubes = areaShares.length;
  // Stirring by the flow: 0.5 Re Pr kf along and 0.1 Re Pr kf across, Re Pr kf = G d cf.
  const stirred = G * bed.particle_diameter_m * bed.fluid.heatCapacity(rock_K[0] as number);
  for (let s = 0; s < tubes; s++) {
    for (let i = 0; i < CELLS - 1; i++) {
      const j = s * CELLS + i;
      const a = rock_K[j] as number;
      const b = rock_K[j + 1] as number;
      const q = ((properties.conductivity((a + b) / 2) + 0.5 * stirred) * (b - a)) / (dx * dx);
      heat[j] = (heat[j] as number) + q;
      heat[j + 1] = (heat[j + 1] as number) - q;
    }
    for (let e = 0; e < 2; e++) {
      const j = s * CELLS + (e === 0 ? 0 : CELLS - 1);
      heat[j] =
        (heat[j] as number) + (END_EXCHANGE * ((ends_K[e] as number) - (rock_K[j] as number))) / dx;
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
  const outer = tubes - 1;
  const loss =
    (bed.wall_loss_W_m2K * bed.loss_factor * Math.PI * bed.diameter_m) /
    (bed.area_m2 * (areaShares[outer] as number));
  for (let j = outer * CELLS; j < (outer + 1) * CELLS; j++) {
    heat[j] = (heat[j] as number) - loss * ((rock_K[j] as number) - ambient_K);
  }
}

/** First rock and end steel, radiation and contact [W/m2K]. */
const END_EXCHANGE = 8;

/**
 * Advances a store by `dt_s` (Heun's rule, second order). Flow is positive while charging.
 * @returns gas temperature leaving the store behind its end steel [K], NaN without flow
 */
export function stepBed(
  plant: PlantBed,
  dt_s: number,
  flow_kg_s: number,
  inlet_K: number,
  ambient_K: number,
): number {
  const { bed, properties, heat, rock_K } = plant;
  const flux = flow_kg_s / bed.area_m2;
  const inEnd = flow_kg_s > 0 ? 0 : 1;
  const entering = flow_kg_s === 0 ? inlet_K : passEnd(plant, inEnd, dt_s, flow_kg_s, inlet_K);
  const first: Rates = { heat: new Float64Array(heat.length), outletEnthalpy: 0 };
  const second: Rates = { heat: new Float64Array(heat.length), outletEnthalpy: 0 };
  const start = heat.slice();
  const E = new Float64Array(heat.length);
  const M = new Float64Array(heat.length);
  if (flux !== 0) relaxation(plant, flux, E, M);
  rates(plant, flux, entering, ambient_K, E, M, first);
  endLosses(plant, dt_s, ambient_K);
  for (let j = 0; j < heat.length; j++) {
    heat[j] = (start[j] as number) + dt_s * (first.heat[j] as number);
    rock_K[j] = properties.temperatureAt(heat[j] as number);
  }
  rates(plant, flux, entering, ambient_K, E, M, second);
  for (let j = 0; j < heat.length; j++) {
    heat[j] =
      (start[j] as number) + 0.5 * dt_s * ((first.heat[j] as number) + (second.heat[j] as number));
    rock_K[j] = properties.temperatureAt(heat[j] as number);
    if (flow_kg_s === 0) plant.gas_K[j] = rock_K[j] as number;
  }
  if (flow_kg_s === 0) return Number.NaN;
  const mixed = temperatureOf(bed, 0.5 * (first.outletEnthalpy + second.outletEnthalpy), inlet_K);
  return passEnd(plant, 1 - inEnd, dt_s, flow_kg_s, mixed);
}

function endCapacity(bed: BedDefinition, end: number): number {
  return bed.end_capacity_J_K[end === 0 ? 'charge_inlet' : 'discharge_inlet'];
}

/** Gas past the steel of an end; both go towards each other. */
function passEnd(
  plant: PlantBed,
  end: number,
  dt_s: number,
  flow_kg_s: number,
  gas_K: number,
): number {
  const capacity = endCapacity(plant.bed, end);
  if (capacity === 0) return gas_K;
  const g = Math.abs(flow_kg_s) * plant.bed.fluid.heatCapacity(gas_K) * END_CONTACT;
  const steel = plant.ends_K[end] as number;
  const after = gas_K + (steel - gas_K) * Math.exp((-g * dt_s) / capacity);
  plant.ends_K[end] = after;
  return gas_K - (capacity * (after - steel)) / (dt_s * (g / END_CONTACT));
}

function endLosses(plant: PlantBed, dt_s: number, ambient_K: number): void {
  const { bed, rock_K, areaShares, ends_K } = plant;
  for (let e = 0; e < 2; e++) {
    const end = e === 0 ? 'charge_inlet' : 'discharge_inlet';
    const capacity = bed.end_capacity_J_K[end];
    let rock = 0;
    areaShares.forEach((share, s) => {
      rock += share * (rock_K[s * CELLS + (e === 0 ? 0 : CELLS - 1)] as number);
    });
    const steel = ends_K[e] as number;
    const loss = bed.end_loss_W_m2K[end] * bed.loss_factor;
    const heating = END_EXCHANGE * (rock - steel) - loss * (steel - ambient_K);
    ends_K[e] =
      capacity > 0
        ? steel + (bed.area_m2 * dt_s * heating) / capacity
        : (END_EXCHANGE * rock + loss * ambient_K) / (END_EXCHANGE + loss);
  }
}

function temperatureOf(bed: BedDefinition, enthalpy: number, guess_K: number): number {
  let T = guess_K;
  // cp varies slowly: Newton settles in two or three steps.
  for (let i = 0; i < 8; i++) {
    const step = (enthalpy - bed.fluid.enthalpy(T)) / bed.fluid.heatCapacity(T);
    T += step;
    if (Math.abs(step) < 1e-9) break;
  }
  return T;
}
