import { DEMO_GEOMETRY } from '../../test/plant/demoGeometry.js';
import {
  type PlantGeometry,
  type StoreGeometry,
  withReadOnlyString,
} from '../../test/plant/geometry.js';
import { type ErrorModel, SCAN_S, type SensorSet, unitWith } from './sensorSets.js';
import { columnOf } from './twins.js';

export { columnOf, withTwins } from './twins.js';

const SETS: readonly SensorSet[] = ['all', 'five', 'three'];

/**
 * The plant whose one truth serves all sensor sets and both error models: the demonstration's stores
 * with their strings, beside each a twin that has the errors of its class, and the strings of the
 * other sets. Only the demonstration's own strings stand for area, so the physics are those of the
 * plain plant.
 */
export function truthGeometry(period_s = SCAN_S): PlantGeometry {
  let geometry: PlantGeometry = {
    ...DEMO_GEOMETRY,
    scan_period_s: period_s,
    stores: DEMO_GEOMETRY.stores.map((store) => ({
      ...store,
      strings: store.strings.map((string) => renamed(string, 'independent')),
    })),
  };
  for (const errors of ['independent', 'class'] as const) {
    for (const set of SETS) {
      if (set === 'all' && errors === 'independent') continue;
      for (const store of unitWith(set, errors).stores) {
        for (const string of store.strings) {
          geometry = withReadOnlyString(geometry, store.id, renamed(string, errors));
        }
      }
    }
  }
  return geometry;
}

type StringGeometry = StoreGeometry['strings'][number];

function renamed<T extends Pick<StringGeometry, 'id' | 'radius_m' | 'thermocouples'>>(
  string: T,
  errors: ErrorModel,
): T {
  return {
    ...string,
    id: columnOf(string.id, errors),
    thermocouples: string.thermocouples.map((t) => ({
      id: columnOf(t.id, errors),
      position_m: t.position_m,
      group: errors === 'class' ? t.group : null,
    })),
  };
}
