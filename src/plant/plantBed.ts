import type { BedProperties } from './bedProperties.js';
import { createRates, endCapacity, rates, relaxation } from './bedRates.js';
import { CELLS, type PlantBed } from './bedState.js';

/** Share of the way to the temperature of the end steel that passing gas goes. */
const END_CONTACT = 0.8;

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
  const first = createRates(heat.length);
  const second = createRates(heat.length);
  const start = heat.slice();
  const E = new Float64Array(heat.length);
  const M = new Float64Array(heat.length);
  if (flux !== 0) relaxation(plant, flux, E, M);
  rates(plant, flux, entering, ambient_K, E, M, first);
  for (let j = 0; j < heat.length; j++) {
    heat[j] = (start[j] as number) + dt_s * (first.heat[j] as number);
    rock_K[j] = properties.temperatureAt(heat[j] as number);
  }
  rates(plant, flux, entering, ambient_K, E, M, second);
  const half = 0.5 * dt_s;
  for (let j = 0; j < heat.length; j++) {
    heat[j] =
      (start[j] as number) + half * ((first.heat[j] as number) + (second.heat[j] as number));
    rock_K[j] = properties.temperatureAt(heat[j] as number);
    if (flow_kg_s === 0) plant.gas_K[j] = rock_K[j] as number;
  }
  for (let e = 0; e < 2; e++) {
    const capacity = endCapacity(bed, e);
    const gained = half * ((first.ends[e] as number) + (second.ends[e] as number));
    if (capacity > 0) plant.ends_K[e] = (plant.ends_K[e] as number) + gained / capacity;
    else plant.ends_K[e] = meanAtEnd(plant, e);
  }
  plant.lostHeat_J += half * (first.lost + second.lost);
  if (flow_kg_s === 0) return Number.NaN;
  const mixed = temperatureOf(
    properties,
    0.5 * (first.outletEnthalpy + second.outletEnthalpy),
    inlet_K,
  );
  const outlet = passEnd(plant, 1 - inEnd, dt_s, flow_kg_s, mixed);
  const given = properties.gasEnthalpy(inlet_K) - properties.gasEnthalpy(outlet);
  plant.gasHeat_J += Math.abs(flow_kg_s) * dt_s * given;
  return outlet;
}

function meanAtEnd(plant: PlantBed, end: number): number {
  const cell = end === 0 ? 0 : CELLS - 1;
  return plant.areaShares.reduce(
    (sum, share, s) => sum + share * (plant.rock_K[s * CELLS + cell] as number),
    0,
  );
}

/** Heat in the bed and its end steel [J], from an arbitrary fixed zero. */
export function totalHeat_J(plant: PlantBed): number {
  const { bed, heat, areaShares } = plant;
  const volume = (bed.area_m2 * bed.length_m) / CELLS;
  let sum = 0;
  areaShares.forEach((share, s) => {
    for (let j = s * CELLS; j < (s + 1) * CELLS; j++) sum += share * volume * (heat[j] as number);
  });
  for (let e = 0; e < 2; e++) sum += endCapacity(bed, e) * (plant.ends_K[e] as number);
  return sum;
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
  const g = Math.abs(flow_kg_s) * plant.properties.gasCapacity(gas_K) * END_CONTACT;
  const steel = plant.ends_K[end] as number;
  const after = gas_K + (steel - gas_K) * Math.exp((-g * dt_s) / capacity);
  plant.ends_K[end] = after;
  const left = (capacity * (after - steel)) / (Math.abs(flow_kg_s) * dt_s);
  return temperatureOf(plant.properties, plant.properties.gasEnthalpy(gas_K) - left, gas_K);
}

function temperatureOf(properties: BedProperties, enthalpy: number, guess_K: number): number {
  let T = guess_K;
  // cp varies slowly: Newton settles in two or three steps.
  for (let i = 0; i < 8; i++) {
    const step = (enthalpy - properties.gasEnthalpy(T)) / properties.gasCapacity(T);
    T += step;
    if (Math.abs(step) < 1e-9) break;
  }
  return T;
}
