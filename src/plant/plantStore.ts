import type { StoreDefinition } from '../core/definitions.js';
import { bedProperties } from './bedProperties.js';
import { CELLS, copyBed, fillBed, type PlantBed } from './bedState.js';
import { stepBed } from './plantBed.js';
import type { Random } from './random.js';

/** One store of the demonstration plant with its gas ends. */
export interface PlantStore {
  readonly definition: StoreDefinition;
  readonly bed: PlantBed;
  /** Strings from the axis outwards: tube s belongs to `order[s]` of the definition's strings. */
  readonly order: readonly number[];
  /** Gas in the pipes at the charge inlet and the discharge inlet [K]. */
  readonly pipes_K: [number, number];
}

export interface PlantStoreTruth {
  readonly soc: number;
  readonly stored_MWh_th: number;
  /** Half crossing and half the 16-84 % distance of the area-mean profile [m]; null where there is none. */
  readonly front_m: number | null;
  readonly width_m: number | null;
  readonly heat_transfer_factor: number;
  readonly flow_factors: Readonly<Record<string, number>>;
}

const START_SOC = 0.5;
const START_WIDTH_M = 0.4;

export function createPlantStore(definition: StoreDefinition, random: Random): PlantStore {
  const { bed, strings } = definition;
  const order = strings
    .map((_, s) => s)
    .sort((a, b) => (strings[a]?.radius_m ?? 0) - (strings[b]?.radius_m ?? 0));
  const areaShares = order.map((s) => strings[s]?.area_share ?? 0);
  // Tubes of a sound bed differ by a few percent.
  const factors = areaShares.map(() => 1 + 0.02 * random.normal());
  const total = areaShares.reduce((sum, share, s) => sum + share * (factors[s] as number), 0);
  const cells = areaShares.length * CELLS;
  const plant: PlantBed = {
    bed,
    properties: bedProperties(bed),
    areaShares,
    flowShares: areaShares.map((share, s) => (share * (factors[s] as number)) / total),
    heat: new Float64Array(cells),
    rock_K: new Float64Array(cells),
    gas_K: new Float64Array(cells),
    ends_K: new Float64Array(2),
    transferFactor: 1 + 0.1 * (2 * random.uniform() - 1),
    gasHeat_J: 0,
    lostHeat_J: 0,
  };
  const [full, empty] = endTemperatures(definition);
  const width = Math.min(START_WIDTH_M, 0.1 * bed.length_m) / Math.atanh(0.68);
  const front = START_SOC * bed.length_m;
  fillBed(plant, (x) => empty + (full - empty) * 0.5 * (1 - Math.tanh((x - front) / width)));
  return {
    definition,
    bed: plant,
    order,
    pipes_K: [plant.ends_K[0] as number, plant.ends_K[1] as number],
  };
}

export function copyStore(store: PlantStore): PlantStore {
  return { ...store, bed: copyBed(store.bed), pipes_K: [...store.pipes_K] };
}

function endTemperatures(store: StoreDefinition): [full: number, empty: number] {
  const { reference_hot_K: hot, reference_cold_K: cold } = store;
  return store.kind === 'hot' ? [hot, cold] : [cold, hot];
}

/** Pipe gas without flow goes to the end steel's temperature with this time constant [s]. */
const PIPE_S = 900;

export function advanceStore(
  store: PlantStore,
  dt_s: number,
  flow_kg_s: number,
  inlet_K: number,
  ambient_K: number,
): void {
  const outlet = stepBed(store.bed, dt_s, flow_kg_s, inlet_K, ambient_K);
  if (flow_kg_s === 0) {
    const share = 1 - Math.exp(-dt_s / PIPE_S);
    for (const e of [0, 1] as const) {
      store.pipes_K[e] += share * ((store.bed.ends_K[e] as number) - store.pipes_K[e]);
    }
    return;
  }
  store.pipes_K[flow_kg_s > 0 ? 0 : 1] = inlet_K;
  store.pipes_K[flow_kg_s > 0 ? 1 : 0] = outlet;
}

export function socOf(store: PlantStore): number {
  const [full, empty] = endTemperatures(store.definition);
  const { properties } = store.bed;
  const zero = properties.heatAt(empty);
  return meanHeatAbove(store, zero) / (properties.heatAt(full) - zero);
}

/** Area-mean heat above `zero` [J/m3]. */
function meanHeatAbove(store: PlantStore, zero: number): number {
  const { heat, areaShares } = store.bed;
  let sum = 0;
  areaShares.forEach((share, s) => {
    let tube = 0;
    for (let j = s * CELLS; j < (s + 1) * CELLS; j++) tube += (heat[j] as number) - zero;
    sum += (share * tube) / CELLS;
  });
  return sum;
}

export function truthOf(store: PlantStore): PlantStoreTruth {
  const { definition, bed } = store;
  const [full, empty] = endTemperatures(definition);
  const sign = full > empty ? 1 : -1;
  const zero = bed.properties.heatAt(empty);
  const volume = definition.bed.area_m2 * definition.bed.length_m;
  const mean = new Float64Array(CELLS);
  bed.areaShares.forEach((share, s) => {
    for (let i = 0; i < CELLS; i++)
      mean[i] = (mean[i] as number) + share * (bed.rock_K[s * CELLS + i] as number);
  });
  const charged = (i: number) => ((mean[i] as number) - empty) / (full - empty);
  const dx = definition.bed.length_m / CELLS;
  // Seen from the charge inlet the charge falls from full to empty: last place above each level.
  const at = (level: number): number | null => {
    for (let i = CELLS - 1; i > 0; i--) {
      const a = charged(i - 1);
      const b = charged(i);
      if (a >= level && b < level) return (i - 0.5 + (a - level) / (a - b)) * dx;
    }
    return null;
  };
  const near = at(0.84);
  const far = at(0.16);
  return {
    soc: socOf(store),
    stored_MWh_th: (sign * meanHeatAbove(store, zero) * volume) / 3.6e9,
    front_m: at(0.5),
    width_m: near === null || far === null ? null : (far - near) / 2,
    heat_transfer_factor: bed.transferFactor,
    flow_factors: Object.fromEntries(
      store.order.map((string, s) => [
        definition.strings[string]?.id ?? '',
        (bed.flowShares[s] as number) / (bed.areaShares[s] as number),
      ]),
    ),
  };
}
