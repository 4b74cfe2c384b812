import type { Direction, StoreDefinition, UnitDefinition } from '../../core/definitions.js';
import type { StoreTemperatures } from '../../core/machine/machine.js';

/** Gas leaving full stores while discharging, and empty ones while charging. */
export function referenceOutlets(unit: UnitDefinition, direction: Direction): StoreTemperatures {
  const of = (kind: StoreDefinition['kind']) => unit.stores.find((store) => store.kind === kind);
  const hot = of('hot')!;
  const cold = of('cold');
  return direction === 'discharge'
    ? { hot_K: hot.reference_hot_K, cold_K: cold?.reference_cold_K ?? null }
    : { hot_K: hot.reference_cold_K, cold_K: cold?.reference_hot_K ?? null };
}
