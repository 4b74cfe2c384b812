import type { Direction, UnitDefinition } from '../definitions.js';
import type { Tunable, TuneConfigure, TuneRow } from './result.js';

/**
 * Factors for the configuration. The tubes learn their flow factor anew: with heat capacity c written
 * down it settles at way x c, and the machine's power per kilogram of that flow is work/(way c).
 *
 * Null is what the recording does not determine, whatever a search that has not settled gave, and
 * the work factors where the way in any store is either.
 *
 * @param rows all rows of the answer
 * @param settled whether each store's search has settled, in the order of the unit's stores
 */
export function configureOf(
  unit: UnitDefinition,
  rows: readonly TuneRow[],
  settled: readonly boolean[],
): TuneConfigure {
  const row = (store: string | null, name: Tunable) =>
    rows.find((one) => one.store === store && one.name === name) as TuneRow;
  const told = (store: string, name: Tunable): number | null => {
    const one = row(store, name);
    const found = settled[unit.stores.findIndex(({ id }) => id === store)] === true;
    return found && one.determined ? one.value : null;
  };
  let flow: number | null = 0;
  for (const { id, bed } of unit.stores) {
    const way = told(id, 'front_travel');
    const before = bed.heat_capacity_factor;
    const share: number = (told(id, 'heat_capacity') ?? before) / before / unit.stores.length;
    flow = way === null || flow === null ? null : flow + way * share;
  }
  const factor = (direction: Direction): number | null => {
    const { determined, value } = row(null, `work_${direction}`);
    return determined && flow !== null ? value / flow : null;
  };
  return {
    work_factor: { charge: factor('charge'), discharge: factor('discharge') },
    stores: unit.stores.map((store) => ({
      id: store.id,
      heat_transfer: told(store.id, 'heat_transfer'),
      conductivity: told(store.id, 'conductivity'),
      loss: told(store.id, 'loss'),
      heat_capacity: told(store.id, 'heat_capacity'),
      gas_share: told(store.id, 'gas_share'),
    })),
  };
}
