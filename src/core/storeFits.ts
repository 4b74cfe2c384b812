import type { StoreModel, StoreState } from './track/storeTracker.js';
import type { TubeState } from './track/tube.js';

/** @throws RangeError where a saved store is of another shape than its model: strings, cells, sensors */
export function requireStoreFits(store: StoreModel, { tubes, sensors, wall }: StoreState): void {
  const name = `store ${store.store.id}`;
  requireShape(name, 'strings', tubes.length, store.tubes.length);
  requireShape(
    name,
    'layers at the wall',
    wall?.enthalpy?.length ?? 0,
    store.wall?.layers.length ?? 0,
  );
  store.tubes.forEach(({ string, layout }, k) => {
    const tube = tubes[k] as TubeState;
    const own = `string ${string.id}`;
    requireShape(own, 'cells', tube.enthalpy.length, layout.cells);
    requireShape(own, 'thermocouples', sensors[k]?.length, layout.sensors);
    requireShape(own, 'elements of covariance', tube.covariance.length, layout.size ** 2);
  });
}

/** @throws RangeError where a snapshot has another number of something than expected */
export function requireShape(
  of: string,
  what: string,
  found: number | undefined,
  expected: number,
): void {
  if (found === expected) return;
  throw new RangeError(`snapshot of ${of}: has ${found} ${what}, expected ${expected}`);
}
