import type { SimulatedStore } from '../../test/plant/simulatedStore.js';
import type { PlantTruth, Truth } from '../../test/plant/truth.js';

/** Fronts of a store that a recording keeps; more do not occur in the schedules. */
const FRONTS = 3;

/** What is kept of the truth of each store at each scan. */
const PER_STORE = [
  'soc',
  'stored_MWh_th',
  'fronts',
  ...Array.from({ length: FRONTS }, (_, i) => [`position_${i}`, `width_${i}`]).flat(),
  'heat_transfer_factor',
  'leak_kg_s',
  'flow_axis',
  'flow_middle',
  'flow_rim',
  'seen_all',
  'seen_one',
] as const;

const PER_UNIT = ['mode', 'flow_kg_s', 'power_W', 'meter_factor'] as const;
const STORES = ['hot', 'cold'] as const;

/** Columns of the truth in a recording. */
export const TRUTH_COLUMNS: readonly string[] = [
  ...PER_UNIT,
  ...STORES.flatMap((store) => PER_STORE.map((name) => `${store}.${name}`)),
];

export function truthRow(plant: Truth, truth: PlantTruth): number[] {
  const mode = { charge: 1, stand: 0, discharge: -1 }[truth.mode];
  const row: number[] = [mode, truth.flow_kg_s, truth.power_W, truth.meter_factor];
  for (const id of STORES) {
    const store = truth.stores[id]!;
    row.push(store.soc, store.stored_MWh_th, store.fronts.length);
    for (let i = 0; i < FRONTS; i++) {
      const front = store.fronts[i];
      row.push(front?.position_m ?? Number.NaN, front?.width_m ?? Number.NaN);
    }
    row.push(store.heat_transfer_factor, store.leak_kg_s);
    for (const string of ['axis', 'middle', 'rim']) {
      row.push(store.strings.find((s) => s.id === string)!.flow_factor);
    }
    const simulated = plant.stores.find((s) => s.geometry.id === id)!;
    const shares = simulated.geometry.strings.filter((s) => s.area_share > 0);
    row.push(shares.reduce((sum, s) => sum + s.area_share * seenSoc(simulated, s.radius_m), 0));
    row.push(seenSoc(simulated, simulated.geometry.strings.find((s) => s.id === 'five')!.radius_m));
  }
  return row;
}

/**
 * State of charge that the rock along a line at this radius would show to a perfect instrument. Its
 * distance from the store's is what no estimator can know that sees this line only.
 */
function seenSoc(store: SimulatedStore, radius_m: number): number {
  const { bed } = store;
  const { ringMiddle_m, rings, rock } = bed.c;
  const { cells } = bed.p;
  let ring = 0;
  while (ring < rings - 2 && radius_m > ringMiddle_m[ring + 1]!) ring++;
  const outer = Math.min(ring + 1, rings - 1);
  const span = ringMiddle_m[outer]! - ringMiddle_m[ring]!;
  const across = span > 0 ? Math.min(Math.max((radius_m - ringMiddle_m[ring]!) / span, 0), 1) : 0;
  const { reference_hot_K, reference_cold_K, kind } = store.geometry;
  const [empty, full] =
    kind === 'hot' ? [reference_cold_K, reference_hot_K] : [reference_hot_K, reference_cold_K];
  const zero = rock.enthalpyAt(empty);
  let sum = 0;
  for (let i = 0; i < cells; i++) {
    const a = bed.mean[ring * cells + i]!;
    const b = bed.mean[outer * cells + i]!;
    sum += rock.enthalpyAt(a + across * (b - a)) - zero;
  }
  return sum / cells / (rock.enthalpyAt(full) - zero);
}
