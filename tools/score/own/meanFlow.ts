import type { Series } from '../series.js';

/** Area-weighted mean of the flow factors of a store. */
export function meanFlow(series: Series, id: string, n: number): number {
  const store = series.unit.stores.find((s) => s.id === id)!;
  const { flow } = series.stores[id]!;
  return store.strings.reduce((sum, string, k) => sum + string.area_share * flow[k]![n]!, 0);
}
