import { temperatureAt } from '../bed/tables.js';
import { type StartReading, startTube } from '../track/start.js';
import { type StoreModel, type StoreState, startStore } from '../track/storeTracker.js';
import type { TubeModel, TubeState } from '../track/tube.js';
import { followOrigin } from '../track/unseenFlow.js';
import { resetWall } from '../track/wallZone.js';

/**
 * A store that knows nothing but stands where the course begins. A tube of whose string fewer than two
 * thermocouples are in use is drawn through what all strings read, as in a start of the estimator.
 *
 * @param start enthalpy at the start, by tube [J/m3 of bed]
 * @param out_of_use ids of thermocouples that are not read
 */
export function freshState(
  store: StoreModel,
  start: readonly Float64Array[],
  out_of_use: ReadonlySet<string>,
): StoreState {
  const state = startStore(store);
  state.started = true;
  const places = readPlaces(store, start, out_of_use);
  state.tubes.forEach((tube, k) => {
    // As `restart` does: one reading of its own draws no line.
    const own = places.filter((place) => place.tube === k);
    if (own.length < 2 && places.length >= 2) {
      const readings = places.map((place) => (place.tube === k ? place : { ...place, sensor: -1 }));
      startTube(store.tubes[k] as TubeModel, tube, readings, 1);
    }
    tube.enthalpy.set(start[k] as Float64Array);
  });
  if (store.wall !== null && state.wall !== null) {
    const beside = state.tubes[store.wall.tube] as TubeState;
    resetWall(store.tables, state.wall, beside);
  }
  followOrigin(store, state, true);
  return state;
}

/** What the thermocouples in use would read at the start. */
function readPlaces(
  store: StoreModel,
  start: readonly Float64Array[],
  out_of_use: ReadonlySet<string>,
): (StartReading & { readonly tube: number })[] {
  const { length_m } = store.store.bed;
  return store.tubes.flatMap(({ string, layout: { cells } }, tube) =>
    string.thermocouples
      .map(({ id, position_m }, sensor) => ({ id, position_m, sensor }))
      .filter(({ id }) => !out_of_use.has(id))
      .map(({ position_m, sensor }) => {
        const cell = Math.min(cells - 1, Math.floor((position_m / length_m) * cells));
        const value_K = temperatureAt(store.tables, start[tube]?.[cell] as number);
        return { tube, position_m, value_K, sensor };
      }),
  );
}
