import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { Scan } from '../../../src/core/scan/scan.js';

/** Where the fronts stand and how wide they are, as shares of the beds' lengths. */
export interface Fronts {
  readonly hot: number;
  readonly cold: number;
  readonly width?: number;
}

/** Temperature of a store with an S-shaped front, charged at x below it [K]. */
export function frontTemperature(
  store: UnitDefinition['stores'][number],
  x_m: number,
  front: number,
  width = 0.08,
): number {
  const charged = store.kind === 'hot' ? store.reference_hot_K : store.reference_cold_K;
  const discharged = store.kind === 'hot' ? store.reference_cold_K : store.reference_hot_K;
  const theta = 0.5 - 0.5 * Math.tanh((x_m / store.bed.length_m - front) / width);
  return discharged + (charged - discharged) * theta;
}

/** A scan of a unit with fronts in its stores; `others` by channel id, in SI, the rest missing. */
export function frontedScan(
  unit: UnitDefinition,
  time_ms: number,
  fronts: Fronts,
  others: Readonly<Record<string, number>> = {},
  noise: () => number = () => 0,
): Scan {
  const places = new Map(
    unit.stores.flatMap((store) =>
      store.strings.flatMap((string) =>
        string.thermocouples.map((t) => [t.id, { store, x: t.position_m }] as const),
      ),
    ),
  );
  const values = Float64Array.from(unit.channels, ({ id }) => {
    const place = places.get(id);
    if (place === undefined) return others[id] ?? Number.NaN;
    const front = place.store.kind === 'hot' ? fronts.hot : fronts.cold;
    return frontTemperature(place.store, place.x, front, fronts.width) + noise();
  });
  return { time_ms, values, held: new Uint8Array(values.length) };
}
