import type { BedDefinition } from '../core/definitions.js';
import type { BedProperties } from './bedProperties.js';

/** Cells of each tube along the flow. */
export const CELLS = 160;
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
  /** Heat brought in by the gas and lost to ambient since the start [J]. */
  gasHeat_J: number;
  lostHeat_J: number;
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
